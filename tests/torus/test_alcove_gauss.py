"""Gauss's rule on one alcove: exact on characters, and exponentially convergent across creases."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad

import haarloom as hl
from haarloom.exceptions import SizeError
from haarloom.torus.alcove_gauss import alcove_nodes
from haarloom.torus.characters import characters


@pytest.mark.parametrize(("n", "order"), [(2, 24), (3, 24), (4, 24), (5, 22)])
def test_schur_orthogonality(n, order):
    """∫dP χ_r* χ_s = δ_rs (Schur; Weyl's integration formula)."""
    irreps = hl.SU(n).irreps(1 if n > 3 else 2)
    angles, weights = alcove_nodes(n, order)
    values = characters(irreps, angles)
    assert np.allclose((values.conj() * weights[:, None]).T @ values, np.eye(len(irreps)), atol=1e-11)


@pytest.mark.parametrize("n", range(2, 6))
def test_the_nodes_lie_in_the_alcove(n):
    angles, weights = alcove_nodes(n, 6)
    assert np.all(np.diff(angles, axis=1) <= 0)
    assert np.all(angles[:, 0] - angles[:, -1] <= 2 * np.pi)
    assert np.allclose(angles.sum(axis=1), 0)
    assert weights.sum() == pytest.approx(1)


def test_a_crease_on_the_wall_costs_nothing():
    """|θ| of SU(2) has a crease at P = −1; SciPy integrates (2/π) sin²θ θ over 0 ≤ θ ≤ π."""
    angles, weights = alcove_nodes(2, 24)
    expected, _ = quad(lambda t: 2 / np.pi * np.sin(t) ** 2 * t, 0, np.pi, epsabs=1e-13)
    assert weights @ np.abs(angles[:, 0]) == pytest.approx(expected, rel=1e-13)


def test_too_many_nodes_are_refused():
    with pytest.raises(SizeError, match=r"2,097,152 nodes.*take fewer"):
        alcove_nodes(8, 8)
