"""Characters at eigenphases."""

from __future__ import annotations

import numpy as np
import pytest

from haarloom.algebra.group import SU
from haarloom.exceptions import GroupError
from haarloom.torus.characters import character, characters, weyl_ratio


@pytest.mark.parametrize(("n", "cutoff"), [(2, 9), (3, 7), (4, 3), (5, 2), (6, 2), (8, 1)])
def test_agrees_with_weyls_ratio_at_generic_points(n: int, cutoff: int, rng: np.random.Generator) -> None:
    group = SU(n)
    apart = 2 * np.pi * np.arange(n) / n  # eigenvalues well apart, where the ratio is well conditioned
    angles = (apart - apart.mean() + rng.uniform(-0.2, 0.2, (20, n)))[:, :-1]
    basis = group.irreps(cutoff)
    table = characters(basis, angles)
    for place, irrep in enumerate(basis):
        tolerance = 1e-11 * irrep.dimension
        np.testing.assert_allclose(table[:, place], weyl_ratio(irrep, angles), atol=tolerance)


@pytest.mark.parametrize("n", range(2, 9))
def test_the_identity_gives_the_dimension(n: int) -> None:
    """Where all eigenvalues coincide and Weyl's ratio is 0/0."""
    for irrep in SU(n).irreps(3 if n < 6 else 1):
        assert character(irrep, np.zeros(n - 1)) == pytest.approx(irrep.dimension, rel=1e-13)


@pytest.mark.parametrize("n", [2, 3, 4, 5])
def test_centre_elements_multiply_by_the_nality(n: int) -> None:
    centre = np.full(n, 2 * np.pi / n)
    for irrep in SU(n).irreps(2):
        expected = irrep.dimension * np.exp(2j * np.pi * irrep.nality / n)
        assert character(irrep, centre) == pytest.approx(expected, rel=1e-12)


def test_two_coinciding_eigenvalues_are_no_special_case(rng: np.random.Generator) -> None:
    group = SU(3)
    theta = rng.uniform(-1, 1)
    at = characters(group.irreps(5), [theta, theta])
    near = characters(group.irreps(5), [theta + 1e-7, theta - 1e-7])
    np.testing.assert_allclose(at, near, atol=1e-9)


def test_large_labels_keep_their_digits() -> None:
    """χ_(p,0) at (θ, −θ, 0) is a sum of (p+1)(p+2)/2 phases; mpmath-free referee: the sum itself."""
    p, theta = 40, 0.37
    a, b = np.meshgrid(np.arange(p + 1), np.arange(p + 1), indexing="ij")
    phases = np.exp(1j * theta * (a - b))[a + b <= p].sum()
    assert character(SU(3).irrep(p, 0), [theta, -theta]) == pytest.approx(phases, abs=1e-10)
    assert character(SU(3).irrep(0, p), [theta, -theta]) == pytest.approx(np.conj(phases), abs=1e-9)


def test_shapes() -> None:
    group = SU(4)
    assert character(group.adjoint, np.zeros((2, 5, 3))).shape == (2, 5)
    assert characters(group.irreps(1), np.zeros((2, 5, 4))).shape == (2, 5, 4)
    assert characters(group.irreps(2), np.zeros((0, 3))).shape == (0, 10)


def test_one_group_at_a_time() -> None:
    with pytest.raises(GroupError):
        characters((SU(3).trivial, SU(4).trivial), np.zeros(2))
    with pytest.raises(GroupError):
        characters((), np.zeros(2))
