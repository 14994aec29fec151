"""Families of irreps with symbolic labels."""

from __future__ import annotations

from itertools import product
from typing import Any

import pytest
import sympy
from hypothesis import given
from hypothesis import strategies as st
from sympy.abc import p, q, r

from haarloom.algebra.group import SU
from haarloom.algebra.symbolic_irrep import SymbolicIrrep
from haarloom.exceptions import GroupError, LabelError, ParameterError, SizeError

G = SU(3)


def test_invariants_of_su3_in_closed_form() -> None:
    family = G.irrep(p, q)
    assert sympy.expand(family.dimension - (p + 1) * (q + 1) * (p + q + 2) / 2) == 0
    assert family.casimir(2) == sympy.expand((p**2 + q**2 + p * q) / 3 + p + q)
    assert sympy.expand(family.casimir(3) - (p - q) * (p + 2 * q + 3) * (q + 2 * p + 3) / 18) == 0
    assert family.conjugate == G.irrep(q, p)
    assert family.nality == p + 2 * q


@given(st.integers(2, 5), st.lists(st.integers(0, 4), min_size=4, max_size=4))
def test_polynomials_take_the_values_of_the_irreps(n: int, numbers: list[int]) -> None:
    symbols = sympy.symbols(f"a_1:{n}")
    family = SU(n).irrep(*symbols)
    values = dict(zip(symbols, numbers, strict=False))
    irrep = family.at(**{symbol.name: value for symbol, value in values.items()})
    assert irrep.labels == tuple(numbers[: n - 1])
    assert family.dimension.subs(values) == irrep.dimension
    assert family.casimir(2).subs(values) == irrep.casimir(2)
    assert family.casimir(3).subs(values) == irrep.casimir(3)
    assert family.index.subs(values) == irrep.index
    assert family.nality.subs(values) % n == irrep.nality


def test_product_with_the_triplet() -> None:
    assert str(G.irrep(p, q) * G.irrep("3")) == "(p + 1, q) + (p - 1, q + 1) [p ≥ 1] + (p, q - 1) [q ≥ 1]"


@pytest.mark.parametrize("name", ["3", "3bar", "6", "6bar", "8", "10", "15", "27"])
def test_formulas_of_su3_hold_at_every_boundary(name: str) -> None:
    factor = G.irrep(name)
    formula = G.irrep(p, q) * factor
    for a, b in product(range(7), repeat=2):
        assert formula.at(p=a, q=b) == G.irrep(a, b) * factor


@pytest.mark.parametrize(("n", "labels"), [(2, (3,)), (4, (1, 0, 1)), (4, (0, 1, 0)), (5, (1, 0, 0, 1))])
def test_formulas_of_other_groups_hold_at_every_boundary(n: int, labels: tuple[int, ...]) -> None:
    symbols = sympy.symbols(f"a_1:{n}")
    formula = SU(n).irrep(*symbols) * SU(n).irrep(labels)
    for values in product(range(4 if n < 5 else 3), repeat=n - 1):
        named = {symbol.name: value for symbol, value in zip(symbols, values, strict=True)}
        assert formula.at(**named) == SU(n).irrep(values) * SU(n).irrep(labels)


def test_some_labels_may_be_numbers_or_shifted() -> None:
    formula = G.irrep(p, 0) * G.adjoint
    assert str(formula) == "(p + 1, 1) + (p - 1, 2) [p ≥ 1] + (p, 0) [p ≥ 1] + (p - 2, 1) [p ≥ 2]"
    shifted = G.irrep(p + 1, p) * G.irrep("3")
    for value in range(4):
        assert shifted.at(p=value) == G.irrep(value + 1, value) * G.irrep("3")


def test_generic_multiplicity_is_that_of_the_weight() -> None:
    formula = G.adjoint * G.irrep(p, q)
    assert {term.weight: term.multiplicity for term in formula.terms} == G.adjoint.weights()


def test_faces() -> None:
    formula = G.irrep(p, q) * G.irrep("3bar")
    assert formula._repr_latex_().startswith(r"$(p,q) \otimes \overline{\mathbf{3}} = ")
    assert r"[q \geq 1]" in formula.latex()
    assert G.irrep(p, q)._repr_latex_() == "$(p,q)$"
    assert repr(G.irrep(p, 2 * q)) == "SU(3).irrep(p, 2*q)"


def test_it_is_a_value_of_its_own_kind() -> None:
    assert isinstance(G.irrep(p, 1), SymbolicIrrep)
    assert not isinstance(G.irrep(sympy.Integer(1), 1), SymbolicIrrep)
    assert hash(G.irrep(p, q)) == hash(G.irrep(p, q))
    assert SU(4).irrep(p, q, r).free_symbols == {p, q, r}


def test_symbols_in_both_factors_are_refused() -> None:
    with pytest.raises(ParameterError, match="not bounded"):
        G.irrep(p, q) * G.irrep(r, 0)
    with pytest.raises(GroupError):
        G.irrep(p, q) * SU(2).fundamental
    with pytest.raises(TypeError):
        G.irrep(p, q) * 3
    with pytest.raises(SizeError, match="22,801"):
        G.irrep(p, q) * G.irrep(75, 75)


@pytest.mark.parametrize(
    "labels",
    [
        (p,),
        (p, q, r),
        (p, -1),
        (p, True),
        (p, 1.5),
        (p / 2, q),
        (sympy.sqrt(p), q),
        (p, "q"),
        (1 / p, q),
        (sympy.Rational(1, 2), p),
    ],
)
def test_bad_symbolic_labels(labels: tuple[Any, ...]) -> None:
    with pytest.raises(LabelError):
        G.irrep(*labels)


def test_values_must_give_labels() -> None:
    with pytest.raises(LabelError, match="q left"):
        G.irrep(p, q).at(p=1)
    with pytest.raises(LabelError, match="≥ 0"):
        G.irrep(p - 1, q).at(p=0, q=0)
    with pytest.raises(ParameterError, match="degree"):
        G.irrep(p, q).casimir(4)
