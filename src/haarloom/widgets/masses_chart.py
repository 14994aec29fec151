"""Two stacked charts, Re m and Im m against a parameter, with the complex stretches shaded."""

from __future__ import annotations

from collections.abc import Sequence

import bqplot
import ipywidgets
import numpy as np

from haarloom.widgets.charts import INK, Ruler, figure, padded
from haarloom.widgets.dyes import DYES

__all__ = ["MassesChart"]

SHADE = DYES[4]


class _Panel:
    """One chart: the levels, the shaded stretches, and the line of the current value."""

    def __init__(self, name: str, label: str, height: int) -> None:
        self.across, self.up = Ruler(name), Ruler(label, upright=True, ticks=5)
        scales = {"x": self.across.scale, "y": self.up.scale}
        self.shade = bqplot.Lines(
            x=[], y=[], scales=scales, fill="inside", colors=["transparent"], stroke_width=0, close_path=True,
        )  # fmt: skip
        self.levels = bqplot.Lines(x=[], y=[], scales=scales, colors=list(DYES), stroke_width=2)
        self.here = bqplot.Lines(x=[], y=[], scales=scales, colors=[INK], stroke_width=1, line_style="dashed")
        self.points = bqplot.Scatter(x=[], y=[], scales=scales, colors=[INK], default_size=30, stroke_width=0)
        marks = [self.shade, self.levels, self.here, self.points]
        self.figure = figure(marks, self.across.axis, self.up.axis, height=height)

    def draw(self, grid: np.ndarray, levels: np.ndarray, stretches: Sequence[tuple[float, float]]) -> None:
        # a vanishing eigenvalue has an infinite mass: the line stops there
        levels = np.where(np.isfinite(levels), levels, np.nan)
        low, high = padded(*_ends(levels))
        # the end caps of the axis would run through the first and the last tick label
        self.across.span(float(grid[0]), float(grid[-1]), margin=0.03)
        self.up.span(low, high)
        with self.levels.hold_sync():
            self.levels.x, self.levels.y = grid, levels
        with self.shade.hold_sync():
            # the front end takes one colour a curve, and leaves curves without one unfilled
            self.shade.fill_colors, self.shade.fill_opacities = (
                [SHADE] * len(stretches),
                [0.18] * len(stretches),
            )
            self.shade.x = np.array([[a, a, b, b] for a, b in stretches])
            self.shade.y = np.array([[low, high, high, low] for _ in stretches])

    def mark(self, value: float, heights: np.ndarray) -> None:
        with self.here.hold_sync():
            self.here.x = np.array([value, value])
            self.here.y = np.array([self.up.scale.min, self.up.scale.max])
        with self.points.hold_sync():
            self.points.x, self.points.y = np.full(len(heights), value), heights


def _ends(levels: np.ndarray) -> tuple[float, float]:
    if np.isnan(levels).all():
        return 0.0, 1.0
    return float(np.nanmin(levels)), float(np.nanmax(levels))


class MassesChart(ipywidgets.VBox):
    """Re m above Im m along a scan; each branch has its dye."""

    def __init__(self) -> None:
        self._re = _Panel("", "Re m   [1/a]", 236)
        self._im = _Panel("", "Im m   [1/a]", 236)
        super().__init__([self._re.figure, self._im.figure])
        self.add_class("hl-column")

    def draw(
        self, name: str, grid: np.ndarray, masses: np.ndarray, stretches: Sequence[tuple[float, float]]
    ) -> None:
        """Show masses of shape (levels, points) over a grid of shape (points,)."""
        for panel, part in ((self._re, masses.real), (self._im, masses.imag)):
            panel.across.axis.label = name
            panel.draw(grid, part, stretches)

    def mark(self, value: float, masses: np.ndarray) -> None:
        """Show where the current point is, masses of shape (levels,)."""
        self._re.mark(value, masses.real)
        self._im.mark(value, masses.imag)
