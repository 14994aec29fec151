"""What may be given as a parameter, and how it becomes numbers."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
import sympy

import haarloom as hl
from haarloom.actions.parameters import DOMAINS, Field, as_parameter, evaluate
from haarloom.exceptions import ExpressionError, MissingValueError, ParameterError

REAL = Field("t", "nonnegative real", "t", "diffusion time")
ANY = Field("z", "complex", "z", "fugacity")


@pytest.mark.parametrize(
    ("given", "exact"),
    [
        (2, sympy.Integer(2)),
        (0.3, sympy.Rational(3, 10)),
        (Fraction(1, 3), sympy.Rational(1, 3)),
        (np.float64(0.25), sympy.Rational(1, 4)),
        ("t", sympy.Symbol("t")),
        ("4/3", sympy.Rational(4, 3)),
        ("1e-3", sympy.Rational(1, 1000)),
        ("exp((mu - m)/T)", sympy.exp((sympy.Symbol("mu") - sympy.Symbol("m")) / sympy.Symbol("T"))),
        (sympy.Symbol("b") ** 2, sympy.Symbol("b") ** 2),
    ],
)
def test_every_spelling_becomes_the_exact_expression(given: object, exact: sympy.Expr) -> None:
    assert as_parameter(given, REAL) == exact


def test_a_complex_number_is_exact_too() -> None:
    assert as_parameter(0.5 + 0.25j, ANY) == sympy.Rational(1, 2) + sympy.I / 4


@pytest.mark.parametrize("bad", [-1, -0.5, "-3", 1j, float("nan"), float("inf"), [1.0], None, True])
def test_values_outside_the_domain_are_refused_by_name(bad: object) -> None:
    with pytest.raises(ParameterError, match=r"\bt\b"):
        as_parameter(bad, REAL)


def test_text_outside_the_grammar_is_refused() -> None:
    with pytest.raises(ExpressionError):
        as_parameter("__import__('os')", REAL)


@pytest.mark.parametrize("domain", sorted(DOMAINS))
def test_every_domain_admits_one_half_and_refuses_nan(domain: str) -> None:
    field = Field("x", domain, "x", "a test")
    assert field.check(np.array([0.5])) == np.array([0.5])
    with pytest.raises(ParameterError, match="x = nan"):
        field.check(np.array([np.nan]))


def test_a_value_at_evaluation_is_checked_like_one_at_construction() -> None:
    with pytest.raises(ParameterError, match=r"t = -2 is not allowed.*≥ 0"):
        REAL.check(np.array([1.0, -2.0]))


def test_missing_values_are_all_listed() -> None:
    a, b, c = sympy.symbols("a b c")
    with pytest.raises(MissingValueError, match=r"No value for a, c"):
        evaluate([a + b, c], {"b": 1.0})


def test_numbers_broadcast_over_their_own_symbols_only() -> None:
    a, b = sympy.symbols("a b")
    first, second, third = evaluate(
        [a * b, a, sympy.Integer(3)], {"a": [1.0, 2.0], "b": [[1.0], [10.0]], "unused": np.ones(7)}
    )
    assert first.tolist() == [[1.0, 2.0], [10.0, 20.0]]
    assert second.tolist() == [1.0, 2.0]
    assert third.shape == ()


def test_symbols_with_hostile_names_do_no_harm() -> None:
    name = "x); import os; ("
    [value] = evaluate([sympy.Symbol(name) + 1], {name: 2.0})
    assert value == 3.0


def test_constants_are_numbers_and_not_symbols():
    G = hl.SU(3)
    assert hl.static_fermions(G, "I").parameters == ()
    assert hl.static_fermions(G, "pi").z == sympy.pi


@pytest.mark.parametrize(
    ("text", "words"),
    [("inf", "finite"), ("nan", "finite"), ("oo", "finite"), ("1/0", "divides by zero"), ("1e999", "1e308")],
)
def test_text_that_is_no_finite_number_is_refused(text, words):
    with pytest.raises(ParameterError, match=words):
        hl.heat_kernel(hl.SU(3), text)
