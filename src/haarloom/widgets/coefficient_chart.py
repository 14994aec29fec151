"""Pictures of link coefficients: their sizes, and −ln k_r beside Casimir scaling."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import bqplot
import ipywidgets
import numpy as np

from haarloom.widgets.charts import INK, Ruler, figure, padded
from haarloom.widgets.dyes import DYES, dye
from haarloom.widgets.names import irrep_face

if TYPE_CHECKING:
    from haarloom.algebra.irrep import Irrep

__all__ = ["CoefficientChart"]


class CoefficientChart(ipywidgets.Box):
    """Bars of k_r by irrep, coloured by N-ality; and −ln k_r against C₂ with the line of Casimir scaling."""

    def __init__(self) -> None:
        self._names = bqplot.OrdinalScale()
        self._size = Ruler("kᵣ", upright=True, ticks=5)
        self._bars = bqplot.Bars(x=[], y=[], scales={"x": self._names, "y": self._size.scale}, padding=0.25)
        names = bqplot.Axis(
            scale=self._names,
            label="irrep r",
            label_color=INK,
            label_offset="34px",
            grid_lines="none",
            tick_style={"font-size": "11px"},
        )
        bars = figure([self._bars], names, self._size.axis, height=240)
        super().__init__([bars, self._tension_figure()])
        self.add_class("hl-pictures")

    def _tension_figure(self) -> bqplot.Figure:
        self._casimir, self._tension = (
            Ruler("quadratic Casimir C₂(r)"),
            Ruler("−ln kᵣ", upright=True, ticks=6),
        )
        scales = {"x": self._casimir.scale, "y": self._tension.scale}
        self._scaling = bqplot.Lines(
            x=[0, 0], y=[0, 0], scales=scales, colors=[INK], stroke_width=1, line_style="dashed"
        )
        self._points = bqplot.Scatter(x=[], y=[], scales=scales, colors=[DYES[1]], default_size=40)
        marks = [self._scaling, self._points]
        return figure(marks, self._casimir.axis, self._tension.axis, height=240)

    def draw(self, irreps: Sequence[Irrep], k: np.ndarray) -> None:
        """Show real k_r, shape (n,), of irreps of which the first is trivial and the second fundamental."""
        with self._bars.hold_sync():
            self._bars.x = [irrep_face(irrep.name) for irrep in irreps]
            self._bars.y = k
            self._bars.colors = [dye(irrep.nality) for irrep in irreps]
        self._size.span(min(0.0, float(k.min()) * 1.05), max(1.0, float(k.max())) * 1.05)
        casimirs = np.array([float(irrep.casimir(2)) for irrep in irreps])
        positive = k > 0
        heights = -np.log(k[positive])
        with self._points.hold_sync():
            self._points.x, self._points.y = casimirs[positive], heights
        reach = float(casimirs.max()) * 1.05
        self._casimir.span(0.0, reach)
        self._tension.span(*padded(min(0.0, float(heights.min())), float(heights.max())))
        slope = -np.log(k[1]) / casimirs[1] if k[1] > 0 else 0.0
        with self._scaling.hold_sync():
            self._scaling.x, self._scaling.y = np.array([0.0, reach]), np.array([0.0, slope * reach])

    def clear(self) -> None:
        """Show nothing: the weight has no single coefficients."""
        self._bars.y = np.zeros(len(self._bars.x))
        self._points.x = self._points.y = self._scaling.x = self._scaling.y = np.zeros(0)
