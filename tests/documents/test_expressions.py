"""The grammar against SymPy's own arithmetic and Python's own precedence; and what it must refuse."""

from __future__ import annotations

import time
from fractions import Fraction

import pytest
import sympy
from hypothesis import given
from hypothesis import strategies as st

from haarloom.documents.expressions import format_expression, parse_expression
from haarloom.exceptions import ExpressionError

x, z, t = sympy.symbols("x z t")


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("0.3", sympy.Rational(3, 10)),
        (".5e1", sympy.Integer(5)),
        ("1e-3", sympy.Rational(1, 1000)),
        ("12.", sympy.Integer(12)),
        ("-2^2", sympy.Integer(-4)),
        ("2^3^2", sympy.Integer(512)),
        ("2**-1", sympy.Rational(1, 2)),
        ("x - z - t", x - z - t),
        ("x/z/t", x / (z * t)),
        ("2*-x", -2 * x),
        ("--x", x),
        ("x^-z^2", x ** (-(z**2))),
        ("sqrt(8)/4", sympy.sqrt(2) / 2),
        ("exp(-2*t/3)*cosh(x)", sympy.exp(-2 * t / 3) * sympy.cosh(x)),
        ("E^(I*pi)", sympy.Integer(-1)),
        ("sin(pi/6) + cos(0) + log(1)", sympy.Rational(3, 2)),
        ("conj(I*z)", -sympy.I * sympy.conjugate(z)),
        ("β*μ_2", sympy.Symbol("β") * sympy.Symbol("μ_2")),
    ],
)
def test_value(text: str, value: sympy.Expr) -> None:
    assert parse_expression(text) == value


@pytest.mark.parametrize(
    ("text", "place", "complaint"),
    [
        ("", 0, "not the end"),
        ("z + * 2", 4, "not '\\*'"),
        ("2z", 1, "operator is missing"),
        ("2*(t + 1", 2, "never closed"),
        ("(t + 1 2)", 7, "is needed here"),
        ("t)", 1, "no '\\('"),
        ("1, 2", 1, "no '\\('"),
        ("f(t)", 0, "no known function"),
        ("z(t)", 0, "write a product"),
        ("sqrt", 0, "in parentheses"),
        ("exp(1, 2)", 0, "one argument"),
        ("1/0", 1, "zero"),
        ("0^-1", 1, "zero"),
        ("log(0)", 0, "finite"),
        ("t − 1", 2, "write '-'"),
        ("t.real", 1, "no meaning"),
        ("__import__('os')", 11, "no meaning"),
        ("x = 1", 2, "no meaning"),
        ("x[0]", 1, "write '\\('"),
        ("nan(1)", 0, "no known function"),
    ],
)
def test_refusal_points_at_the_place(text: str, place: int, complaint: str) -> None:
    with pytest.raises(ExpressionError, match=complaint) as refused:
        parse_expression(text)
    line, caret = str(refused.value).split("\n")[1:]
    assert caret.index("^") == 4 + place
    assert line == f"    {text}"


@pytest.mark.parametrize(
    "text",
    [
        "9^9^9",
        "((9^999)^999)^999",
        "1e301",
        "exp(exp(exp(9)))",
        "sqrt(exp(10^7) - 1)",
        "2^(10^300)",
        "(" * 10_000,
        "(" * 60 + "1" + ")" * 60,
        "-" * 500 + "1",
        "+".join(["1"] * 5000),
        "1" * 301,
    ],
)
def test_hostile_text_is_refused_at_once(text: str) -> None:
    start = time.perf_counter()
    with pytest.raises(ExpressionError):
        parse_expression(text)
    assert time.perf_counter() - start < 2  # the point is that it ends: these would fill the memory


def test_long_sum_is_no_deep_recursion() -> None:
    assert parse_expression("+".join(["x"] * 1900)) == 1900 * x


def test_symbols_can_be_limited_and_near_names_are_offered() -> None:
    assert parse_expression("z + t", ["z", "t"]) == z + t
    with pytest.raises(
        ExpressionError, match=r"'zbat' is not known here \(known: t, zbar\); did you mean 'zbar'"
    ):
        parse_expression("2*zbat", ["t", "zbar"])


@pytest.mark.parametrize("given", [None, 3, b"x", ["x"]])
def test_only_text_is_read(given: object) -> None:
    with pytest.raises(ExpressionError, match="put it in quotes"):
        parse_expression(given)  # type: ignore[arg-type]


@given(st.fractions(), st.fractions(), st.fractions().filter(bool), st.integers(0, 6))
def test_arithmetic_is_exact(a: Fraction, b: Fraction, c: Fraction, n: int) -> None:
    """Against Python's fractions, another implementation of exact arithmetic."""
    text = f"(({a}) - ({b}))^{n}/({c}) + ({a})*({b})"
    assert parse_expression(text) == sympy.Rational((a - b) ** n / c + a * b)


_LEAVES = st.sampled_from(
    [x, z, t, sympy.pi, sympy.I, sympy.Rational(-3, 7), sympy.Integer(2), sympy.sqrt(3)]
)
_EXPRESSIONS = st.recursive(
    _LEAVES,
    lambda inner: st.one_of(
        st.tuples(inner, inner).map(lambda pair: pair[0] + pair[1]),
        st.tuples(inner, inner).map(lambda pair: pair[0] * pair[1]),
        st.tuples(inner, st.integers(1, 3)).map(lambda pair: pair[0] ** pair[1]),
        inner.map(sympy.cos),
    ),
    max_leaves=8,
)


@given(_EXPRESSIONS)
def test_what_is_written_reads_back(value: sympy.Expr) -> None:
    assert parse_expression(format_expression(value)) == value


@pytest.mark.parametrize("value", [sympy.Float(0.3) * x, sympy.gamma(x), sympy.Symbol("a b")])
def test_what_cannot_be_read_back_is_not_written(value: sympy.Expr) -> None:
    with pytest.raises(ExpressionError):
        format_expression(value)
