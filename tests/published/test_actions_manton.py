"""Manton's action against direct quadrature, centre images included.

N. S. Manton, *Phys. Lett. B* 96 (1980) 328. The code takes determinants of one-dimensional integrals; here
SU(2) is integrated by mpmath, SU(3) by SciPy over the whole torus with the shortest geodesic found by trying
every shift of the phases, N ≤ 4 by Gauss's rule over one alcove, and more colours by random matrices.
"""

from __future__ import annotations

from itertools import product

import mpmath
import numpy as np
import pytest
from scipy.integrate import dblquad
from scipy.stats import unitary_group

from haarloom.actions import manton
from haarloom.algebra.group import SU
from haarloom.torus.alcove_gauss import alcove_nodes
from haarloom.torus.characters import characters


@pytest.mark.parametrize("beta", [0.5, 3.0, 20.0])
def test_su2_by_gaussian_integrals(beta: float) -> None:
    mpmath.mp.dps = 30
    G = SU(2)
    # d² = 2θ², so w = exp[−(β/4)·2θ²] on 0 ≤ θ ≤ π

    def moment(label: int) -> mpmath.mpf:
        return mpmath.quad(
            lambda t: mpmath.sin(t) * mpmath.sin((label + 1) * t) * mpmath.exp(-beta / 2 * t**2),
            mpmath.linspace(0, mpmath.pi, 9),
        )

    k, error = manton(G, "beta").coefficients_at(G.irreps(5), {"beta": beta})
    for label in range(6):
        assert abs(float(moment(label) / ((label + 1) * moment(0))) - k[label]) <= error[label]
    assert error.max() < 1e-11


def _shortest_squared(a: float, b: float) -> float:
    shifts = product((-1, 0, 1), repeat=2)
    candidates = (
        (a + 2 * np.pi * m) ** 2 + (b + 2 * np.pi * n) ** 2 + (a + b + 2 * np.pi * (m + n)) ** 2
        for m, n in shifts
    )
    return min(candidates)


@pytest.mark.parametrize("beta", [1.0, 6.0])
def test_su3_by_nested_quadrature(beta: float) -> None:
    G = SU(3)

    def weyl(a: float, b: float) -> float:
        gaps = (a - b, 2 * a + b, a + 2 * b)
        return float(
            np.prod([4 * np.sin(gap / 2) ** 2 for gap in gaps]) * np.exp(-beta / 6 * _shortest_squared(a, b))
        )

    def loop(a: float, b: float) -> float:
        return float(np.cos(a) + np.cos(b) + np.cos(a + b))

    options = {"epsabs": 1e-6, "epsrel": 1e-6}
    bottom, _ = dblquad(weyl, -np.pi, np.pi, -np.pi, np.pi, **options)
    top, _ = dblquad(lambda a, b: weyl(a, b) * loop(a, b), -np.pi, np.pi, -np.pi, np.pi, **options)
    k, error = manton(G, "beta").coefficients_at([G.fundamental], {"beta": beta})
    assert k[0] == pytest.approx(top / (3 * bottom), abs=2e-6)
    assert error[0] < 1e-11


@pytest.mark.parametrize("n", [3, 4])
def test_an_element_of_the_centre_is_a_geodesic_distance_away(n: int) -> None:
    # e^{2πi/N}: phases 2π/N and one 2π/N − 2π; d² = (2π)²(N − 1)/N
    G = SU(n)
    weight = manton(G, "beta").plaquette_at(np.full((1, n - 1), 2 * np.pi / n), {"beta": 1.0})
    assert weight[0] == pytest.approx(np.exp(-((2 * np.pi) ** 2) * (n - 1) / n / (2 * n)), rel=1e-12)


@pytest.mark.parametrize("n", [2, 3, 4])
@pytest.mark.parametrize("beta", [1e-4, 1.0, 12.0, 40.0])
def test_determinants_against_gauss_rule_on_the_alcove(n: int, beta: float) -> None:
    """The code's determinants of one-dimensional integrals against quadrature over all eigenphases."""
    G = SU(n)
    irreps = G.irreps(2)
    angles, weights = alcove_nodes(n, {2: 240, 3: 90, 4: 36}[n])
    # on the alcove the phases themselves are the shortest geodesic
    weighted = weights * np.exp(-beta / (2 * n) * (angles**2).sum(axis=1))
    integrals = weighted @ characters(irreps, angles).conj() / weighted.sum()
    expected = integrals.real / np.array([irrep.dimension for irrep in irreps])
    k, error = manton(G, "beta").coefficients_at(irreps, {"beta": beta})
    assert np.all(np.abs(k - expected) <= error + 1e-12)
    assert error.max() < 1e-11


@pytest.mark.parametrize("n", [5, 6, 8])
def test_many_colours_against_random_matrices(n: int) -> None:
    """Haar-random U(N) matrices (F. Mezzadri, Notices AMS 54 (2007) 592), their determinant divided out."""
    G, beta = SU(n), 3.0
    matrices = unitary_group.rvs(n, size=20_000, random_state=np.random.default_rng(8))
    phases = np.angle(np.linalg.eigvals(matrices))
    phases = phases - phases.sum(axis=1, keepdims=True) / n
    phases[:, 0] -= phases.sum(axis=1)
    # another N-th root of the determinant is as likely: a random element of the centre
    phases = phases + 2 * np.pi * np.random.default_rng(9).integers(0, n, (len(phases), 1)) / n
    phases[:, 0] -= phases.sum(axis=1)
    link = manton(G, "beta")
    weights = link.plaquette_at(phases, {"beta": beta})
    assert weights is not None
    loops = np.exp(1j * phases).sum(axis=1).real / n
    expected = (weights * loops).sum() / weights.sum()
    spread = np.sqrt((weights**2 * (loops - expected) ** 2).sum()) / weights.sum()
    k, error = link.coefficients_at([G.fundamental], {"beta": beta})
    assert abs(k[0] - expected) <= 4 * spread
    assert 4 * spread < 0.1 * k[0]
    assert error[0] < 1e-12


def test_many_irreps_and_many_colours_are_symmetric_under_conjugation() -> None:
    G = SU(8)
    irreps = G.irreps(2)
    k, error = manton(G, "beta").coefficients_at(irreps, {"beta": [0.0, 5.0]})
    swapped, _ = manton(G, "beta").coefficients_at([r.conjugate for r in irreps], {"beta": [0.0, 5.0]})
    assert np.all(np.abs(k - swapped) <= 2 * error)
    assert k[0].tolist() == [float(r == G.trivial) for r in irreps]
