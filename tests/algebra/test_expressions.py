"""Class functions from SymPy expressions."""

from __future__ import annotations

from typing import Any

import pytest
import sympy
from sympy import Abs, I, Symbol, conjugate, cos, exp, im, log, re, sin, sqrt, symbols
from sympy.abc import n, p, z

from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.expressions import class_function_from, haar_integral
from haarloom.algebra.group import SU
from haarloom.algebra.powers import adams
from haarloom.algebra.words import P, chi, tr
from haarloom.exceptions import ClassFunctionError, ConvergenceError, LabelError

G = SU(3)
L, LSTAR = symbols("L L^*")
THREE, THREEBAR, EIGHT = G.loop, G.loop.conjugate(), G.adjoint.character()
X = symbols("x_1:4")
THETA = symbols("theta_1:4")


@pytest.mark.parametrize(
    ("expression", "expected"),
    [
        (L, THREE),
        (LSTAR, THREEBAR),
        (Symbol("Lstar"), THREEBAR),
        (conjugate(L), THREEBAR),
        (conjugate(LSTAR), THREE),
        (tr(P), THREE),
        (tr(P, -1), THREEBAR),
        (conjugate(tr(P, 2)), ClassFunction(G, adams((0, 1), 2))),
        (tr(P, 0), ClassFunction(G, {"1": 3})),
        (chi(1, 1), EIGHT),
        (conjugate(chi(2, 1)), G.irrep("15bar").character()),
        (chi(0, 0), ClassFunction(G, {"1": 1})),
        (re(L), (THREE + THREEBAR) / 2),
        (im(L), (THREE - THREEBAR) / (2 * I)),
        (Abs(L) ** 2, EIGHT + 1),
        (re(X[0] + X[1] + X[2]), (THREE + THREEBAR) / 2),
        (conjugate(sum(exp(I * theta) for theta in THETA)), THREEBAR),
        (Abs(L) ** 4, (EIGHT + 1) ** 2),
        (re(z * L), (z * THREE + conjugate(z) * THREEBAR) / 2),
        ((1 + z * L) ** 3, (1 + z * THREE) ** 3),
        (L * LSTAR - 1, EIGHT),
        ((L**2 - tr(P, 2)) / 2, THREEBAR),
        (sympy.Integer(5), ClassFunction(G, {"1": 5})),
        (exp(-z) * L + sqrt(z), exp(-z) * THREE + sqrt(z)),
        (X[0] + X[1] + X[2], THREE),
        (1 / X[0] + 1 / X[1] + 1 / X[2], THREEBAR),
        (X[0] * X[1] * X[2] * z, ClassFunction(G, {"1": z})),
        (L * (X[0] + X[1] + X[2]), THREE**2),
        (exp(I * THETA[0]) + exp(I * THETA[1]) + exp(-I * (THETA[0] + THETA[1])), THREE),
        (sum(cos(theta) for theta in THETA), (THREE + THREEBAR) / 2),
        (sum(sin(theta) for theta in THETA), (THREE - THREEBAR) / (2 * I)),
    ],
    ids=str,
)
def test_spellings(expression: sympy.Expr, expected: ClassFunction) -> None:
    assert class_function_from(expression, G) == expected


def test_weyl_measure_integrates_like_six_times_the_trivial_character() -> None:
    """|Δ|² is symmetric, and N! times the Haar density: its average is the constant term of |Δ|⁴/6."""
    delta = (X[0] - X[1]) * (X[1] - X[2]) * (X[2] - X[0])
    mirrored = (1 / X[0] - 1 / X[1]) * (1 / X[1] - 1 / X[2]) * (1 / X[2] - 1 / X[0])
    squared = sympy.expand((delta * mirrored) ** 2)
    constant = sum(
        term.as_coeff_Mul()[0]
        for term in squared.args
        if len({sympy.degree(term * (X[0] * X[1] * X[2]) ** 8, x) for x in X}) == 1
    )
    assert haar_integral(delta * mirrored, G) == constant / 6


def test_elementary_symmetric_functions_of_other_groups() -> None:
    group = SU(5)
    for k, word in enumerate((L, *symbols("E_2 E_3"), LSTAR), start=1):
        assert class_function_from(word, group) == group.fundamental.antisymmetric_power(k).character()
    assert class_function_from(conjugate(Symbol("E_2")), group) == class_function_from(Symbol("E_3"), group)
    assert class_function_from(conjugate(L), SU(2)) == SU(2).loop


def test_names_of_loops_of_another_group_are_parameters() -> None:
    assert class_function_from(Symbol("E_2") * L, G) == Symbol("E_2") * THREE


@pytest.mark.parametrize(
    "expression",
    [
        exp(L),
        exp(z * (L + LSTAR)),
        1 / L,
        1 / (1 + L),
        L**n,
        L ** sympy.Rational(1, 2),
        log(1 + z * L),
        tr(P, n),
        exp(X[0]),
    ],
    ids=str,
)
def test_what_does_not_terminate_says_so(expression: sympy.Expr) -> None:
    with pytest.raises(ConvergenceError, match=r"terminate|whole-number"):
        class_function_from(expression, G)
    with pytest.raises(ConvergenceError):
        haar_integral(expression, G)


@pytest.mark.parametrize(
    ("expression", "cause"),
    [
        (P, "matrix"),
        (z * P + L, "matrix"),
        (sin(L), "not polynomial"),
        (Abs(L), "not polynomial"),
        (Abs(L) ** 3, "not polynomial"),
        (sympy.Piecewise((L, z > 0), (1, True)), "not polynomial"),
        (sympy.Function("f")(L), "not polynomial"),
        (X[0], "symmetric in"),
        (X[0] + X[1], "x_2 and x_3"),
        (L + X[0] ** 2, "symmetric"),
        (sin(X[0]), "not polynomial"),
        (THETA[0], "periodic"),
        (THETA[0] * L, "periodic"),
        (exp(I * THETA[0] / 2), "whole-number"),
        (cos(THETA[0]), "symmetric"),
        (tr(Symbol("Q"), 2), "group element P"),
        (tr(P, 1, 2), "group element P"),
    ],
    ids=str,
)
def test_what_is_no_class_function_says_why(expression: sympy.Expr, cause: str) -> None:
    with pytest.raises(ClassFunctionError, match=cause):
        class_function_from(expression, G)


@pytest.mark.parametrize("foreign", ["L + 1", None, 1.5, [L], True, sympy.true, sympy.Matrix([L])])
def test_only_expressions_are_read(foreign: Any) -> None:
    with pytest.raises(ClassFunctionError, match="SymPy expression"):
        class_function_from(foreign, G)


@pytest.mark.parametrize("word", [chi(1), chi(1, 1, 1), chi(-1, 0), chi(p, 1), chi(sympy.Rational(1, 2), 0)])
def test_labels_of_characters_are_checked(word: sympy.Expr) -> None:
    with pytest.raises(LabelError):
        class_function_from(word, G)


def test_haar_integrals_with_symbolic_coefficients() -> None:
    assert haar_integral((1 + z * L * LSTAR) ** 2, G) == 1 + 2 * z + 2 * z**2
    assert haar_integral(L**3 * z + L, G) == z
    assert haar_integral(0 * L, G) == 0
