"""Levels recognised by their vectors: crossings, mergers and both at once, on paths fine and coarse."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import haarloom as hl
from haarloom.numerics.branches import masses_along
from haarloom.numerics.compile import compile_transfer
from haarloom.numerics.ordering import spectral_order
from haarloom.numerics.tracking import Levels, tracked
from numerics.models import EMBER_BOTH, SU3


def solved(matrix):
    values, right = np.linalg.eig(matrix)
    order = spectral_order(values)
    return Levels(values[order], right[:, order], np.linalg.inv(right[:, order]).T)


def followed(matrix, grid, count=None, refine=True):
    """Eigenvalues of matrix(x) as branches; the positions of refinements are numbers of grid points."""
    path = [solved(matrix(x)) for x in grid]

    def between(position):
        return solved(matrix(np.interp(position, np.arange(len(grid)), grid)))

    count = count or len(path[0].values)
    order = tracked(path, count, between if refine else None)
    assert (np.sort(order, axis=1) == np.arange(count)).all()
    return np.array([levels.values[row] for levels, row in zip(path, order, strict=True)])


def frame(seed, size):
    """A fixed basis that is not orthogonal: all levels have components everywhere."""
    return np.eye(size) + 0.25 * np.random.default_rng(seed).standard_normal((size, size)) / np.sqrt(size)


def assert_same_branches(found, expected):
    start = spectral_order(expected[0].astype(complex))
    np.testing.assert_allclose(found, expected[:, start], rtol=0, atol=1e-9)


@given(
    st.integers(2, 6),
    st.integers(0, 10**6),
    st.sampled_from([3, 4, 7, 30]),
    st.floats(0.1, 30),
)
def test_straight_levels_cross_however_steep_and_however_coarse_the_path(size, seed, points, steepness):
    """Levels a + b x with vectors that never change: every meeting is an exact crossing."""
    rng = np.random.default_rng(seed)
    offsets, slopes = rng.uniform(50, 100, size), rng.uniform(-1, 1, size) * steepness
    basis, grid = frame(seed, size), np.linspace(0, 1, points)
    found = followed(
        lambda x: basis @ np.diag(offsets + slopes * x) @ np.linalg.inv(basis), grid, refine=False
    )
    assert_same_branches(found, offsets + slopes * grid[:, None])


@pytest.mark.parametrize("points", [4, 5, 8, 9, 41])
def test_three_levels_cross_at_one_point_that_may_lie_on_the_grid(points):
    """At x = 1/2 all three are equal and their vectors arbitrary: those just before decide."""
    slopes, basis = np.array([3.0, -1.0, 0.5, 0.0]), frame(3, 4)
    grid = np.linspace(0, 1, points)
    levels = np.array([10.0, 10.0, 10.0, 4.0]) + slopes * (grid[:, None] - 0.5)

    def matrix(x):
        turn = np.eye(4) + 0.3 * x * np.diag([1.0, -1.0, 2.0], 1)
        whole = basis @ turn
        diagonal = np.array([10.0, 10.0, 10.0, 4.0]) + slopes * (x - 0.5)
        return whole @ np.diag(diagonal) @ np.linalg.inv(whole)

    assert_same_branches(followed(matrix, grid), levels)


@pytest.mark.parametrize("points", [6, 11, 12, 60])
@pytest.mark.parametrize("offset", [0.0, 0.04, -0.03])
def test_a_crossing_at_the_very_place_of_a_merger(points, offset):
    """20 ± √(1/4 − x) merge at x = 1/4, where a third level crosses steeply."""
    basis, grid = frame(5, 3), np.linspace(0, 0.6, points)

    def third(x):
        return 20.0 + 30 * (x - 0.25 - offset)

    def matrix(x):
        block = np.array([[20.0, 1.0, 0.0], [0.25 - x, 20.0, 0.0], [0.0, 0.0, third(x)]])
        return basis @ block @ np.linalg.inv(basis)

    found = followed(matrix, grid)
    root = np.sqrt((0.25 - grid).astype(complex))
    third_column = int(np.argmin(np.abs(found[0] - third(0.0))))
    np.testing.assert_allclose(found[:, third_column], third(grid), atol=1e-6)
    pair = np.delete(found, third_column, axis=1)
    after, before = grid > 0.2501, grid < 0.2499
    np.testing.assert_allclose(pair[before], np.stack([20 + root, 20 - root], axis=1)[before], atol=1e-6)
    np.testing.assert_allclose(pair[after, 0], 20 - 1j * np.sqrt(grid[after] - 0.25), atol=1e-6)
    np.testing.assert_allclose(pair[after, 1], np.conj(pair[after, 0]), atol=1e-12)


@pytest.mark.parametrize("points", [33, 60, 200])
def test_levels_that_avoid_each_other_keep_their_order(points):
    """±√(x² + w²): branches bend away from each other where the path sees the width w at all."""
    width = 0.05

    def matrix(x):
        return np.array([[10 + 5 * x, 5 * width], [5 * width, 10 - 5 * x]])

    grid = np.linspace(-1.03, 1, points)
    root = 5 * np.sqrt(grid**2 + width**2)
    assert_same_branches(followed(matrix, grid), np.stack([10 + root, 10 - root], axis=1))


def test_two_mergers_and_a_return_to_the_real_axis():
    """10 ± √(x² − 1/4) and 6 ± √(x² − 1/9): pairs between −1/2 and 1/2, and between −1/3 and 1/3."""

    def matrix(x):
        block = np.diag([10.0, 10.0, 6.0, 6.0])
        block[0, 1] = block[2, 3] = 1.0
        block[1, 0], block[3, 2] = x * x - 1 / 4, x * x - 1 / 9
        basis = frame(8, 4)
        return basis @ block @ np.linalg.inv(basis)

    grid = np.linspace(-1, 1, 24)
    found = followed(matrix, grid)
    for column, centre, width in ((0, 10, 1 / 4), (2, 6, 1 / 9)):
        root = np.sqrt((grid**2 - width).astype(complex))
        inside = grid**2 < width
        expected = np.where(inside, centre - 1j * np.abs(root), centre + root)
        np.testing.assert_allclose(found[:, column], expected, atol=1e-9)
        np.testing.assert_allclose(found[:, column] + found[:, column + 1], 2 * centre, atol=1e-9)


def test_a_level_that_leaves_the_leading_ones_is_not_mistaken_for_the_one_that_comes():
    """The third level falls steeply and a fourth one rises: the two followed ones are not disturbed."""
    basis, grid = frame(9, 4), np.linspace(0, 1, 15)

    def matrix(x):
        return basis @ np.diag([20.0, 19 - 0.5 * x, 18 - 12 * x, 4 + 14 * x]) @ np.linalg.inv(basis)

    found = followed(matrix, grid, count=3)
    np.testing.assert_allclose(found[:, 0], 20, atol=1e-9)
    np.testing.assert_allclose(found[:, 1], 19 - 0.5 * grid, atol=1e-9)


def test_nothing_to_follow_on_an_empty_or_a_single_point():
    assert tracked([], 3).shape == (0, 3)
    assert tracked([solved(np.diag([3.0, 2.0, 1.0]))], 3).tolist() == [[0, 1, 2]]


@pytest.mark.parametrize("points", [4, 9, 40])
def test_levels_of_different_n_ality_cross_exactly(points):
    """z = 0, two characters of N-ality 0: k_8 and k_3 as functions of their own parameters cross exactly.

    Without matter m_r = −ln k_r; with k_8 = a fixed number and k_3 = k_3bar falling, branches are straight.
    """
    G = SU3
    link = hl.link_from_coefficients(G, {"1": 1, "3": "a", "3bar": "a", "8": "0.5", "6": "b", "6bar": "b"})
    model = hl.RingModel(link, hl.static_fermions(G, "z"))
    grid = np.linspace(0.9, 0.2, points)
    line = masses_along(model, "a", grid, levels=6, cutoff=2, b=0.35, z=0.0)
    expected = [-np.log(grid), -np.log(grid), -np.log(0.5 + 0 * grid), *2 * [-np.log(0.35 + 0 * grid)]]
    np.testing.assert_allclose(line.masses, np.array(expected).T, atol=1e-12)


@pytest.mark.parametrize("points", [5, 14, 60])
def test_sectors_of_charge_conjugation_cross_exactly(points):
    """z = z̄ at t = 1/2: levels even and odd under conjugation of all irreps, each sector solved by itself."""
    grid, count = np.linspace(0.05, 3, points), 14
    model = hl.RingModel(hl.heat_kernel(SU3, "t"), hl.static_fermions(SU3, "z", "z"))
    line = masses_along(model, "z", grid, levels=count, cutoff=7, t=0.5)
    fine = np.linspace(0.05, 3, 300)
    even, odd = _sectors(fine)
    assert (np.diff(np.sign(even[:, 6] - odd[:, 3])) != 0).sum() == 2, "they cross, twice"
    even, odd = _sectors(grid)
    tracks = [part[:, j] for part in (even, odd) for j in range(count)]
    for column in line.masses.T[: count - 4]:
        assert min(np.abs(track - column).max() for track in tracks) < 1e-9, "a branch stays in its sector"


def _sectors(z):
    """Masses of the levels even and odd under conjugation, from the symmetric solver on either subspace."""
    basis = SU3.irreps(7)
    place = {irrep: i for i, irrep in enumerate(basis)}
    sign, vectors = np.linalg.eigh(np.eye(len(basis))[[place[irrep.conjugate] for irrep in basis]])
    matrices = compile_transfer(EMBER_BOTH, 7)(t=np.full(len(z), 0.5), z=z, zbar=z)
    levels = []
    for parity in (1, -1):
        subspace = vectors[:, sign * parity > 0]
        levels.append(np.linalg.eigvalsh(subspace.T @ matrices @ subspace)[:, ::-1])
    return [-np.log(np.abs(part / levels[0][:, :1])) for part in levels]
