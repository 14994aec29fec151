"""Truncated Taylor expansions in a coupling."""

from __future__ import annotations

from math import comb, factorial

import pytest
import sympy
from hypothesis import given
from sympy.abc import a, g, z

from algebra.strategies import class_functions
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.exceptions import ConvergenceError, ParameterError

G = SU(3)
L, LBAR = G.loop, G.loop.conjugate()


def truncated(function: ClassFunction, order: int) -> ClassFunction:
    """Drop powers of g beyond an order."""
    terms = {
        irrep: sum((value.expand().coeff(g, k) * g**k for k in range(order + 1)), sympy.Integer(0))
        for irrep, value in function.coefficients.items()
    }
    return ClassFunction(function.group, terms)


@given(class_functions(largest=3))
def test_logarithm_undoes_the_exponential(f: ClassFunction) -> None:
    series = (g * f).exp(g, 3).truncated()
    assert series.log(g, 3).truncated() == g * f


def test_exponential_is_the_sum_of_powers() -> None:
    f = g * (L + LBAR) + g**2 * z * G.adjoint.character()
    expected = sum((f**k / factorial(k) for k in range(6)), ClassFunction(G, {}))
    assert f.exp(g, 5).truncated() == truncated(expected, 5)


def test_logarithm_is_the_sum_of_powers() -> None:
    f = g * L + g**2 * LBAR
    expected = sum(((-1) ** (k + 1) * f**k / k for k in range(1, 5)), ClassFunction(G, {}))
    assert (1 + f).log(g, 4).truncated() == truncated(expected, 4)


def test_constants_are_carried_exactly() -> None:
    series = (a + g * L).exp(g, 2)
    assert series[0] == ClassFunction(G, {"1": sympy.exp(a)})
    assert series[1] == sympy.exp(a) * L
    assert (2 + g * L).log(g, 1).coefficients == (ClassFunction(G, {"1": sympy.log(2)}), L / 2)


def test_strong_coupling_series_of_su2() -> None:
    """∫ exp(g tr U) = I₁(2g)/g on SU(2) (DLMF 10.25.2); SymPy expands the Bessel function."""
    series = (g * SU(2).loop).exp(g, 8).haar()
    bessel = sympy.series(sympy.besseli(1, 2 * g) / g, g, 0, 9).removeO()
    assert [bessel.coeff(g, k) for k in range(9)] == list(series)


def test_moments_of_su3_stand_behind_the_exponential() -> None:
    """Up to second order only the pairing L L* contributes: C(2, 1)/2!."""
    series = (g * (L + LBAR)).exp(g, 2).haar()
    assert series == (1, 0, sympy.Rational(comb(2, 1), factorial(2)))


def test_expansion_in_a_function_of_the_coupling() -> None:
    series = (sympy.sin(g) * L).exp(g, 3)
    assert series[3] == L**3 / 6 - L / 6


def test_faces() -> None:
    series = (g * L).exp(g, 2)
    assert series.order == 2
    assert len(series) == 3
    assert series.latex().endswith("O(g^{3})")
    assert series._repr_latex_().startswith("$")


def test_what_has_no_finite_coefficients() -> None:
    with pytest.raises(ConvergenceError, match="more than a constant"):
        (L + g).exp(g, 2)
    with pytest.raises(ConvergenceError, match="more than a constant"):
        (1 + L).log(g, 2)
    with pytest.raises(ConvergenceError, match="vanishes"):
        (g * L).log(g, 2)
    with pytest.raises(ConvergenceError, match="singular"):
        (L / g).exp(g, 2)


@pytest.mark.parametrize("coupling", ["g", 1, g**2])
def test_the_coupling_is_a_symbol(coupling: object) -> None:
    with pytest.raises(ParameterError, match="symbol"):
        (g * L).exp(coupling, 2)


def test_the_order_is_a_natural_number() -> None:
    with pytest.raises(ParameterError):
        (g * L).exp(g, -1)
    assert (g * L).exp(g, 0).coefficients == (ClassFunction(G, {"1": 1}),)
