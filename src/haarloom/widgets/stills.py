"""Static pictures (SVG) for a pane's HTML face: what is on the screen, readable without a kernel."""

from __future__ import annotations

import math
from base64 import b64encode
from collections.abc import Sequence
from html import escape

import numpy as np

from haarloom.widgets.charts import round_ticks
from haarloom.widgets.dyes import DYES, dye
from haarloom.widgets.names import irrep_face

__all__ = ["bars_svg", "curves_svg", "grid_svg"]

INK = "#808080"
"""Text and axes: a picture does not know the page's theme, and this grey is legible on white and on black."""

WIDTH, LEFT, BOTTOM, TOP = 460, 56, 34, 8
MOST_POINTS = 101
"""Points of a curve: a still of this width shows no more."""

MOST_ROWS = 36
"""Rows of a matrix: the rest is left out, and said so."""


def curves_svg(
    x: np.ndarray,
    curves: np.ndarray,
    across: str,
    up: str,
    *,
    here: float | None = None,
    shaded: Sequence[tuple[float, float]] = (),
    height: int = 190,
) -> str:
    """Curves of shape (lines, points) over x; gaps where they are not finite."""
    finite = curves[np.isfinite(curves)]
    low, high = (float(finite.min()), float(finite.max())) if finite.size else (0.0, 1.0)
    margin = 0.06 * (high - low) or 0.5
    frame = _Frame(float(x[0]), float(x[-1]), low - margin, high + margin, height)
    bands = "".join(
        f'<rect x="{frame.x(a):.1f}" y="{TOP}" width="{frame.x(b) - frame.x(a):.1f}" height="{frame.depth}" '
        f'fill="{DYES[4]}" opacity=".18"/>'
        for a, b in shaded
    )
    step = max(1, math.ceil(len(x) / MOST_POINTS))
    lines = "".join(
        f'<path d="{frame.path(x[::step], line[::step])}" fill="none" stroke="{dye(number)}"/>'
        for number, line in enumerate(curves)
    )
    mark = ""
    if here is not None and x[0] <= here <= x[-1]:
        rod = f"M{frame.x(here):.1f} {TOP}v{frame.depth}"
        mark = f'<path d="{rod}" stroke="{INK}" stroke-dasharray="4 3"/>'
    return frame.svg(bands + lines + mark, across, up)


def bars_svg(
    names: Sequence[str], heights: np.ndarray, dyes: Sequence[int], up: str, height: int = 170
) -> str:
    """A bar for each irrep, in the dye of its N-ality."""
    low, high = min(0.0, float(heights.min())), max(0.0, float(heights.max())) or 1.0
    frame = _Frame(0.0, float(len(names)), low, high * 1.05, height)
    bars, labels = "", ""
    for number, (name, value, colour) in enumerate(zip(names, heights, dyes, strict=True)):
        foot, head = sorted((frame.y(0.0), frame.y(float(value))), reverse=True)
        bars += (
            f'<rect x="{frame.x(number + 0.15):.1f}" y="{head:.1f}" width="{frame.x(0.7) - LEFT:.1f}" '
            f'height="{foot - head:.1f}" fill="{dye(colour)}"/>'
        )
        labels += _text(frame.x(number + 0.5), TOP + frame.depth + 14, irrep_face(name))
    return frame.svg(bars + labels, "", up, ticks_across=False)


def grid_svg(
    names: Sequence[str], steps: np.ndarray, pattern: np.ndarray, magnitudes: np.ndarray, order: int
) -> str:
    """Squares where an element is not identically zero, larger for larger |T| on a log scale.

    Parameters
    ----------
    steps
        N-ality of row − column modulo ``order``: the dye, shape (n, n).
    pattern, magnitudes
        Whether an element is not identically zero, and |T|, shape (n, n).
    """
    shown = min(len(names), MOST_ROWS)
    cell, edge = (24, 46) if shown <= 21 else (15, 46)
    largest = float(magnitudes.max()) or 1.0
    marks = [_text(edge - 6, edge + cell * (k + 0.5) + 4, irrep_face(names[k]), "end") for k in range(shown)]
    marks += [_upright(edge + cell * (k + 0.5) + 4, edge - 6, irrep_face(names[k])) for k in range(shown)]
    for row, column in zip(*np.nonzero(pattern[:shown, :shown]), strict=True):
        size = float(magnitudes[row, column]) / largest
        side = cell * (0.25 + 0.65 * max(0.0, 1 + math.log10(size) / 6) if size > 0 else 0.15)
        x, y = edge + cell * (column + 0.5) - side / 2, edge + cell * (row + 0.5) - side / 2
        marks.append(
            f'<rect x="{x:.1f}" y="{y:.1f}" width="{side:.1f}" height="{side:.1f}" '
            f'fill="{dye(int(steps[row, column]))}"/>'
        )
    whole = edge + cell * shown + 2
    note = f" The first {shown} of {len(names)} irreps." if shown < len(names) else ""
    frame = (
        f'<rect x="{edge}" y="{edge}" width="{cell * shown}" height="{cell * shown}" fill="none" '
        f'stroke="{INK}" opacity=".4"/>'
    )
    legend = (
        "Rows r, columns s; a square where the element is not identically zero, larger for larger |T| "
        f"(log scale), in the dye of the N-ality of r − s mod {order}.{note}"
    )
    return f"{_svg(whole, whole, frame + ''.join(marks), 'Pattern of the transfer matrix')}<p>{legend}</p>"


class _Frame:
    """Pixel places of a chart with axes."""

    def __init__(self, left: float, right: float, low: float, high: float, height: int) -> None:
        self._ends = (left, right, low, high)
        self._height = height
        self.depth = height - TOP - BOTTOM

    def x(self, value: float) -> float:
        left, right, _, _ = self._ends
        return LEFT + (WIDTH - LEFT - 12) * (value - left) / ((right - left) or 1.0)

    def y(self, value: float) -> float:
        _, _, low, high = self._ends
        return TOP + self.depth * (high - value) / ((high - low) or 1.0)

    def path(self, x: np.ndarray, y: np.ndarray) -> str:
        pieces, pen = [], "M"
        for a, b in zip(x, y, strict=True):
            if math.isfinite(b):
                pieces.append(f"{pen}{self.x(a):.1f} {self.y(b):.1f}")
            pen = "L" if math.isfinite(b) else "M"
        return "".join(pieces)

    def svg(self, inside: str, across: str, up: str, *, ticks_across: bool = True) -> str:
        left, right, low, high = self._ends
        floor = TOP + self.depth
        ticks = [_text(LEFT - 6, self.y(v) + 4, f"{v:g}", "end") for v in round_ticks(low, high, 4)]
        if ticks_across:
            ticks += [_text(self.x(v), floor + 14, f"{v:g}") for v in round_ticks(left, right, 6)]
        axes = (
            f'<path d="M{LEFT} {TOP}V{floor}H{WIDTH - 12}" fill="none" stroke="{INK}" opacity=".6"/>'
            + "".join(ticks)
            + _text(LEFT + (WIDTH - LEFT) / 2, self._height - 4, across)
            + _upright(12, TOP + self.depth / 2, up, "middle")
        )
        return _svg(WIDTH, self._height, inside + axes, f"{up} against {across}" if across else up)


def _svg(width: int, height: int, inside: str, alt: str) -> str:
    size = f'width="{width}" height="{height}" viewBox="0 0 {width} {height}"'
    look = 'font-family="sans-serif" font-size="11" stroke-width="1.5"'
    picture = f'<svg xmlns="http://www.w3.org/2000/svg" {size} {look}>{inside}</svg>'
    data = b64encode(picture.encode()).decode()
    # notebooks that are not trusted lose inline SVG to the sanitiser, but keep pictures
    return f'<img alt="{escape(alt)}" width="{width}" src="data:image/svg+xml;base64,{data}">'


def _text(x: float, y: float, words: str, anchor: str = "middle") -> str:
    return f'<text x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}" fill="{INK}">{escape(words)}</text>'


def _upright(x: float, y: float, words: str, anchor: str = "start") -> str:
    turned = f'<g transform="translate({x:.1f} {y:.1f}) rotate(-90)">'
    return f"{turned}{_text(0, 0, words, anchor)}</g>"
