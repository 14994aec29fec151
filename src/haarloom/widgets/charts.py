"""Axes and figures in the style of the panes (bqplot)."""

from __future__ import annotations

from collections.abc import Sequence
from math import ceil, floor, log10
from typing import Any

import bqplot

from haarloom.widgets.dyes import GRID

__all__ = ["INK", "Ruler", "figure", "padded", "round_ticks"]

INK = "var(--jp-ui-font-color1, gray)"
"""The text colour of the host's theme."""


class Ruler:
    """A linear scale and its labelled axis, with round ticks."""

    def __init__(self, label: str, *, upright: bool = False, ticks: int = 6) -> None:
        self._most = ticks
        self.scale = bqplot.LinearScale(min=0.0, max=1.0)
        placement = {"side": "left"} if upright else {}
        self.axis = bqplot.Axis(
            scale=self.scale,
            label=label,
            label_color=INK,
            grid_color=GRID,
            tick_style={"font-size": "11px"},
            label_offset="48px" if upright else "34px",
            **placement,
        )

    def span(self, low: float, high: float, *, margin: float = 0.0) -> None:
        """Show the range from low to high, with ticks inside it and a share of room beyond its ends."""
        ticks = round_ticks(low, high, self._most)
        low, high = low - margin * (high - low), high + margin * (high - low)
        if (self.scale.min, self.scale.max) == (low, high):
            return
        with self.scale.hold_sync():
            self.scale.min, self.scale.max = low, high
        self.axis.tick_values = ticks


def figure(
    marks: Sequence[bqplot.Mark], *axes: bqplot.Axis, height: int = 240, **options: Any
) -> bqplot.Figure:
    """A figure that fills the width of its column."""
    settings: dict[str, Any] = {
        "fig_margin": {"top": 10, "bottom": 46, "left": 64, "right": 18},
        "layout": {"width": "100%", "min_width": "0", "height": f"{height}px"},
        "padding_x": 0.0,
        "padding_y": 0.0,
        "display_toolbar": False,
        "background_style": {"fill": "transparent"},
    }
    return bqplot.Figure(marks=list(marks), axes=list(axes), **(settings | options))


def padded(low: float, high: float, share: float = 0.06) -> tuple[float, float]:
    """A range with room at both ends; a single value gets a range of its own size."""
    width = high - low
    if width <= 1e-9 * max(1.0, abs(high)):
        width = max(0.5, abs(high))
    return low - share * width, high + share * width


def round_ticks(low: float, high: float, most: int = 6) -> list[float]:
    """Round numbers (1, 2 or 5 times a power of ten apart) inside a range, at most ``most`` + 1.

    Examples
    --------
    >>> round_ticks(-0.06, 2.06)
    [0.0, 0.5, 1.0, 1.5, 2.0]
    """
    if not high > low:
        return [low]
    power = 10.0 ** floor(log10((high - low) / most))
    step = next(m * power for m in (1, 2, 5, 10) if m * power >= (high - low) / most * (1 - 1e-9))
    first, last = ceil(low / step - 1e-9), floor(high / step + 1e-9)
    return [float(f"{k * step:.10g}") + 0.0 for k in range(first, last + 1)]
