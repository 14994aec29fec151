"""Curves of exceptional points by pseudo-arclength continuation.

H. B. Keller, in *Applications of Bifurcation Theory* (1977) 359: a step along the tangent, then Newton's
method across it, on g = g_λ = 0 in the three unknowns (ln|λ|, x, y). In this space a curve is smooth through
folds in x or y, and through cusps, where three levels meet and only its projection onto the plane has a tip.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from haarloom.exceptions import ConvergenceError
from haarloom.numerics.bordered import BorderedPoint, Borders, bordered_point, unit

__all__ = [
    "NOISE",
    "Chart",
    "Family",
    "Path",
    "State",
    "corrected",
    "passes",
    "tangent_at",
    "traced",
    "zero_along",
]

SETTLED = 1e-10
"""A Newton step this short is the last: the error left is its square."""

NOISE = 1e-6
"""Steps below this that no longer shrink are rounding: a very ill-conditioned pair gets no better."""

SHORTEST = 1e-5
"""A curve is given up where it wants steps shorter than this part of the largest."""

STRAIGHT = 0.94
"""Smallest cosine between the tangents at both ends of a step: about 20 degrees."""


class Family(Protocol):
    """A real matrix as a function of two parameters."""

    def around(self, point: Sequence[float]) -> tuple[NDArray[Any], list[NDArray[Any]]]:
        """The matrix, shape (n, n), and its slope by each parameter."""


@dataclass(frozen=True, eq=False)
class State:
    """A point of a curve: its unknowns, the bordered system there, and the borders."""

    unknowns: NDArray[np.float64]
    bordered: BorderedPoint
    borders: Borders


@dataclass(frozen=True, eq=False)
class Path:
    """Points of one curve in order.

    Attributes
    ----------
    closed
        Whether the last point is the first one again.
    complete
        Whether nothing is missing: the curve is closed, or both ends lie on the edge of the box.
    """

    states: list[State]
    closed: bool
    complete: bool


@dataclass(frozen=True, eq=False)
class Chart:
    """The problem in the unknowns (ln|λ|, x/width, y/height).

    Attributes
    ----------
    sign
        Of λ, the same all along a curve.
    box
        ((x from, x to), (y from, y to)).
    """

    family: Family
    sign: float
    box: NDArray[np.float64]

    @property
    def size(self) -> NDArray[np.float64]:
        """Width and height of the box."""
        return np.asarray(self.box[:, 1] - self.box[:, 0])

    def evaluate(self, unknowns: NDArray[np.float64], borders: Borders) -> BorderedPoint:
        return bordered_point(
            *self.family.around(self.point(unknowns).tolist()), self.level(unknowns), borders
        )

    def unknowns(self, level: float, point: Sequence[float]) -> NDArray[np.float64]:
        return np.array([np.log(abs(level)), *(np.asarray(point) / self.size)])

    def level(self, unknowns: NDArray[np.float64]) -> float:
        return float(self.sign * np.exp(unknowns[0]))

    def point(self, unknowns: NDArray[np.float64]) -> NDArray[np.float64]:
        return unknowns[1:] * self.size

    def jacobian(self, bordered: BorderedPoint, unknowns: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.asarray(np.real(bordered.jacobian) * [self.level(unknowns), *self.size])

    def margin(self, unknowns: NDArray[np.float64]) -> float:
        """Distance to the nearest edge in units of the box, negative outside."""
        point = self.point(unknowns)
        return float((np.array([point - self.box[:, 0], self.box[:, 1] - point]) / self.size).min())


def corrected(
    chart: Chart, guess: NDArray[np.float64], tangent: NDArray[np.float64], borders: Borders
) -> State | None:
    """Newton's method in the plane through the guess across the tangent; None where it does not settle."""
    unknowns, before = guess.copy(), np.inf
    for _ in range(10):
        try:
            bordered = chart.evaluate(unknowns, borders)
            system = np.vstack([chart.jacobian(bordered, unknowns), tangent])
            residual = np.array([*np.real(bordered.residual), tangent @ (unknowns - guess)])
            change = np.linalg.solve(system, -residual)
        except np.linalg.LinAlgError:
            return None
        unknowns, length = unknowns + change, float(np.abs(change).max())
        borders = (unit(bordered.left), unit(bordered.right))
        if length < SETTLED or before / 2 < length < NOISE:
            return State(unknowns, chart.evaluate(unknowns, borders), borders)
        if not length < 0.5:
            return None
        before = length
    return None


def tangent_at(chart: Chart, state: State, ahead: NDArray[np.float64] | None = None) -> NDArray[np.float64]:
    """Unit tangent: the null vector of the 2 × 3 Jacobian, on the side of ``ahead``."""
    first, second = chart.jacobian(state.bordered, state.unknowns)
    direction = np.cross(first, second)
    direction = direction / np.linalg.norm(direction)
    return direction if ahead is None or direction @ ahead > 0 else -direction


def passes(chart: Chart, state: State, target: State) -> bool:
    """Whether the curve through one point runs through another that is at most a step away.

    Two sheets may come close to each other, as they do near a cusp: distance alone decides nothing.
    """
    tangent = tangent_at(chart, state)
    offset = tangent @ (target.unknowns - state.unknowns)
    ahead = corrected(chart, state.unknowns + offset * tangent, tangent, state.borders)
    return ahead is not None and bool(np.abs(ahead.unknowns - target.unknowns).max() < NOISE)


def traced(chart: Chart, start: State, step: float, most_points: int) -> Path:
    """The curve through the start, both ways until it leaves the box, or round to the start again."""
    forward, ending = _followed(chart, start, 1.0, step, most_points)
    if ending == "closed":
        return Path([start, *forward, start], True, True)
    backward, beginning = _followed(chart, start, -1.0, step, most_points)
    return Path([*reversed(backward), start, *forward], False, beginning == ending == "edge")


def _followed(
    chart: Chart, start: State, sign: float, step: float, most_points: int
) -> tuple[list[State], str]:
    """Points after the start in one direction, and how they end: "edge", "closed" or "given up"."""
    found: list[State] = []
    state, length = start, step
    tangent = sign * tangent_at(chart, start)
    while len(found) < most_points and length > SHORTEST * step:
        ahead = corrected(chart, state.unknowns + length * tangent, tangent, state.borders)
        if ahead is None or _strayed(chart, state, ahead, tangent, length):
            length /= 2
            continue
        if found and _between(start, state, ahead, tangent) and passes(chart, state, start):
            return found, "closed"
        if chart.margin(ahead.unknowns) < 0:
            if chart.margin(state.unknowns) < NOISE:
                return found, "edge"
            try:
                edge = zero_along(chart, state, ahead, lambda state: chart.margin(state.unknowns))
            except ConvergenceError:
                length /= 2
                continue
            return [*found, edge], "edge"
        tangent = tangent_at(chart, ahead, tangent)
        found.append(ahead)
        state, length = ahead, min(step, 1.4 * length)
    return found, "given up"


def _strayed(chart: Chart, state: State, ahead: State, tangent: NDArray[np.float64], length: float) -> bool:
    """Whether a step bends too much to be trusted."""
    turned = tangent_at(chart, ahead, tangent) @ tangent < STRAIGHT
    return bool(turned or np.linalg.norm(ahead.unknowns - state.unknowns) > 1.5 * length)


def _between(start: State, state: State, ahead: State, tangent: NDArray[np.float64]) -> bool:
    """Whether the start lies beside the step just taken."""
    along = tangent @ (start.unknowns - state.unknowns)
    apart = np.linalg.norm(start.unknowns - state.unknowns)
    reach = np.linalg.norm(ahead.unknowns - state.unknowns)
    return bool(0 < along <= tangent @ (ahead.unknowns - state.unknowns) and apart <= 1.01 * reach)


def zero_along(chart: Chart, first: State, second: State, test: Callable[[State], float]) -> State:
    """The point between two neighbours where a function of the curve vanishes, by Brent's method.

    Raises
    ------
    ConvergenceError
        If the curve cannot be followed between the two, or the function has one sign at both.
    """
    from scipy.optimize import brentq

    tangent = tangent_at(chart, first, second.unknowns - first.unknowns)

    def state(offset: float) -> State:
        found = corrected(chart, first.unknowns + offset * tangent, tangent, first.borders)
        if found is None:
            raise ConvergenceError("a boundary curve bends too much between two points: give a smaller step.")
        return found

    whole = float(tangent @ (second.unknowns - first.unknowns))
    ends = test(first), test(state(whole))
    if ends[0] * ends[1] > 0:
        raise ConvergenceError(
            "a boundary curve lost its orientation between two points: give a smaller step."
        )
    return state(float(brentq(lambda offset: test(state(offset)), 0.0, whole, xtol=1e-14)))
