"""Curves of double roots followed on textbook families whose folds and cusps are known in closed form."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pytest

from haarloom.numerics.bordered import unit
from haarloom.numerics.continuation import Chart, State, corrected, tangent_at, traced
from haarloom.numerics.turning_points import CUSP, with_turns


@dataclass(frozen=True)
class Textbook:
    """A matrix and its two slopes as functions of (x, y)."""

    matrix: Callable[[float, float], np.ndarray]
    slopes: tuple[np.ndarray, np.ndarray] | Callable[[float, float], tuple[np.ndarray, np.ndarray]]

    def around(self, point):
        slopes = self.slopes(*point) if callable(self.slopes) else self.slopes
        return self.matrix(*point), list(slopes)


def companion(lowest_first, size):
    """Matrix with the roots of μ^n + … + c_1 μ + c_0, for c from the lowest power on."""
    matrix = np.diag(np.ones(size - 1), -1)
    matrix[: len(lowest_first), -1] = -np.asarray(lowest_first)
    return matrix


def unit_entry(row, size):
    matrix = np.zeros((size, size))
    matrix[row, -1] = -1.0
    return matrix


# eigenvalues are shifted by 3, because the unknown is ln λ and μ runs through 0
CUBIC = Textbook(lambda a, b: 3 * np.eye(3) + companion([b, a], 3), (unit_entry(1, 3), unit_entry(0, 3)))
"""μ³ + aμ + b: 4a³ + 27b² = 0, a cusp at the origin (R. Thom; V. I. Arnold, *Catastrophe Theory*)."""

SWALLOWTAIL = Textbook(
    lambda b, c: 3 * np.eye(4) + companion([c, b, -1.0], 4), (unit_entry(1, 4), unit_entry(0, 4))
)
"""μ⁴ − μ² + bμ + c: the section of the swallowtail with two cusps and a crossing (V. I. Arnold)."""


def begun(family, box, level, point):
    """A state at a known double root."""
    chart = Chart(family, 1.0, np.array(box, dtype=float))
    matrix, _ = family.around(point)
    left, _, right = np.linalg.svd(matrix - level * np.eye(len(matrix)))
    borders = (unit(left[:, -1]), unit(right[-1]))
    unknowns = chart.unknowns(level, point)
    across = tangent_at(chart, State(unknowns, chart.evaluate(unknowns, borders), borders))
    state = corrected(chart, unknowns, across, borders)
    assert state is not None
    return chart, state


def followed(family, box, level, point, step):
    chart, start = begun(family, box, level, point)
    path, turns = with_turns(chart, traced(chart, start, step, 2000))
    points = np.array([chart.point(state.unknowns) for state in path.states])
    levels = np.array([chart.level(state.unknowns) for state in path.states])
    return path, turns, points, levels - 3


@pytest.mark.parametrize("step", [0.2, 0.05, 0.01])
@pytest.mark.parametrize("start", [-0.6, 0.3, 0.61])
def test_a_cusp_is_passed_and_located(step, start):
    """Double root s: a = −3s², b = 2s³; each point once, and the cusp at s = 0 is one of them."""
    point = [-3 * start**2, 2 * start**3]
    path, turns, points, s = followed(CUBIC, [(-2, 0.5), (-1, 1)], 3 + start, point, step)
    assert path.complete
    assert not path.closed
    assert np.abs(points - np.stack([-3 * s**2, 2 * s**3], axis=1)).max() < 1e-13
    assert (np.diff(s) > 0).all() or (np.diff(s) < 0).all(), "never back on its own track"
    edge = 0.5 ** (1 / 3)  # b = ±1
    assert sorted(s[[0, -1]]) == pytest.approx([-edge, edge], abs=1e-12), "from edge to edge"
    ((index, kind),) = [(turn.index, turn.kind) for turn in turns]
    assert kind == CUSP
    assert abs(s[index]) < 1e-12
    assert np.abs(points[index]).max() < 1e-14


@pytest.mark.parametrize("step", [0.1, 0.02])
def test_two_cusps_a_fold_and_a_crossing_of_the_swallowtail(step):
    """Double root s: b = 2s − 4s³, c = 3s⁴ − s²: cusps at s = ±1/√6, c turns at s = 0, crossing at ±1/√2."""
    start = 0.9
    point = [2 * start - 4 * start**3, 3 * start**4 - start**2]
    path, turns, points, s = followed(SWALLOWTAIL, [(-2, 2), (-0.5, 1.5)], 3 + start, point, step)
    assert path.complete
    assert np.abs(points - np.stack([2 * s - 4 * s**3, 3 * s**4 - s**2], axis=1)).max() < 1e-12
    assert (np.diff(s) < 0).all() or (np.diff(s) > 0).all(), "at the crossing it stays on its sheet"
    assert np.abs(s).max() > 0.9
    found = {turn.kind: sorted(s[t.index] for t in turns if t.kind == turn.kind) for turn in turns}
    assert set(found) == {1, CUSP}
    assert found[CUSP] == pytest.approx([-1 / np.sqrt(6), 1 / np.sqrt(6)], abs=1e-12)
    assert found[1] == pytest.approx([0], abs=1e-12)


def ring(x, y):
    """Two rings of double roots, μ = 0 on x² + y² = 1 and μ = 1e-3 on x² + y² = 1.02, side by side."""
    matrix = 3 * np.eye(4)
    matrix[0, 1] = matrix[2, 3] = 1.0
    matrix[1, 0] = x * x + y * y - 1
    matrix[3, 2] = x * x + y * y - 1.02
    matrix[2, 2] = matrix[3, 3] = 3.001
    return matrix


def ring_slopes(x, y):
    slopes = np.zeros((2, 4, 4))
    slopes[0, 1, 0] = slopes[0, 3, 2] = 2 * x
    slopes[1, 1, 0] = slopes[1, 3, 2] = 2 * y
    return slopes[0], slopes[1]


@pytest.mark.parametrize("step", [0.3, 0.1, 0.03])
@pytest.mark.parametrize("angle", [0.0, 0.4, 2.5])
def test_a_ring_closes_and_folds_four_times_with_another_one_nearby(step, angle):
    box = [(-1.5, 1.5), (-1.5, 1.5)]
    point = [float(np.cos(angle)), float(np.sin(angle))]
    path, turns, points, levels = followed(Textbook(ring, ring_slopes), box, 3.0, point, step)
    assert path.closed
    assert path.complete
    assert np.array_equal(points[0], points[-1])
    assert np.abs(levels).max() < 1e-12
    assert np.abs((points**2).sum(axis=1) - 1).max() < 1e-12
    turned = np.unwrap(np.arctan2(points[:, 1], points[:, 0]))
    assert abs(abs(turned[-1] - turned[0]) - 2 * np.pi) < 1e-9, "once round, not more and not less"
    for kind in (0, 1):
        places = points[[turn.index for turn in turns if turn.kind == kind]]
        assert sorted(places[:, kind]) == pytest.approx([-1, 1], abs=1e-13)
        assert places[:, 1 - kind] == pytest.approx([0, 0], abs=1e-9)
    assert all(turn.kind != CUSP for turn in turns)


def test_a_straight_curve_does_not_fold():
    """μ² = x: the double root on x = 0 for every y."""

    def matrix(x, y):
        return np.array([[3.0 + y, 1.0], [x, 3.0 + y]])

    slopes = (np.array([[0.0, 0.0], [1.0, 0.0]]), np.eye(2))
    path, turns, points, _ = followed(Textbook(matrix, slopes), [(-1, 1), (-1, 1)], 3.2, [0.0, 0.2], 0.05)
    assert path.complete
    assert np.abs(points[:, 0]).max() < 1e-14
    assert sorted(points[[0, -1], 1]) == pytest.approx([-1, 1], abs=1e-12)
    assert turns == ()


def test_a_curve_on_which_the_level_vanishes_is_given_up_and_says_so():
    """The double root λ = y vanishes at y = 0, where ln|λ| has no value."""

    def matrix(x, y):
        return np.array([[y, 1.0], [x, y]])

    slopes = (np.array([[0.0, 0.0], [1.0, 0.0]]), np.eye(2))
    chart, start = begun(Textbook(matrix, slopes), [(-1, 1), (-1, 1)], 0.5, [0.0, 0.5])
    path = traced(chart, start, 0.1, 300)
    assert not path.complete
    assert not path.closed
