"""Coefficients of class functions: exact SymPy expressions in a normal form that shows when they vanish."""

from __future__ import annotations

from fractions import Fraction
from math import isfinite
from numbers import Integral
from typing import Any

from sympy import Add, Expr, I, Integer, Pow, Rational, S, Symbol, cancel, expand

from haarloom.exceptions import ClassFunctionError

__all__ = ["as_coefficient", "negated", "normal_form", "total"]


def as_coefficient(value: Any) -> Expr:
    """Turn a number, a symbol's name or a SymPy expression into an exact coefficient.

    A Python float counts as the decimal it prints as (0.3 becomes 3/10), so that nothing inexact enters by
    accident.

    Raises
    ------
    ClassFunctionError
        When the value is none of these.
    """
    if isinstance(value, Expr):
        return _finite(value)
    if isinstance(value, bool):
        raise ClassFunctionError(f"coefficient {value!r} given; write 1 or 0.")
    if isinstance(value, Integral):
        return Integer(int(value))
    if isinstance(value, Fraction):
        return Rational(value.numerator, value.denominator)
    if isinstance(value, str):
        if value.isidentifier():
            return Symbol(value)
        raise ClassFunctionError(
            f"coefficient {value!r} given as text; only a symbol's name is taken, such as 'z'."
        )
    return _exact_decimal(value)


def _exact_decimal(value: Any) -> Expr:
    try:
        number = complex(value)
        if not (isfinite(number.real) and isfinite(number.imag)):
            raise ValueError
        real, imaginary = Rational(repr(number.real)), Rational(repr(number.imag))
    except (TypeError, ValueError):
        raise ClassFunctionError(
            f"coefficient {str(value)[:60]!r} of type {type(value).__name__} given; "
            "use a finite number, a SymPy expression or a symbol's name."
        ) from None
    return real + I * imaginary


def _finite(value: Expr) -> Expr:
    if value.has(S.NaN, S.Infinity, S.NegativeInfinity, S.ComplexInfinity):
        raise ClassFunctionError(f"coefficient {value} given; coefficients must be finite.")
    return value


def normal_form(value: Expr) -> Expr:
    """Expanded form, in which a vanishing polynomial is 0; quotients become one fraction in lowest terms."""
    if value.is_Atom or not value.has(Add):
        return value
    expanded = expand(value)
    return cancel(expanded) if _has_sum_below(expanded) else expanded


def total(terms: list[Expr]) -> Expr:
    """Sum of coefficients in normal form, in normal form; only quotients need work beyond collecting."""
    if len(terms) == 1:
        return terms[0]
    collected = Add(*terms)
    return normal_form(collected) if _has_sum_below(collected) else collected


def negated(value: Expr) -> Expr:
    """Minus a coefficient in normal form, in normal form, term by term."""
    return Add(*(-term for term in value.args)) if value.is_Add else -value


def _has_sum_below(value: Expr) -> bool:
    """Whether a denominator is a sum: then terms can cancel that do not look alike."""
    return any(power.base.is_Add and power.exp.is_negative for power in value.atoms(Pow))
