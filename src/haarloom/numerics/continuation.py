"""Curves of exceptional points by pseudo-arclength continuation.

H. B. Keller, in *Applications of Bifurcation Theory* (1977) 359: a step along the tangent, then Newton's
method across it, on g = g_λ = 0 in the three unknowns (ln|λ|, x, y). In this space a curve is smooth through
folds in x or y, and through cusps, where three levels meet and only its projection onto the plane has a tip.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.bordered import BorderedPoint, bordered_point
from haarloom.numerics.mergers import MatrixFamily

__all__ = ["Chart", "State", "corrected", "traced", "unit"]


@dataclass(frozen=True, eq=False)
class State:
    """A point of a curve: its unknowns, the bordered system there, and the borders."""

    unknowns: NDArray[np.float64]
    bordered: BorderedPoint
    borders: tuple[NDArray[Any], NDArray[Any]]


@dataclass(frozen=True, eq=False)
class Chart:
    """The problem in the unknowns (ln|λ|, x/width, y/height)."""

    family: MatrixFamily
    sign: float
    size: NDArray[np.float64]
    box: NDArray[np.float64]

    def evaluate(
        self, unknowns: NDArray[np.float64], borders: tuple[NDArray[Any], NDArray[Any]]
    ) -> BorderedPoint:
        return bordered_point(
            *self.family.around(self.point(unknowns).tolist()), self.level(unknowns), borders
        )

    def level(self, unknowns: NDArray[np.float64]) -> float:
        return float(self.sign * np.exp(unknowns[0]))

    def point(self, unknowns: NDArray[np.float64]) -> NDArray[np.float64]:
        return unknowns[1:] * self.size

    def jacobian(self, bordered: BorderedPoint, unknowns: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.asarray(np.real(bordered.jacobian) * [self.level(unknowns), *self.size])

    def inside(self, unknowns: NDArray[np.float64]) -> bool:
        point = self.point(unknowns)
        return bool((point >= self.box[:, 0]).all() and (point <= self.box[:, 1]).all())


def corrected(
    chart: Chart,
    guess: NDArray[np.float64],
    tangent: NDArray[np.float64],
    borders: tuple[NDArray[Any], NDArray[Any]],
) -> State | None:
    """Newton's method in the plane through the guess across the tangent; None where it does not settle."""
    unknowns = guess.copy()
    for _ in range(8):
        bordered = chart.evaluate(unknowns, borders)
        system = np.vstack([chart.jacobian(bordered, unknowns), tangent])
        residual = np.array([*np.real(bordered.residual), tangent @ (unknowns - guess)])
        change = np.linalg.solve(system, -residual)
        unknowns = unknowns + change
        borders = (unit(bordered.left), unit(bordered.right))
        if np.abs(change).max() < 1e-10:
            return State(unknowns, chart.evaluate(unknowns, borders), borders)
        if np.abs(change).max() > 0.5:
            return None
    return None


def unit(vector: NDArray[Any]) -> NDArray[np.float64]:
    """Real part, normalised."""
    return np.asarray(np.real(vector) / np.linalg.norm(vector))


def _tangent(chart: Chart, state: State, before: NDArray[np.float64] | None) -> NDArray[np.float64]:
    """Unit tangent: the null vector of the 2 × 3 Jacobian, kept in the direction of travel."""
    first, second = chart.jacobian(state.bordered, state.unknowns)
    direction = np.cross(first, second)
    direction = direction / np.linalg.norm(direction)
    return direction if before is None or direction @ before > 0 else -direction


def traced(chart: Chart, start: State, step: float, most_points: int) -> tuple[list[State], bool]:
    """Points of the curve through the start, in order, and whether it closes."""
    forward, closed = _followed(chart, start, 1.0, step, most_points)
    backward = [] if closed else _followed(chart, start, -1.0, step, most_points)[0]
    return [*reversed(backward), start, *forward], closed


def _followed(
    chart: Chart, start: State, sign: float, step: float, most_points: int
) -> tuple[list[State], bool]:
    """Points from the start in one direction, until the box is left or the start met again."""
    found: list[State] = []
    state, length = start, step
    tangent = sign * _tangent(chart, start, None)
    while len(found) < most_points and length > 1e-5 * step:
        ahead = corrected(chart, state.unknowns + length * tangent, tangent, state.borders)
        if ahead is None or _turned(chart, ahead, tangent) or _far(ahead, state, length):
            length /= 2
            continue
        if not chart.inside(ahead.unknowns):
            edge = _on_edge(chart, state, ahead)
            return [*found, edge] if edge else found, False
        tangent = _tangent(chart, ahead, tangent)
        found.append(ahead)
        if len(found) > 3 and np.linalg.norm(ahead.unknowns - start.unknowns) < 0.75 * length:
            return found, True
        state, length = ahead, min(step, 1.4 * length)
    return found, False


def _on_edge(chart: Chart, inside: State, outside: State) -> State | None:
    """The point where the curve leaves the box, between two of its points."""
    ends = np.array([inside.unknowns[1:], outside.unknowns[1:]]) * chart.size
    travel = ends[1] - ends[0]
    limit = np.where(travel > 0, chart.box[:, 1], chart.box[:, 0])
    with np.errstate(divide="ignore", invalid="ignore"):
        share = np.where(travel != 0, (limit - ends[0]) / travel, np.inf)
    axis = int(np.argmin(share))
    guess = inside.unknowns + max(float(share[axis]), 0.0) * (outside.unknowns - inside.unknowns)
    guess[1 + axis] = limit[axis] / chart.size[axis]
    return corrected(chart, guess, np.eye(3)[1 + axis], outside.borders)


def _turned(chart: Chart, ahead: State, tangent: NDArray[np.float64]) -> bool:
    """Whether the direction changed by more than about 20 degrees in one step."""
    return float(abs(_tangent(chart, ahead, tangent) @ tangent)) < 0.94


def _far(ahead: State, state: State, length: float) -> bool:
    return float(np.linalg.norm(ahead.unknowns - state.unknowns)) > 1.5 * length
