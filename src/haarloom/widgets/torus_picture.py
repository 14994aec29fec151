"""A site weight on the torus of eigenphases: a map for SU(3), a line for the other groups."""

from __future__ import annotations

from base64 import b64encode
from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING

import bqplot
import ipywidgets
import numpy as np

from haarloom.widgets.charts import INK, Ruler, figure, padded, round_ticks
from haarloom.widgets.dyes import CLOTH, DYES, RAMP
from haarloom.widgets.raster import png, tinted
from haarloom.widgets.stills import curves_svg

if TYPE_CHECKING:
    from haarloom.actions.protocols import SiteWeight
    from haarloom.algebra.group import SU

__all__ = ["QUANTITIES", "LinePicture", "MapPicture", "picture_for"]

QUANTITIES: dict[str, Callable[[np.ndarray], np.ndarray]] = {
    "|W|": np.abs,
    "Re W": np.real,
    "Im W": np.imag,
    "arg W": np.angle,
}
"""What of the complex number W can be shown; each is a real function of the eigenphases."""

SIDE = 121
"""Points along an edge of the map: W is smooth, and the page interpolates."""


class MapPicture:
    """SU(3): the plane of eigenphases with Cartesian coordinates, and one Weyl chamber outlined.

    x = (θ₁ − θ₂)/√2 and y = (θ₁ + θ₂ − 2θ₃)/√6 are orthonormal on θ₁ + θ₂ + θ₃ = 0. The outlined
    triangle holds every conjugacy class once; its corners are the centre elements 1, ω and ω².
    """

    caption = "The triangle holds each conjugacy class once; its corners are the centre: 1, ω, ω²."
    still_caption = (
        "Plane of the eigenphases, (θ₁ − θ₂)/√2 across and (θ₁ + θ₂ − 2θ₃)/√6 up; P = 1 in the middle."
    )

    def __init__(self) -> None:
        reach = 2 * np.pi * np.sqrt(2 / 3) * 1.12
        axis = np.linspace(-reach, reach, SIDE)
        x, y = np.meshgrid(axis, axis)
        self._angles = np.stack([y / np.sqrt(6) + x / np.sqrt(2), y / np.sqrt(6) - x / np.sqrt(2)], axis=-1)
        across, up = Ruler("(θ₁ − θ₂) / √2   [rad]"), Ruler("(θ₁ + θ₂ − 2θ₃) / √6   [rad]", upright=True)
        across.span(-reach, reach)
        up.span(-reach, reach)
        scales = {"x": across.scale, "y": up.scale}
        self._colours = bqplot.ColorScale(colors=list(CLOTH), min=0.0, max=1.0)
        # the page redraws when the image widget is another one, not when its bytes change: two in turn
        self._sheets = [
            ipywidgets.Image(format="png", value=png(np.zeros((1, 1, 3), np.uint8))) for _ in range(2)
        ]
        edges = [-reach, reach]
        self._map = bqplot.Image(image=self._sheets[0], x=edges, y=edges, scales=scales)
        self._bar = bqplot.ColorAxis(scale=self._colours, side="right", label="")
        self.figure = figure(
            [self._map, *_chamber_marks(scales)],
            across.axis,
            up.axis,
            self._bar,
            height=400,
            # the two plotted axes have the same length when the margins are taken off
            min_aspect_ratio=1.23,
            max_aspect_ratio=1.23,
            fig_margin={"top": 10, "bottom": 46, "left": 64, "right": 84},
        )

    def draw(self, site: SiteWeight, values: Mapping[str, float], quantity: str) -> None:
        """Show one quantity of W at the given values."""
        shown = QUANTITIES[quantity](site.density_at(self._angles, values))
        if quantity == "|W|":
            self._paint(shown, CLOTH, 0.0, float(shown.max()) or 1.0)
        else:
            reach = float(np.abs(shown).max()) or 1.0
            self._paint(shown, RAMP, -reach, reach)

    def still(self) -> str:
        """The map as a static picture, without axes."""
        data = b64encode(self._map.image.value).decode()
        return f'<img alt="W on the torus of eigenphases" width="260" src="data:image/png;base64,{data}">'

    def _paint(self, shown: np.ndarray, colours: tuple[str, ...], low: float, high: float) -> None:
        with self._colours.hold_sync():
            self._colours.colors, self._colours.min, self._colours.max = list(colours), low, high
        self._bar.tick_values = round_ticks(low, high, 5)
        sheet = self._sheets[self._map.image is self._sheets[0]]
        sheet.value = png(tinted(shown[::-1], colours, low, high))
        self._map.image = sheet


def _chamber_marks(scales: Mapping[str, bqplot.Scale]) -> list[bqplot.Mark]:
    """The outlined chamber, with its corners named."""
    x, y = _chamber_corners().T
    edge = bqplot.Lines(x=x, y=y, scales=scales, colors=["#111111"], close_path=True, stroke_width=1.5)
    discs = bqplot.Scatter(x=x, y=y, scales=scales, colors=["#ffffff"], stroke="#111111", default_size=330)
    names = bqplot.Label(
        x=x, y=y, text=["1", "ω", "ω²"], scales=scales, colors=["#111111"], align="middle",
        default_size=12, font_weight="bold", y_offset=2,
    )  # fmt: skip
    return [edge, discs, names]


def _chamber_corners() -> np.ndarray:
    """Corners of the chamber θ₁ ≥ θ₂ ≥ θ₃ ≥ θ₁ − 2π: the eigenphases of 1, ω, ω², shape (3, 2)."""
    turn = 2 * np.pi / 3
    phases = np.array([[0, 0, 0], [turn, turn, -2 * turn], [2 * turn, -turn, -turn]])
    first, second, third = phases.T
    return np.stack([(first - second) / np.sqrt(2), (first + second - 2 * third) / np.sqrt(6)], axis=-1)


class LinePicture:
    """Other groups: W along P = diag(e^{iθ}, …, e^{iθ}, e^{−i(N−1)θ}), which passes all centre elements."""

    def __init__(self, group: SU) -> None:
        self._theta = np.linspace(-np.pi, np.pi, 241)
        self._angles = np.repeat(self._theta[:, None], group.n - 1, axis=1)
        inside = "e^(iθ), e^(−iθ)" if group.n == 2 else f"e^(iθ), …, e^(iθ), e^(−{group.n - 1}iθ)"
        self.caption = f"W along P = diag({inside}), a line through every element of the centre."
        self.still_caption = self.caption
        across, self._up = Ruler("θ   [rad]"), Ruler("W", upright=True)
        across.span(-np.pi, np.pi)
        scales = {"x": across.scale, "y": self._up.scale}
        self._line = bqplot.Lines(x=self._theta, y=0 * self._theta, scales=scales, colors=[DYES[1]])
        zero = bqplot.Lines(x=[-np.pi, np.pi], y=[0.0, 0.0], scales=scales, colors=[INK], stroke_width=0.5)
        self.figure = figure([zero, self._line], across.axis, self._up.axis, height=320)

    def draw(self, site: SiteWeight, values: Mapping[str, float], quantity: str) -> None:
        """Show one quantity of W at the given values."""
        shown = QUANTITIES[quantity](site.density_at(self._angles, values))
        self._up.axis.label = quantity
        self._up.span(*padded(min(0.0, float(shown.min())), max(0.0, float(shown.max()))))
        self._line.y = shown

    def still(self) -> str:
        """The line as a static picture."""
        return curves_svg(self._theta, np.asarray(self._line.y)[None, :], "θ [rad]", self._up.axis.label)


def picture_for(group: SU) -> MapPicture | LinePicture:
    """The picture that suits a group."""
    return MapPicture() if group.n == 3 else LinePicture(group)
