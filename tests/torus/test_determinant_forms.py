"""Determinants of one-dimensional integrals against quadrature over all eigenphases, and closed forms."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import iv

import haarloom as hl
from haarloom.exceptions import ConvergenceError
from haarloom.torus.alcove import alcove_grid
from haarloom.torus.characters import character, characters
from haarloom.torus.determinant_forms import EigenvalueProduct, WindingGaussian


def tilted(phases):
    """Neither real nor even, with all Fourier components."""
    return np.exp(0.4 * np.exp(1j * phases) - 0.3 * np.exp(-2j * phases)) / (1 - 0.2 * np.exp(1j * phases))


@pytest.mark.parametrize(("n", "points"), [(2, 60), (3, 48), (4, 36)])
@pytest.mark.parametrize("pair", [(0, 0), (1, 0), (0, 1), (2, 1), (3, 3)])
def test_elements_of_a_product_over_eigenvalues(n, points, pair):
    G = hl.SU(n)
    bra, ket = (G.irreps(2)[place % len(G.irreps(2))] for place in pair)
    form = EigenvalueProduct(G, tilted)
    angles, weights = alcove_grid(G, points)
    expected = np.sum(weights * character(bra, angles).conj() * form.at(angles) * character(ket, angles))
    assert form.matrix_element(bra, ket) == pytest.approx(expected, rel=1e-11, abs=1e-12)


def test_the_trivial_coefficient_of_su2_is_a_bessel_function():
    """∫dP exp(x tr P) = I_1(2x)/x on SU(2) (DLMF 10.32.2)."""
    x = 0.9
    form = EigenvalueProduct(hl.SU(2), lambda phases: np.exp(x * np.cos(phases)))
    assert form.coefficient(hl.SU(2).trivial) == pytest.approx(iv(1, 2 * x) / x, rel=1e-13)


def test_a_factor_with_a_pole_by_the_circle_is_refused():
    form = EigenvalueProduct(hl.SU(3), lambda phases: 1 / (1.0001 - np.exp(1j * phases)))
    with pytest.raises(ConvergenceError, match="singularity too near"):
        form.coefficient(hl.SU(3).trivial)


@pytest.mark.parametrize("n", range(2, 9))
@pytest.mark.parametrize("tau", [0.3, 1.0])
def test_windings_have_the_heat_kernels_coefficients(n, tau):
    """w_r = e^{−τC₂(r)} (P. Menotti, E. Onofri, Nucl. Phys. B 190 (1981) 288)."""
    G = hl.SU(n)
    form = WindingGaussian(G, tau)
    trivial = form.coefficient(G.trivial)
    for irrep in G.irreps(2):
        found = form.coefficient(irrep) / trivial / irrep.dimension
        assert found == pytest.approx(np.exp(-tau * float(irrep.casimir(2))), abs=2e-14)


@pytest.mark.parametrize(("n", "cutoff"), [(2, 20), (3, 14), (4, 9)])
def test_windings_at_eigenphases_are_the_sum_over_characters(n, cutoff):
    G, tau = hl.SU(n), 1.0
    angles = np.random.default_rng(4).uniform(-np.pi, np.pi, (12, n - 1))
    irreps = G.irreps(cutoff)
    weights = [r.dimension * np.exp(-tau * float(r.casimir(2))) for r in irreps]
    direct = (characters(irreps, angles) @ np.array(weights)).real
    found = WindingGaussian(G, tau).at(angles)
    assert np.allclose(found * (direct[0] / found[0]), direct, rtol=0, atol=1e-10 * direct.max())
