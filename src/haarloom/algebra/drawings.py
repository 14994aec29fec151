"""Pictures of an irrep as SVG: its Young diagram and its weights.

Weights of SU(N) are drawn in the Coxeter plane: the content (c_1, …, c_N) goes to Σ_j c_j exp(2πi(j −
1)/N). For SU(3) this is the usual hexagonal picture, for SU(2) a line; for N ≥ 4 weights that fall on one
point add up. Colours are the page's own (``currentColor`` and its accent), so the pictures follow a light
or dark theme.
"""

from __future__ import annotations

import cmath
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from html import escape
from math import hypot, sqrt

from haarloom.algebra.invariants import dimension
from haarloom.algebra.labels import Rows, rows_from_labels
from haarloom.algebra.weights import weight_system

__all__ = ["Drawing", "draw_weights", "draw_young"]

Point = tuple[float, float]

_ACCENT = "var(--jp-brand-color1, #5872b4)"
_MOST_BOXES = 400
_MOST_POINTS = 1500
_LARGEST = 50_000
_CROWDED = 120
_CELL = 22
_STEP = 34


@dataclass(frozen=True)
class Drawing:
    """A picture with the same facts in words.

    Attributes
    ----------
    svg : str
        A complete ``<svg>`` element, to be placed inline.
    description : str
        What it shows, for readers who do not see it.
    """

    svg: str
    description: str

    def __str__(self) -> str:
        return self.description

    def __repr__(self) -> str:
        return f"Drawing({self.description!r})"

    def _repr_html_(self) -> str:
        return self.svg


def draw_young(rows: Rows, name: str) -> Drawing:
    """The Young diagram of an irrep; boxes on diagonals of even and odd content are shaded differently."""
    kept = tuple(row for row in rows if row)
    description = f"Young diagram of {name}: rows {', '.join(map(str, kept)) or 'none (trivial irrep)'}"
    if not kept:
        return _words("•", description)
    if sum(kept) > _MOST_BOXES:
        return _words(f"{sum(kept)} boxes", description)
    boxes = "".join(_box(i, j) for i, row in enumerate(kept) for j in range(row))
    return _framed(boxes, (-2, -2, _CELL * kept[0] + 4, _CELL * len(kept) + 4), description)


def draw_weights(labels: tuple[int, ...], name: str) -> Drawing:
    """The weights of an irrep: a disc for each, with one ring more for each further state.

    The convex outline of the weights of every multiplicity is drawn as a thread; the highest weight is
    filled.
    """
    n = len(labels) + 1
    if dimension(labels) > _LARGEST:
        return _words(
            f"{dimension(labels)} weights", f"weights of {name}: {dimension(labels)}, too many to draw"
        )
    points = _projected(n, weight_system(labels).items())
    description = f"weights of {name}: {sum(points.values())} states on {len(points)} points"
    if len(points) > _MOST_POINTS:
        return _words(f"{len(points)} points", description)
    (highest,) = _projected(n, [(rows_from_labels(labels), 1)])
    threads = "".join(_outline(points, level) for level in sorted(set(points.values()))) if n == 3 else ""
    mark = _ringed if len(points) <= _CROWDED else _sized(max(points.values()))
    discs = "".join(mark(point, count, point == highest) for point, count in sorted(points.items()))
    return _framed(threads + discs, _bounds(points), description)


def _projected(n: int, system: Iterable[tuple[Rows, int]]) -> dict[Point, int]:
    corners = [cmath.exp(2j * cmath.pi * j / n) for j in range(n)]
    found: dict[Point, int] = {}
    for content, count in system:
        place = sum(c * corner for c, corner in zip(content, corners, strict=True))
        point = (round(_STEP * place.real, 2) + 0.0, round(-_STEP * place.imag, 2) + 0.0)
        found[point] = found.get(point, 0) + count
    return found


def _box(i: int, j: int) -> str:
    shade = "0.22" if (j - i) % 2 == 0 else "0.08"
    return (
        f'<rect x="{j * _CELL + 1}" y="{i * _CELL + 1}" width="{_CELL - 2}" height="{_CELL - 2}" rx="3" '
        f'fill="{_ACCENT}" fill-opacity="{shade}" stroke="currentColor"/>'
    )


def _ringed(point: Point, count: int, highest: bool) -> str:
    """A disc with a ring for each further state; a number beyond four."""
    x, y = point
    rings = "".join(
        f'<circle cx="{x}" cy="{y}" r="{4 + 3 * ring}" fill="none" stroke="currentColor"/>'
        for ring in range(1, min(count, 4))
    )
    colour = _ACCENT if highest else "currentColor"
    number = (
        f'<text x="{x + 15}" y="{y - 8}" font-size="10" fill="currentColor">{count}</text>'
        if count > 4
        else ""
    )
    return f'{rings}<circle cx="{x}" cy="{y}" r="4" fill="{colour}"/>{number}'


def _sized(largest: int) -> Callable[[Point, int, bool], str]:
    """For crowded pictures: discs whose area grows with the multiplicity, in place of rings."""

    def mark(point: Point, count: int, highest: bool) -> str:
        colour = _ACCENT if highest else "currentColor"
        radius = max(3.0, 13 * sqrt(count / largest))
        return f'<circle cx="{point[0]}" cy="{point[1]}" r="{radius:.1f}" fill="{colour}"/>'

    return mark


def _outline(points: dict[Point, int], level: int) -> str:
    corners = _hull([point for point, count in points.items() if count >= level])
    path = " ".join(f"{x},{y}" for x, y in corners)
    return f'<polygon points="{path}" fill="none" stroke="{_ACCENT}" stroke-opacity="0.6"/>'


def _hull(points: list[Point]) -> list[Point]:
    """Convex hull, by the monotone chain of A. M. Andrew, *Inf. Process. Lett.* 9 (1979) 216."""
    chains: list[list[Point]] = []
    for ordered in (sorted(points), sorted(points, reverse=True)):
        chain: list[Point] = []
        for point in ordered:
            while len(chain) > 1 and _turn(chain[-2], chain[-1], point) <= 1e-6:
                chain.pop()
            chain.append(point)
        chains.append(chain[:-1])
    return chains[0] + chains[1] or points


def _turn(a: Point, b: Point, c: Point) -> float:
    return (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0])


def _bounds(points: Iterable[Point]) -> tuple[float, float, float, float]:
    reach = max((hypot(x, y) for x, y in points), default=0) + 24
    tall = max((abs(y) for _, y in points), default=0) + 24
    return (-reach, -tall, 2 * reach, 2 * tall)


def _framed(body: str, box: tuple[float, float, float, float], description: str) -> Drawing:
    view = " ".join(f"{value:g}" for value in box)
    svg = (
        f'<svg xmlns="http://www.w3.org/2000/svg" role="img" viewBox="{view}" width="{min(box[2], 480):g}" '
        f'style="max-width:100%;height:auto"><title>{escape(description)}</title>{body}</svg>'
    )
    return Drawing(svg, description)


def _words(shown: str, description: str) -> Drawing:
    text = f'<text x="4" y="18" font-size="14" fill="currentColor">{escape(shown)}</text>'
    return _framed(text, (0, 0, 12 + 8 * len(shown), 26), description)
