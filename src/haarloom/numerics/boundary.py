"""The boundary of the complex region: exceptional points followed as curves in a plane of two parameters."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.whole_numbers import whole_number
from haarloom.exceptions import ParameterError
from haarloom.numerics.bordered import unit
from haarloom.numerics.continuation import Chart, Path, State, corrected, passes, tangent_at, traced
from haarloom.numerics.cutoff import checked_levels
from haarloom.numerics.mergers import SAMPLES, FloatMerger, MatrixFamily, mergers_on, sufficient_cutoff
from haarloom.numerics.parameters import checked_values, parameter_names, plain_numbers
from haarloom.numerics.threads import single_threaded
from haarloom.numerics.truncation import truncate
from haarloom.numerics.turning_points import CUSP, with_turns

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["BoundaryCurve", "ComplexBoundary", "complex_boundary"]


@dataclass(frozen=True, eq=False)
class BoundaryCurve:
    """One connected piece of the boundary, as a polygon.

    Attributes
    ----------
    points
        (x, y) along the curve, shape (M, 2).
    eigenvalue, mass
        λ* of the merging pair and −ln|λ*/λ_0|, shape (M,).
    level
        Position of the pair among the masses at each point, shape (M,), 1 for the two lowest.
    error
        Estimated distance across the curve to that of the untruncated T, in units of the box, shape (M,).
    folds
        For each axis the indices of the points at which it turns round, located to full precision: the
        turning parameter to that of ``points``, the other one to about its square root.
    cusps
        Indices of the points at which three levels meet and the curve has a tip, located like them.
    closed
        Whether the curve ends where it began; then the first point is the last one, too.
    complete
        Whether it is closed or ends on the edge of the box at both ends. Otherwise it was given up after
        ``most_points``, or where it is no smooth curve any more: where a level vanishes, or levels meet
        with vectors of their own, as all of equal Casimir do in a corner z = z̄ = 0.
    """

    points: NDArray[np.float64]
    eigenvalue: NDArray[np.float64]
    mass: NDArray[np.float64]
    level: NDArray[np.int64]
    error: NDArray[np.float64]
    folds: tuple[tuple[int, ...], tuple[int, ...]]
    cusps: tuple[int, ...]
    closed: bool
    complete: bool


@dataclass(frozen=True, eq=False)
class ComplexBoundary:
    """Curves on which real levels merge into complex pairs.

    Attributes
    ----------
    axes
        Names of x and y.
    box
        ((x from, x to), (y from, y to)).
    curves
        One for each connected piece that was found.
    unsettled
        Points (x, y) near which levels merge according to the lines across the box, and which lie on no
        curve because Newton's method did not settle.
    cutoff
        Basis that was used.
    fixed
        Values of the other parameters.
    """

    axes: tuple[str, str]
    box: tuple[tuple[float, float], tuple[float, float]]
    curves: tuple[BoundaryCurve, ...]
    unsettled: tuple[tuple[float, float], ...]
    cutoff: int
    fixed: Mapping[str, float | complex]

    def __repr__(self) -> str:
        sizes = ", ".join(str(len(curve.points)) for curve in self.curves) or "none"
        open_ends = f"; {len(self.unsettled)} mergers not settled" if self.unsettled else ""
        return (
            f"ComplexBoundary({self.axes[0]}, {self.axes[1]}; curves of {sizes} points; "
            f"cutoff {self.cutoff}{open_ends})"
        )

    def _repr_html_(self) -> str:
        from html import escape

        from haarloom.actions.pictures import plane_picture

        cusps = [(*curve.points[place], "cusp") for curve in self.curves for place in curve.cusps]
        sizes = np.array([upper - lower for lower, upper in self.box])
        folds = [
            (*point, "fold")
            for curve in self.curves
            for point in curve.points[[*curve.folds[0], *curve.folds[1]]]
            # one as close to a tip as its name is long would only cover it
            if all(np.linalg.norm((point - cusp[:2]) / sizes) > 0.03 for cusp in cusps)
        ]
        marks = [*cusps, *folds]
        corners = (*self.box[0], *self.box[1])
        picture = plane_picture([curve.points for curve in self.curves], corners, *self.axes, marks)
        return f"{picture}<p>{escape(repr(self))}</p>"


@single_threaded
def complex_boundary(
    model: RingModel,
    levels: int = 3,
    step: float = 0.02,
    lines: int = 5,
    most_points: int = 2000,
    cutoff: int | None = None,
    **values: Any,
) -> ComplexBoundary:
    """Follow the mergers of the leading levels through a plane of two parameters.

    Parameters
    ----------
    levels
        Leading levels, the ground level included, whose mergers start a curve; 3 for the lowest pair.
    step
        Largest distance of neighbouring points, as a part of the box.
    lines
        Lines across the box in each direction on which starting points are looked for.
    most_points
        Where a curve that neither closes nor leaves the box is given up.
    cutoff
        Basis; chosen from the error bound at the corners of the box when left out.
    **values
        A pair (from, to) for exactly two parameters, the axes; one number for each other one.

    Raises
    ------
    ParameterError
        If not exactly two parameters have a pair, a pair is empty, an option is out of range, or T is
        not real.

    Examples
    --------
    >>> import haarloom as hl
    >>> G = hl.SU(3)
    >>> model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    >>> boundary = complex_boundary(model, z=(0.3, 0.6), t=(0.8, 1.2), step=0.1, lines=2)
    >>> len(boundary.curves)
    1
    """
    axes, box, fixed = _plane(model, values)
    count = checked_levels(levels)
    if not 0 < step <= 1:
        raise ParameterError(f"step = {step!r}: give a part of the box, more than 0 and at most 1.")
    across = whole_number("lines", lines, 1, "lines across the box in each direction")
    most = whole_number("most_points", most_points, 1, "points of a curve")
    if cutoff is None:
        corners = [{**fixed, axes[0]: x, axes[1]: y} for x in box[0] for y in box[1]]
        cutoff = sufficient_cutoff(model, corners, count + 1)
    family = MatrixFamily(model, cutoff, axes, fixed)
    paths: list[tuple[Chart, Path]] = []
    unsettled: list[NDArray[np.float64]] = []
    for point, merger in _seeds(family, box, count, across):
        chart, start = _started(family, box, point, merger)
        if start is None:
            unsettled.append(point)
        elif not any(_on_path(other, path, start, step) for other, path in paths):
            paths.append((chart, traced(chart, start, step, most)))
    curves = tuple(_curve(family, chart, path) for chart, path in paths)
    left = tuple((float(x), float(y)) for x, y in _away(unsettled, curves, box, step))
    return ComplexBoundary(axes, (tuple(box[0]), tuple(box[1])), curves, left, cutoff, fixed)


def _plane(
    model: RingModel, values: Mapping[str, Any]
) -> tuple[tuple[str, str], NDArray[np.float64], dict[str, Any]]:
    pairs = {name: value for name, value in values.items() if isinstance(value, tuple | list)}
    if len(pairs) != 2 or any(len(pair) != 2 for pair in pairs.values()):
        raise ParameterError(
            f"{len(pairs)} parameters have a range: give a pair (from, to) for exactly two of "
            f"{', '.join(parameter_names(model))}, e.g. z=(0.1, 1.0), t=(0.2, 2.0); numbers for the others."
        )
    ends = [{name: pair[end] for name, pair in pairs.items()} for end in (0, 1)]
    low, high = (plain_numbers(checked_values(model, {**values, **end})) for end in ends)
    fixed = {name: value for name, value in low.items() if name not in pairs}
    box = np.array([[low[name], high[name]] for name in pairs])
    if np.iscomplexobj(box) or not (box[:, 0] < box[:, 1]).all():
        raise ParameterError("a range is empty or not real: give the smaller end first, e.g. z=(0.1, 1.0).")
    axes = tuple(pairs)
    return (axes[0], axes[1]), box, fixed


def _seeds(
    family: MatrixFamily, box: NDArray[np.float64], levels: int, lines: int
) -> Iterator[tuple[NDArray[np.float64], FloatMerger | None]]:
    """Mergers on lines across the box: (x, y) and what was found there, None where nothing settles."""
    for axis in (0, 1):
        grid = np.linspace(box[axis, 0], box[axis, 1], SAMPLES)
        for value in np.linspace(box[1 - axis, 0], box[1 - axis, 1], lines):
            fixed = {**family.fixed, family.names[1 - axis]: float(value)}
            line = MatrixFamily(family.model, family.cutoff, (family.names[axis],), fixed)
            for place, merger in mergers_on(line, grid, levels):
                yield np.array([place, value] if axis == 0 else [value, place]), merger


def _started(
    family: MatrixFamily, box: NDArray[np.float64], point: NDArray[np.float64], merger: FloatMerger | None
) -> tuple[Chart, State | None]:
    if merger is None:
        return Chart(family, 1.0, box), None
    chart = Chart(family, float(np.sign(merger.eigenvalue)), box)
    unknowns = chart.unknowns(merger.eigenvalue, point.tolist())
    borders = unit(merger.bordered.left), unit(merger.bordered.right)
    across = tangent_at(chart, State(unknowns, chart.evaluate(unknowns, borders), borders))
    return chart, corrected(chart, unknowns, across, borders)


def _on_path(chart: Chart, path: Path, start: State, step: float) -> bool:
    """Whether a curve runs through a point: asked of the nearest point of each of its sheets."""
    places = np.array([state.unknowns for state in path.states])
    distance = np.linalg.norm(places - start.unknowns, axis=1)
    around = np.pad(distance, 1, constant_values=np.inf)
    lowest = (distance <= around[:-2]) & (distance <= around[2:]) & (distance <= 1.5 * step)
    return any(passes(chart, path.states[i], start) for i in np.flatnonzero(lowest))


def _away(
    points: Sequence[NDArray[np.float64]],
    curves: Sequence[BoundaryCurve],
    box: NDArray[np.float64],
    step: float,
) -> list[NDArray[np.float64]]:
    """Those of the points that are further than a step from every curve."""
    size = box[:, 1] - box[:, 0]
    return [
        point
        for point in points
        if all(np.linalg.norm((curve.points - point) / size, axis=1).min() > step for curve in curves)
    ]


def _curve(family: MatrixFamily, chart: Chart, traced_path: Path) -> BoundaryCurve:
    path, turns = with_turns(chart, traced_path)
    in_x, in_y, cusps = (tuple(turn.index for turn in turns if turn.kind == kind) for kind in (0, 1, CUSP))
    eigenvalue = np.array([chart.level(state.unknowns) for state in path.states])
    grounds, levels, errors = zip(
        *(_surroundings(family, chart, state, 2 + (i in cusps)) for i, state in enumerate(path.states)),
        strict=True,
    )
    return BoundaryCurve(
        points=np.array([chart.point(state.unknowns) for state in path.states]),
        eigenvalue=eigenvalue,
        mass=-np.log(np.abs(eigenvalue / np.array(grounds))),
        level=np.array(levels),
        error=np.array(errors),
        folds=(in_x, in_y),
        cusps=cusps,
        closed=path.closed,
        complete=path.complete,
    )


def _surroundings(family: MatrixFamily, chart: Chart, state: State, members: int) -> tuple[float, int, float]:
    """|λ_0|, the position of those that merge, the estimated distance to the curve of the untruncated T."""
    level, point = chart.level(state.unknowns), chart.point(state.unknowns)
    values = {**family.fixed, **dict(zip(family.names, map(float, point), strict=True))}
    truncation = truncate(family.model, family.cutoff, values)
    found = np.linalg.eigvals(truncation.dense)
    # rounding parts those that merge by up to its square or cube root: leave them out by number
    others = found[np.argsort(np.abs(found - level))[members:]]
    bordered = state.bordered
    upwards, downwards = truncation.coupling(bordered.right[:, None], bordered.left[:, None])
    room = abs(level) - truncation.outer_norm
    # g shifts by at most ‖wᵀB‖‖Cx‖/(|λ| − ‖D‖); the slope of g across the curve turns that into a distance
    slope = float(np.linalg.norm(chart.jacobian(bordered, state.unknowns)[0, 1:]))
    shift = float(upwards[0] * downwards[0]) / room if room > 0 else np.inf
    position = int((np.abs(others) > abs(level)).sum())
    return float(np.abs(found).max()), position, shift / slope + 1e-14
