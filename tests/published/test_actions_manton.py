"""Manton's action against direct quadrature, centre images included.

N. S. Manton, *Phys. Lett. B* 96 (1980) 328. The code uses a collapsed Gauss rule on one alcove; here SU(2)
has a closed form in error functions (mpmath) and SU(3) is integrated by SciPy over the whole torus with the
shortest geodesic found by trying every shift of the phases.
"""

from __future__ import annotations

from itertools import product

import mpmath
import numpy as np
import pytest
from scipy.integrate import dblquad

from haarloom.actions import manton
from haarloom.algebra.group import SU


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
