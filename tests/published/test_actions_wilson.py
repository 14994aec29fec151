"""SU(2) and SU(3) Wilson coefficients against the group integral at thirty digits, and the published series.

The code sums determinants of Bessel functions in floats, long integers and as symbols; here the group
integral itself is done by mpmath, from Weyl's integration formula (H. Weyl, *The Classical Groups*), with
characters as quotients of determinants.
"""

from __future__ import annotations

import math
from math import factorial

import mpmath
import pytest
import sympy
from scipy.integrate import dblquad

from haarloom.actions import wilson
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep

BETA = sympy.Symbol("beta")


def _su2_integral(label: int, beta: mpmath.mpf) -> mpmath.mpf:
    """(2/π)∫ sin²θ χ_j(θ) e^{β cos θ} dθ, χ_j = sin((a + 1)θ)/sin θ."""

    def integrand(theta: mpmath.mpf) -> mpmath.mpf:
        return mpmath.sin(theta) * mpmath.sin((label + 1) * theta) * mpmath.exp(beta * mpmath.cos(theta))

    return mpmath.quad(integrand, [0, mpmath.pi / 2, mpmath.pi]) * 2 / mpmath.pi


@pytest.mark.parametrize("beta", ["0.5", "2.3", "16"])
def test_su2_dlmf_10_32_3_quadrature_of_the_group_integral(beta: str) -> None:
    # k_j = I_{2j+1}(β)/I_1(β): NIST DLMF 10.32.3 after an integration by parts
    mpmath.mp.dps = 40
    G, value = SU(2), mpmath.mpf(beta)
    bottom = _su2_integral(0, value)
    for label in range(1, 6):
        expected = _su2_integral(label, value) / ((label + 1) * bottom)
        exact = wilson(G, "beta").coefficient(G.irrep(label)).subs(BETA, sympy.Rational(beta)).evalf(35)
        assert abs(mpmath.mpf(str(exact)) / expected - 1) < mpmath.mpf(10) ** -30
        k, error = wilson(G, "beta").coefficients_at([G.irrep(label)], {"beta": float(beta)})
        assert abs(float(expected) - k[0]) <= error[0]


def _su3_integrals(irreps: list[Irrep], beta: mpmath.mpf, points: int) -> list[mpmath.mpf]:
    """∫dU χ_r* e^{(β/3) Re tr U} by the trapezoidal rule; periodic and entire, so exact but for e^{−…} of
    points.

    χ_r |Δ|² is Weyl's numerator times the conjugate denominator, so nothing is divided.
    """
    step = 2 * mpmath.pi / points
    unit = [mpmath.expjpi(mpmath.mpf(2 * k) / points) for k in range(points)]
    totals = [mpmath.mpf(0)] * len(irreps)
    for j in range(points):
        for k in range(points):
            phases = (j, k, (-j - k) % points)
            x = [unit[p] for p in phases]
            weight = mpmath.exp(beta / 3 * sum(value.real for value in x))
            bottom = (x[0] - x[1]) * (x[0] - x[2]) * (x[1] - x[2])
            for place, irrep in enumerate(irreps):
                powers = [row + 2 - i for i, row in enumerate(irrep.partition)]
                u = [[unit[(p * power) % points] for power in powers] for p in phases]
                top = (
                    u[0][0] * (u[1][1] * u[2][2] - u[1][2] * u[2][1])
                    - u[0][1] * (u[1][0] * u[2][2] - u[1][2] * u[2][0])
                    + u[0][2] * (u[1][0] * u[2][1] - u[1][1] * u[2][0])
                )
                totals[place] += (mpmath.conj(top) * bottom * weight).real
    return [total * step**2 / (6 * (2 * mpmath.pi) ** 2) for total in totals]


@pytest.mark.parametrize("beta", ["1", "6"])
def test_su3_group_integral_at_thirty_digits(beta: str) -> None:
    mpmath.mp.dps = 36
    G = SU(3)
    irreps = [G.trivial, G.fundamental, G.adjoint, G.irrep("6"), G.irrep(2, 1)]
    integrals = _su3_integrals(irreps, mpmath.mpf(beta), 40)
    for irrep, integral in zip(irreps[1:], integrals[1:], strict=True):
        expected = integral / (irrep.dimension * integrals[0])
        exact = wilson(G, "beta").coefficient(irrep).subs(BETA, int(beta)).evalf(33)
        assert abs(mpmath.mpf(str(exact)) / expected - 1) < mpmath.mpf(10) ** -29
        k, error = wilson(G, "beta").coefficients_at([irrep], {"beta": float(beta)})
        assert abs(float(expected) - k[0]) <= error[0] + 1e-17


@pytest.mark.parametrize("beta", [1.0, 6.0, 12.0])
def test_su3_by_scipys_nested_quadrature(beta: float) -> None:
    def weyl(a: float, b: float) -> float:
        gaps = (a - b, 2 * a + b, a + 2 * b)
        density = math.prod(4 * math.sin(gap / 2) ** 2 for gap in gaps)
        return density * math.exp(beta / 3 * (loop(a, b) - 3))

    def loop(a: float, b: float) -> float:
        return math.cos(a) + math.cos(b) + math.cos(a + b)

    options = {"epsabs": 1e-9, "epsrel": 1e-9}
    bottom, _ = dblquad(weyl, -math.pi, math.pi, -math.pi, math.pi, **options)
    top, _ = dblquad(lambda a, b: weyl(a, b) * loop(a, b), -math.pi, math.pi, -math.pi, math.pi, **options)
    k, error = wilson(SU(3), beta).coefficients_at([SU(3).fundamental], {})
    assert abs(k[0] - top / (3 * bottom)) <= error[0] + 1e-8


def test_five_hundred_digits_against_ordinary_bessel_sums() -> None:
    """mpmath's own I_ν, summed as in J.-M. Drouffe, J.-B. Zuber, Phys. Rep. 102 (1983) 1."""
    mpmath.mp.dps = 540
    x = mpmath.mpf(2)
    table = [mpmath.besseli(k, x) for k in range(170)]

    def total(rows: tuple[int, int, int]) -> mpmath.mpf:
        result = mpmath.mpf(0)
        for n in range(-150, 150):
            m = [[table[abs(rows[j] - j + i + n)] for j in range(3)] for i in range(3)]
            result += (
                m[0][0] * (m[1][1] * m[2][2] - m[1][2] * m[2][1])
                - m[0][1] * (m[1][0] * m[2][2] - m[1][2] * m[2][0])
                + m[0][2] * (m[1][0] * m[2][1] - m[1][1] * m[2][0])
            )
        return result

    expected = total((2, 1, 0)) / (8 * total((0, 0, 0)))
    G = SU(3)
    found = wilson(G, 6).coefficient(G.adjoint).evalf(500)
    assert abs(mpmath.mpf(str(found)) / expected - 1) < mpmath.mpf(10) ** -498


def test_su3_strong_coupling_series_drouffe_zuber_1983() -> None:
    """u(β) = ⟨tr U⟩/3 of one plaquette, the fundamental coefficient; typed from memory of the literature:

    u = β/18 + β²/216 − 5β⁴/93312 − … (J.-M. Drouffe, J.-B. Zuber, Phys. Rep. 102 (1983) 1, table of
    coefficients).
    """
    G = SU(3)
    series = wilson(G, "beta").strong_coupling(G.fundamental, 4)
    assert series == BETA / 18 + BETA**2 / 216 - 5 * BETA**4 / 93312


@pytest.mark.parametrize("n", [2, 3, 4])
@pytest.mark.parametrize("adjoint", [False, True])
def test_series_from_exact_rational_haar_moments(n: int, adjoint: bool) -> None:
    """∫dU χ_r* (L + L*)^M by the ring of class functions, divided as power series: another route than
    walks."""
    G, order = SU(n), 8
    irrep = G.adjoint if adjoint else G.fundamental
    step = G.loop + G.loop.conjugate()
    power = ClassFunction(G, {G.trivial: 1})
    top, bottom = [], []
    for exponent in range(order + 1):
        scale = sympy.Rational(1, factorial(exponent) * (2 * n) ** exponent)
        top.append(scale * (irrep.character().conjugate() * power).haar() / irrep.dimension)
        bottom.append(scale * power.haar())
        power = power * step
    numerator = sum(value * BETA**k for k, value in enumerate(top))
    denominator = sum(value * BETA**k for k, value in enumerate(bottom))
    expected = sympy.series(numerator / denominator, BETA, 0, order + 1).removeO()
    assert sympy.expand(wilson(G, "beta").strong_coupling(irrep, order) - expected) == 0


def test_su2_series_is_sympys_series_of_the_bessel_quotient() -> None:
    G = SU(2)
    closed = sympy.series(sympy.besseli(2, BETA) / sympy.besseli(1, BETA), BETA, 0, 10).removeO()
    assert sympy.expand(wilson(G, "beta").strong_coupling(G.fundamental, 9) - closed) == 0
