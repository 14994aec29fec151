"""The four words for class functions, and the two meanings of the star after L."""

from __future__ import annotations

import pytest
import sympy

from haarloom.algebra.expressions import class_function_from
from haarloom.algebra.group import SU
from haarloom.documents.class_expressions import parse_class_expression
from haarloom.exceptions import ExpressionError

L, M, P, z, h = sympy.Symbol("L"), sympy.Symbol("L^*"), *sympy.symbols("P z h")
tr, chi = sympy.Function("tr"), sympy.Function("chi")


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("1 + z*L + z^2*L* + z^3", 1 + z * L + z**2 * M + z**3),
        ("1+z*L+z^2*L*+z^3", 1 + z * L + z**2 * M + z**3),
        ("L*z", L * z),
        ("L * z", L * z),
        ("L *z", L * z),
        ("L*(1 + z)", L * (1 + z)),
        ("L*2", 2 * L),
        ("L*L", L**2),
        ("L* * L", L * M),
        ("L*^2", M**2),
        ("L**2", L**2),
        ("(L*)", M),
        ("L*/2 - 1", M / 2 - 1),
        ("L* - 2", M - 2),
        ("exp(h*(L + L*))", sympy.exp(h * (L + M))),
        ("conj(L)", sympy.conjugate(L)),
        ("abs(L)^2 + re(L)", sympy.Abs(L) ** 2 + sympy.re(L)),
        ("tr(P, 3) - chi(2, 0)/2", tr(P, 3) - chi(2, 0) / 2),
    ],
)
def test_value(text: str, value: sympy.Expr) -> None:
    assert parse_class_expression(text) == value


@pytest.mark.parametrize(
    ("text", "same"),
    [
        ("conj(L)*conj(L*)", "L*L*"),
        ("conj(I*chi(2, 0))", "-I*chi(0, 2)"),
        ("conj(tr(P, 2))", "tr(P, -2)"),
        ("abs(L)^2 - 1", "chi(1, 1)"),
        ("tr(P, 2)", "L^2 - 2*L*"),
    ],
)
def test_algebra_understands_what_was_read(text: str, same: str) -> None:
    G = SU(3)
    read, other = (class_function_from(parse_class_expression(words), G) for words in (text, same))
    assert read == other


@pytest.mark.parametrize(
    ("text", "complaint"),
    [
        ("L*-2", "could be L"),
        ("L* z", "could be L"),
        ("L***2", "is needed here"),
        ("tr(P)", "tr takes P"),
        ("tr(z, 2)", "tr takes P"),
        ("tr(P, z)", "tr takes P"),
        ("chi(-1, 0)", "Dynkin labels"),
        ("chi(1/2, 0)", "Dynkin labels"),
        ("chi", "in parentheses"),
        ("L + y", "not known here"),
    ],
)
def test_refusal(text: str, complaint: str) -> None:
    with pytest.raises(ExpressionError, match=complaint):
        parse_class_expression(text, allowed_symbols=["z", "P"])
