"""The masses of the current point in the complex plane, with the trails of the scan."""

from __future__ import annotations

import bqplot
import numpy as np

from haarloom.widgets.charts import INK, Ruler, figure, padded
from haarloom.widgets.dyes import DYES

__all__ = ["PlaneChart"]


class PlaneChart:
    """Points at m = Re m + i Im m; the trails have the dyes of the masses chart."""

    def __init__(self) -> None:
        self._across = Ruler("Re m   [1/a]", ticks=4)
        self._up = Ruler("Im m   [1/a]", upright=True)
        scales = {"x": self._across.scale, "y": self._up.scale}
        self._trails = bqplot.Lines(x=[], y=[], scales=scales, colors=list(DYES), stroke_width=1.5)
        self._points = bqplot.Scatter(
            x=[], y=[], scales=scales, colors=[INK], default_size=48, stroke_width=0
        )
        self.figure = figure([self._trails, self._points], self._across.axis, self._up.axis, height=472)

    def draw(self, masses: np.ndarray) -> None:
        """Show the trails of a scan, masses of shape (levels, points)."""
        finite = np.isfinite(masses)
        self._across.span(*padded(0.0, float(masses.real.max(where=finite, initial=0.0))))
        reach = float(np.abs(masses.imag).max()) or 0.5
        self._up.span(*padded(-reach, reach, share=0.1))
        with self._trails.hold_sync():
            self._trails.x = np.where(finite, masses.real, np.nan)
            self._trails.y = np.where(finite, masses.imag, np.nan)

    def mark(self, masses: np.ndarray) -> None:
        """Show the current point, masses of shape (levels,)."""
        with self._points.hold_sync():
            self._points.x, self._points.y = masses.real, masses.imag
