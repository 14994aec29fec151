"""Small pictures and tables for a notebook: SVG and HTML that follow the page's own colours."""

from __future__ import annotations

import base64
import struct
import zlib
from collections.abc import Sequence
from html import escape

import numpy as np
from numpy.typing import NDArray

__all__ = ["band_picture", "heat_picture", "line_picture", "plane_picture", "table_html"]

_WIDTH, _HEIGHT, _SQUARE, _LEFT, _BOTTOM, _TOP, _RIGHT = 420, 260, 340, 64, 44, 14, 14
_DASHES = ("none", "6 3", "2 3", "8 3 2 3")
_BAND, _SHADES = 28, (0.0, 0.3, 1.0)
_BLUE, _RED = (42, 102, 184), (186, 44, 44)


def table_html(
    head: Sequence[str], rows: Sequence[Sequence[str]], caption: str = "", words: bool = False
) -> str:
    """An HTML table with every cell escaped, its columns to the left where they hold words."""
    style = ' style="text-align:left"' if words else ""
    top = "".join(f"<th{style}>{escape(cell)}</th>" for cell in head)
    body = "".join(
        "<tr>" + "".join(f"<td{style}>{escape(cell)}</td>" for cell in row) + "</tr>" for row in rows
    )
    title = f"<caption>{escape(caption)}</caption>" if caption else ""
    return f"<table>{title}<tr>{top}</tr>{body}</table>"


def line_picture(
    x: NDArray[np.float64],
    curves: Sequence[NDArray[np.float64]],
    across: str,
    up: str,
    names: Sequence[str] = (),
) -> str:
    """Curves over one axis as SVG text, told apart by dashes; numbers that are not finite leave a gap."""
    finite = np.concatenate([np.asarray(c, dtype=float)[np.isfinite(c)] for c in curves])
    low, high = (float(finite.min()), float(finite.max())) if len(finite) else (0.0, 1.0)
    span = (high - low) or abs(high) or 1.0
    low, high = low - 0.04 * span, high + 0.04 * span
    left, right = float(np.min(x)), float(np.max(x)) or 1.0
    frame = _Frame(left, right if right > left else left + 1.0, low, high)
    paths = "".join(_path(frame, x, curve, _DASHES[i % len(_DASHES)]) for i, curve in enumerate(curves))
    legend = "".join(_legend(i, name) for i, name in enumerate(names))
    return _svg(_WIDTH, _HEIGHT, f"{up} against {across}", frame.axes(across, up) + paths + legend)


def heat_picture(
    values: NDArray[np.float64],
    corners: tuple[float, float, float, float],
    across: str,
    up: str,
    outline: Sequence[tuple[float, float, str]] = (),
) -> str:
    """A real function on a grid as an image in SVG text: blue where positive, red where negative, faint
    near zero.

    Parameters
    ----------
    values : ndarray, shape (rows, columns)
        nan where nothing is shown; row 0 is at the bottom.
    corners : tuple
        Left, right, bottom, top of the axes; one unit is as long across as up if they span a square.
    outline : sequence of (x, y, name)
        Corners of a closed line drawn on top, with their names.
    """
    frame = _Frame(*corners, side=_SQUARE)
    strength = np.nan_to_num(values) / (float(np.nanmax(np.abs(values))) or 1.0)
    pixels = np.zeros((*values.shape, 4), dtype=np.uint8)
    pixels[..., :3] = np.where(strength[..., None] < 0, _RED, _BLUE)
    pixels[..., 3] = np.round(255 * np.abs(strength))
    image = base64.b64encode(_png(pixels[::-1])).decode("ascii")
    body = (
        f'<image x="{_LEFT}" y="{_TOP}" width="{frame.width}" height="{frame.height}" '
        f'preserveAspectRatio="none" href="data:image/png;base64,{image}"/>'
    )
    places = [(*frame.place(x, y), name) for x, y, name in outline]
    line = " ".join(f"{x:.1f},{y:.1f}" for x, y, _ in places)
    marks = f'<polygon points="{line}" fill="none" stroke="currentColor"/>' if places else ""
    marks += "".join(_text(x, y - 5, name, "middle") for x, y, name in places)
    width = frame.width + _LEFT + _RIGHT
    return _svg(width, _SQUARE, f"map over {across} and {up}", body + marks + frame.axes(across, up))


def band_picture(bands: Sequence[tuple[float, float, str]], across: str, kinds: Sequence[str]) -> str:
    """Stretches of one axis as SVG text, told apart by how dark they are, with a legend.

    Parameters
    ----------
    bands : sequence of (from, to, what)
        In order.
    kinds : sequence of str
        What there is: the first stays empty, the second is grey, any other dark.
    """
    height = _TOP + _BAND + _BOTTOM
    frame = _Frame(bands[0][0], bands[-1][1], 0.0, 1.0, height=height)
    body = ""
    for start, stop, what in bands:
        left, right = frame.place(start, 0.0)[0], frame.place(stop, 0.0)[0]
        opacity = _SHADES[min(kinds.index(what), len(_SHADES) - 1)]
        body += (
            f'<rect x="{left:.2f}" y="{_TOP}" width="{max(right - left, 1.0):.2f}" height="{_BAND}" '
            f'fill="currentColor" fill-opacity="{opacity}"><title>{escape(what)}</title></rect>'
        )
    x, y = 10, height + 12
    for place, what in enumerate(kinds):
        opacity = _SHADES[min(place, len(_SHADES) - 1)]
        body += (
            f'<rect x="{x}" y="{y - 9}" width="14" height="9" stroke="currentColor" '
            f'fill="currentColor" fill-opacity="{opacity}"/>' + _text(x + 20, y, what, "start")
        )
        x += 44 + 6 * len(what)
    return _svg(_WIDTH, height + 18, f"stretches of {across}", body + frame.axes(across, ""))


def plane_picture(
    curves: Sequence[NDArray[np.float64]],
    corners: tuple[float, float, float, float],
    across: str,
    up: str,
    marks: Sequence[tuple[float, float, str]] = (),
) -> str:
    """Curves in a plane as SVG text.

    Parameters
    ----------
    curves : sequence of ndarray, shape (M, 2)
    corners : tuple
        Left, right, bottom, top of the axes.
    marks : sequence of (x, y, name)
        Points drawn as dots, with their names.
    """
    frame = _Frame(*corners)
    body = "".join(_path(frame, curve[:, 0], curve[:, 1], "none") for curve in curves)
    for x, y, name in marks:
        px, py = frame.place(x, y)
        body += f'<circle cx="{px:.2f}" cy="{py:.2f}" r="3" fill="currentColor"/>'
        body += _text(px + 6, py - 5, name, "start")
    return _svg(_WIDTH, _HEIGHT, f"curves over {across} and {up}", body + frame.axes(across, up))


def _png(pixels: NDArray[np.uint8]) -> bytes:
    """Pixels (rows, columns, 4) of red, green, blue and opacity as a PNG file (ISO/IEC 15948)."""
    rows = b"".join(b"\0" + row.tobytes() for row in pixels)
    head = struct.pack(">IIBBBBB", pixels.shape[1], pixels.shape[0], 8, 6, 0, 0, 0)
    chunks = ((b"IHDR", head), (b"IDAT", zlib.compress(rows, 9)), (b"IEND", b""))
    return b"\x89PNG\r\n\x1a\n" + b"".join(
        struct.pack(">I", len(data)) + name + data + struct.pack(">I", zlib.crc32(name + data))
        for name, data in chunks
    )


class _Frame:
    """The axes' rectangle and the map from numbers to places in it; square where a side is given."""

    def __init__(
        self,
        left: float,
        right: float,
        low: float,
        high: float,
        side: int | None = None,
        height: int = _HEIGHT,
    ) -> None:
        self.left, self.right, self.low, self.high = left, right, low, high
        self.height = (side or height) - _BOTTOM - _TOP
        self.width = self.height if side else _WIDTH - _LEFT - _RIGHT

    def place(self, x: float, y: float) -> tuple[float, float]:
        across = (x - self.left) / (self.right - self.left)
        up = (y - self.low) / (self.high - self.low)
        return _LEFT + across * self.width, _TOP + (1 - up) * self.height

    def axes(self, across: str, up: str) -> str:
        size = f'x="{_LEFT}" y="{_TOP}" width="{self.width}" height="{self.height}"'
        marks = [f'<rect {size} fill="none" stroke="currentColor"/>']
        bottom = _TOP + self.height
        for share in (0.0, 0.5, 1.0):
            x, y = self.left + share * (self.right - self.left), self.low + share * (self.high - self.low)
            px, py = self.place(x, y)
            marks.append(_text(px, bottom + 16, f"{x:.3g}", "middle"))
            if up:
                marks.append(_text(_LEFT - 6, py + 4, f"{y:.3g}", "end"))
        middle = _TOP + self.height / 2
        marks.append(_text(_LEFT + self.width / 2, bottom + 36, across, "middle"))
        marks.append(f'<g transform="rotate(-90 14 {middle})">{_text(14, middle, up, "middle")}</g>')
        return "".join(marks)


def _path(frame: _Frame, x: NDArray[np.float64], y: NDArray[np.float64], dashes: str) -> str:
    steps, pen = [], "M"
    for a, b in zip(np.asarray(x, dtype=float), np.asarray(y, dtype=float), strict=True):
        if np.isfinite(b):
            steps.append("{}{:.2f} {:.2f}".format(pen, *frame.place(a, b)))
            pen = "L"
        else:
            pen = "M"
    look = f'fill="none" stroke="currentColor" stroke-width="1.6" stroke-dasharray="{dashes}"'
    return f'<path d="{" ".join(steps)}" {look}/>'


def _legend(index: int, name: str) -> str:
    y = _TOP + 16 + 16 * index
    line = f'<line x1="{_LEFT + 8}" x2="{_LEFT + 36}" y1="{y - 4}" y2="{y - 4}" stroke="currentColor" '
    return (
        line + f'stroke-dasharray="{_DASHES[index % len(_DASHES)]}"/>' + _text(_LEFT + 42, y, name, "start")
    )


def _text(x: float, y: float, text: str, anchor: str) -> str:
    look = f'font-size="11" fill="currentColor" text-anchor="{anchor}"'
    return f'<text x="{x:.1f}" y="{y:.1f}" {look}>{escape(text)}</text>'


def _svg(width: int, height: int, title: str, body: str) -> str:
    return (
        f'<svg role="img" viewBox="0 0 {width} {height}" width="{width}" height="{height}" '
        f'xmlns="http://www.w3.org/2000/svg"><title>{escape(title)}</title>{body}</svg>'
    )
