"""The boundary of the complex region: exceptional points followed as curves in a plane of two parameters."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.exceptions import ConvergenceError, ParameterError
from haarloom.numerics.continuation import Chart, State, corrected, traced
from haarloom.numerics.cutoff import checked_levels
from haarloom.numerics.exceptional import exceptional_points
from haarloom.numerics.mergers import FloatMerger, MatrixFamily, sufficient_cutoff
from haarloom.numerics.parameters import checked_values, parameter_names, plain_numbers
from haarloom.numerics.threads import single_threaded
from haarloom.numerics.truncation import truncate

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
        λ* of the merging pair and −ln(λ*/λ_0), shape (M,).
    level
        Position of the pair among the masses at each point, shape (M,), 1 for the two lowest.
    error
        Estimated distance to the boundary of the untruncated T, in units of the box, shape (M,).
    folds
        Indices of points where x or y turns round.
    cusps
        Indices of points next to which three levels meet.
    closed
        Whether the curve ends where it began.
    """

    points: NDArray[np.float64]
    eigenvalue: NDArray[np.float64]
    mass: NDArray[np.float64]
    level: NDArray[np.int64]
    error: NDArray[np.float64]
    folds: tuple[int, ...]
    cusps: tuple[int, ...]
    closed: bool


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
    cutoff
        Basis that was used.
    fixed
        Values of the other parameters.
    """

    axes: tuple[str, str]
    box: tuple[tuple[float, float], tuple[float, float]]
    curves: tuple[BoundaryCurve, ...]
    cutoff: int
    fixed: Mapping[str, float | complex]

    def __repr__(self) -> str:
        sizes = ", ".join(str(len(curve.points)) for curve in self.curves) or "none"
        return (
            f"ComplexBoundary({self.axes[0]}, {self.axes[1]}; curves of {sizes} points; cutoff {self.cutoff})"
        )


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
        If not exactly two parameters have a pair, or a pair is empty.

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
    if cutoff is None:
        corners = [{**fixed, axes[0]: x, axes[1]: y} for x in box[0] for y in box[1]]
        cutoff = sufficient_cutoff(model, corners, count + 1)
    family = MatrixFamily(model, cutoff, axes, fixed)
    curves: list[BoundaryCurve] = []
    for axis, other, merger in _seeds(family, box, count, lines):
        chart, start = _started(family, box, axis, other, merger)
        if not any(_on_curve(curve, start, chart, step) for curve in curves):
            curves.append(_curve(chart, *traced(chart, start, step, most_points)))
    return ComplexBoundary(axes, (tuple(box[0]), tuple(box[1])), tuple(curves), cutoff, fixed)


def _plane(
    model: RingModel, values: Mapping[str, Any]
) -> tuple[tuple[str, str], NDArray[np.float64], dict[str, Any]]:
    pairs = {name: value for name, value in values.items() if isinstance(value, tuple | list)}
    if len(pairs) != 2 or any(len(pair) != 2 for pair in pairs.values()):
        raise ParameterError(
            f"{len(pairs)} parameters have a range: give a pair (from, to) for exactly two of "
            f"{', '.join(parameter_names(model))}, e.g. z=(0.1, 1.0), t=(0.2, 2.0); numbers for the others."
        )
    starts = {name: pair[0] for name, pair in pairs.items()}
    fixed = plain_numbers(checked_values(model, {**values, **starts}))
    box = np.array([[float(end) for end in pair] for pair in pairs.values()])
    if not (np.isfinite(box).all() and (box[:, 0] < box[:, 1]).all()):
        raise ParameterError("a range is empty or not finite: give the smaller end first, e.g. z=(0.1, 1.0).")
    axes = tuple(pairs)
    return (axes[0], axes[1]), box, {name: value for name, value in fixed.items() if name not in pairs}


def _seeds(
    family: MatrixFamily, box: NDArray[np.float64], levels: int, lines: int
) -> Iterator[tuple[int, float, FloatMerger]]:
    """Mergers on lines across the box: (axis that varies, value of the other, merger)."""
    for axis in (0, 1):
        name, other = family.names[axis], family.names[1 - axis]
        for value in np.linspace(box[1 - axis, 0], box[1 - axis, 1], lines):
            fixed = {**family.fixed, other: float(value)}
            try:
                found = exceptional_points(family.model, name, tuple(box[axis]), levels, **fixed)
            except ConvergenceError:
                continue  # another line will meet the curve where Newton's method settles
            for merger in found:
                if box[axis, 0] <= merger.value <= box[axis, 1]:
                    yield axis, float(value), merger


def _started(
    family: MatrixFamily, box: NDArray[np.float64], axis: int, other: float, merger: FloatMerger
) -> tuple[Chart, State]:
    point = [merger.value, other] if axis == 0 else [other, merger.value]
    chart = Chart(family, float(np.sign(merger.eigenvalue)), box[:, 1] - box[:, 0], box)
    size = count_up_to(family.model.group.rank, family.cutoff)
    borders = tuple(_fitted(vector, size) for vector in (merger.bordered.left, merger.bordered.right))
    unknowns = np.array([np.log(abs(merger.eigenvalue)), *(np.array(point) / chart.size)])
    start = corrected(chart, unknowns, np.array([0.0, 1.0, 1.0]), (borders[0], borders[1]))
    if start is None:
        raise ConvergenceError(f"no boundary curve starts at {dict(zip(family.names, point, strict=True))}.")
    return chart, start


def _fitted(vector: NDArray[Any], size: int) -> NDArray[np.float64]:
    numbers = np.zeros(size)
    numbers[: min(size, len(vector))] = np.real(vector[:size])
    return np.asarray(numbers / np.linalg.norm(numbers))


def _on_curve(curve: BoundaryCurve, start: State, chart: Chart, step: float) -> bool:
    scaled = np.column_stack([np.log(np.abs(curve.eigenvalue)), curve.points / chart.size])
    ends = scaled[1:] - scaled[:-1]
    offset = start.unknowns - scaled[:-1]
    share = np.clip((offset * ends).sum(axis=1) / np.maximum((ends**2).sum(axis=1), 1e-300), 0, 1)
    distance = np.linalg.norm(offset - share[:, None] * ends, axis=1)
    return bool(distance.min(initial=np.inf) < 0.2 * step)


def _curve(chart: Chart, states: list[State], closed: bool) -> BoundaryCurve:
    points = np.array([chart.point(state.unknowns) for state in states])
    eigenvalue = np.array([chart.level(state.unknowns) for state in states])
    grounds, levels, errors = zip(*(_surroundings(chart, state) for state in states), strict=True)
    curvature = np.array([np.real(state.bordered.g_second) for state in states])
    return BoundaryCurve(
        points=points,
        eigenvalue=eigenvalue,
        mass=-np.log(np.abs(eigenvalue / np.array(grounds))),
        level=np.array(levels),
        error=np.array(errors),
        folds=tuple(sorted({*_turns(points[:, 0]), *_turns(points[:, 1])} - set(_changes(curvature)))),
        cusps=tuple(_changes(curvature)),
        closed=closed,
    )


def _surroundings(chart: Chart, state: State) -> tuple[float, int, float]:
    """λ_0, the position of the pair, and the estimated distance to the boundary of the untruncated T."""
    level, point = chart.level(state.unknowns), chart.point(state.unknowns)
    values = {**chart.family.fixed, **dict(zip(chart.family.names, map(float, point), strict=True))}
    truncation = truncate(chart.family.model, chart.family.cutoff, values)
    sizes = np.sort(np.abs(np.linalg.eigvals(truncation.dense)))[::-1]
    bordered = state.bordered
    upwards, downwards = truncation.coupling(bordered.right[:, None], bordered.left[:, None])
    room = abs(level) - truncation.outer_norm
    # g shifts by at most ‖wᵀB‖‖Cx‖/(|λ| − ‖D‖); the slope of g across the curve turns that into a distance
    slope = float(np.linalg.norm(chart.jacobian(bordered, state.unknowns)[0, 1:]))
    shift = float(upwards[0] * downwards[0]) / room if room > 0 else np.inf
    position = int((sizes > abs(level) * (1 + 1e-6)).sum())
    return float(sizes[0]), position, shift / slope + 1e-14


def _turns(values: NDArray[np.float64]) -> list[int]:
    steps = np.diff(values)
    return (1 + np.flatnonzero(steps[1:] * steps[:-1] < 0)).tolist()


def _changes(values: NDArray[np.float64]) -> list[int]:
    return np.flatnonzero(values[1:] * values[:-1] < 0).tolist()
