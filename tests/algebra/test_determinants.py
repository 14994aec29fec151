"""Determinants det_R(1 + zP) and their inverses."""

from __future__ import annotations

from functools import reduce
from operator import mul

import pytest
import sympy
from sympy.abc import w, x, y, z

from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.determinants import determinant, flavour_determinant, inverse_determinant
from haarloom.algebra.group import SU
from haarloom.exceptions import ClassFunctionError, ParameterError

G = SU(3)


def test_fundamental_fermions_of_su3() -> None:
    L, conjugate = G.loop, G.loop.conjugate()
    assert determinant(G.fundamental, z) == 1 + z * L + z**2 * conjugate + z**3
    assert determinant(G.antifundamental, z) == 1 + z * conjugate + z**2 * L + z**3


@pytest.mark.parametrize(
    ("n", "name", "copies"), [(2, "2", 3), (3, "3", 4), (3, "3bar", 2), (3, "6", 2), (4, "4", 2), (3, "8", 1)]
)
def test_copies_are_powers(n: int, name: str, copies: int) -> None:
    irrep = SU(n).irrep(name)
    single = ClassFunction(irrep.group, {})
    for k in range(irrep.dimension + 1):
        single = single + z**k * irrep.antisymmetric_power(k).character()
    assert determinant(irrep, z, copies) == reduce(mul, [single] * copies)


def test_no_copies_leave_one() -> None:
    for irrep in (G.fundamental, G.adjoint):
        assert determinant(irrep, z, 0) == inverse_determinant(irrep, z, 4, 0) == ClassFunction(G, {"1": 1})


def test_dual_cauchy_identity_with_different_fugacities() -> None:
    for n in (2, 3, 4):
        factors = [determinant(SU(n).fundamental, fugacity) for fugacity in (w, x, y)]
        assert flavour_determinant(SU(n), [w, x, y]) == reduce(mul, factors)


def test_dual_cauchy_identity_with_repeated_numeric_and_compound_fugacities() -> None:
    fugacities = [z, 2, z, 1 + z, sympy.Rational(1, 2)]
    factors = [determinant(G.fundamental, fugacity) for fugacity in fugacities]
    assert flavour_determinant(G, fugacities) == reduce(mul, factors)


def test_no_flavours() -> None:
    assert flavour_determinant(G, []) == ClassFunction(G, {"1": 1})


@pytest.mark.parametrize(("name", "copies"), [("3", 1), ("3", 3), ("8", 1), ("6bar", 2)])
def test_inverse_determinant_inverts(name: str, copies: int) -> None:
    """det(1 − zP)^n · det(1 − zP)^{−n} = 1 up to the order that was kept."""
    order, irrep = 4, G.irrep(name)
    product = determinant(irrep, -z, copies) * inverse_determinant(irrep, z, order, copies)
    truncated = {
        r: sum(c * z**k for (k,), c in value.as_poly(z).terms() if k <= order)
        for r, value in product.coefficients.items()
    }
    assert ClassFunction(G, truncated) == ClassFunction(G, {"1": 1})


def test_baryon_number_of_the_free_theory() -> None:
    """Haar integral of det(1+zP)^n keeps powers of z³ alone; for n = 1 the two baryon states."""
    assert determinant(G.fundamental, z).haar() == 1 + z**3
    powers = determinant(G.fundamental, z, 4).haar().as_poly(z).monoms()
    assert all(power % 3 == 0 for (power,) in powers)


def test_fugacity_by_name_and_by_number() -> None:
    assert determinant(G.fundamental, "z") == determinant(G.fundamental, z)
    assert determinant(G.fundamental, 0.5) == determinant(G.fundamental, sympy.Rational(1, 2))
    assert determinant(G.adjoint, 0) == ClassFunction(G, {"1": 1})


@pytest.mark.parametrize("copies", [-1, 1.5, "2"])
def test_copies_are_natural_numbers(copies: object) -> None:
    with pytest.raises(ParameterError):
        determinant(G.fundamental, z, copies)


def test_fugacities_are_numbers_or_expressions() -> None:
    with pytest.raises(ClassFunctionError, match="coefficient"):
        determinant(G.fundamental, "1+z")
