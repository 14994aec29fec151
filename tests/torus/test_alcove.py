"""The alcove grid integrates class functions exactly, for every N."""

from __future__ import annotations

import numpy as np
import pytest

import haarloom as hl
from haarloom.exceptions import ParameterError, SizeError
from haarloom.torus.alcove import alcove_grid
from haarloom.torus.characters import character
from haarloom.torus.quadrature import haar_grid


@pytest.mark.parametrize("n", range(2, 9))
def test_schur_orthogonality(n):
    """∫dP χ_r* χ_s = δ_rs (Schur; Weyl's integration formula)."""
    G = hl.SU(n)
    angles, weights = alcove_grid(G, 2 * n + 3)
    irreps = (G.trivial, G.fundamental, G.antifundamental, G.adjoint) if n > 2 else G.irreps(2)
    values = np.array([character(irrep, angles) for irrep in irreps])
    assert np.allclose((values.conj() * weights) @ values.T, np.eye(len(irreps)), atol=1e-12)


@pytest.mark.parametrize(
    ("n", "moments"), [(2, [1, 1, 2, 5, 14]), (3, [1, 1, 2, 6, 23]), (4, [1, 1, 2, 6, 24])]
)
def test_moments_of_the_loop(n, moments):
    """∫|tr P|^{2k} counts permutations without a long increasing subsequence (Gessel 1990, Rains 1998)."""
    angles, weights = alcove_grid(hl.SU(n), 24)
    loop = np.exp(1j * angles).sum(axis=1)
    for k, expected in enumerate(moments):
        assert np.sum(weights * np.abs(loop) ** (2 * k)) == pytest.approx(expected, rel=1e-12)


def test_agrees_with_the_full_grid():
    G = hl.SU(3)
    results = []
    for grid in (alcove_grid, haar_grid):
        angles, weights = grid(G, 21)
        results.append(np.sum(weights * np.exp(character(G.fundamental, angles)).real))
    assert results[0] == pytest.approx(results[1], rel=1e-13)


def test_bad_sizes_are_named():
    with pytest.raises(ParameterError, match="at least 5"):
        alcove_grid(hl.SU(3), 4)
    with pytest.raises(SizeError, match="tuples of eigenphases"):
        alcove_grid(hl.SU(8), 60)
