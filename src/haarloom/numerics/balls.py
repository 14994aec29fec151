"""Exact expressions as balls: every number with a radius that is proven (python-flint, Arb).

F. Johansson, *IEEE Trans. Comput.* 66 (2017) 1281. Inputs enter as exact rationals or as intervals.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from fractions import Fraction
from functools import reduce
from operator import add, mul
from typing import Any

import flint
import sympy

from haarloom.exceptions import ConvergenceError, ParameterError

__all__ = [
    "Interval",
    "as_exact",
    "ball",
    "coefficient_balls",
    "exact_text",
    "expression_ball",
    "precision",
    "upper_float",
]


@dataclass(frozen=True)
class Interval:
    """All real numbers between two rationals, both ends included.

    Examples
    --------
    >>> Interval("0.30", "0.31").middle
    Fraction(61, 200)
    """

    lower: Fraction
    upper: Fraction

    def __init__(self, lower: Any, upper: Any) -> None:
        ends = tuple(_fraction("an end of the interval", end) for end in (lower, upper))
        if ends[0] > ends[1]:
            raise ParameterError(f"the interval [{lower}, {upper}] is empty: give the smaller end first.")
        object.__setattr__(self, "lower", ends[0])
        object.__setattr__(self, "upper", ends[1])

    @property
    def middle(self) -> Fraction:
        """The rational half-way."""
        return (self.lower + self.upper) / 2

    @property
    def width(self) -> Fraction:
        """Upper minus lower end."""
        return self.upper - self.lower

    def halves(self) -> tuple[Interval, Interval]:
        """The two intervals on either side of the middle."""
        return Interval(self.lower, self.middle), Interval(self.middle, self.upper)

    def __str__(self) -> str:
        return f"[{exact_text(self.lower)}, {exact_text(self.upper)}]"


Exact = Fraction | Interval | tuple[Fraction, Fraction]


def as_exact(name: str, given: Any) -> Fraction | Interval | sympy.Expr:
    """A parameter value without rounding.

    A float counts as the decimal number that Python prints for it: 0.3 is 3/10. A pair or an
    :class:`Interval` is an interval. A complex number becomes an exact SymPy number.

    Raises
    ------
    ParameterError
        If it is no finite number.
    """
    if isinstance(given, Interval):
        return given
    if isinstance(given, tuple):
        if len(given) != 2:
            raise ParameterError(f"{name} = {given!r} is no interval: give two ends, e.g. ('0.30', '0.31').")
        return Interval(*given)
    if isinstance(given, complex):
        parts = [
            sympy.Rational(*_fraction(name, part).as_integer_ratio()) for part in (given.real, given.imag)
        ]
        return parts[0] + sympy.I * parts[1]
    return _fraction(name, given)


def _fraction(name: str, given: Any) -> Fraction:
    try:
        if isinstance(given, Fraction | int | str) and not isinstance(given, bool):
            return Fraction(given)
        if isinstance(given, sympy.Rational):
            return Fraction(int(given.p), int(given.q))
        return Fraction(repr(float(given)))
    except (TypeError, ValueError, OverflowError, ZeroDivisionError):
        raise ParameterError(
            f"{name} = {given!r} is no exact number: give an int, a fraction, a decimal such as '0.3', "
            "or an interval ('0.30', '0.31')."
        ) from None


def exact_text(value: Any) -> str:
    """A rational as a short decimal where it is one, else as a quotient."""
    if not isinstance(value, Fraction):
        return str(value)
    denominator = value.denominator
    for prime in (2, 5):
        while denominator % prime == 0:
            denominator //= prime
    if denominator != 1 or value.denominator.bit_length() > 400:
        return f"{value.numerator}/{value.denominator}"
    digits = next(d for d in range(400) if (value * 10**d).denominator == 1)
    whole = str(abs(int(value * 10**digits))).rjust(digits + 1, "0")
    text = f"{whole[: len(whole) - digits]}.{whole[len(whole) - digits :]}" if digits else whole
    return f"-{text}" if value < 0 else text


@contextmanager
def precision(bits: int) -> Iterator[None]:
    """Arb's working precision inside the block, put back afterwards."""
    before = flint.ctx.prec
    flint.ctx.prec = bits
    try:
        yield
    finally:
        flint.ctx.prec = before


def ball(value: Fraction | Interval | sympy.Expr) -> Any:
    """An arb (acb for complex numbers) that contains the value."""
    if isinstance(value, Interval):
        return _rational(value.lower).union(_rational(value.upper))
    if isinstance(value, Fraction):
        return _rational(value)
    return expression_ball(value, {})


def _rational(value: Fraction) -> Any:
    return flint.arb(flint.fmpq(value.numerator, value.denominator))


def upper_float(number: Any) -> float:
    """A float above the absolute value of a ball."""
    # the summand keeps numbers below the range of floats from vanishing
    return float(abs(number).upper()) * (1 + 2.0**-50) + 1e-290


def coefficient_balls(expressions: Sequence[sympy.Expr], values: Mapping[str, Any]) -> list[Any]:
    """Balls that contain exact coefficients; rational values enter the expressions as they are."""
    exact = {
        sympy.Symbol(name): sympy.Rational(value.numerator, value.denominator)
        for name, value in values.items()
        if isinstance(value, Fraction)
    }
    numbers = {name: ball(value) for name, value in values.items()}
    return [expression_ball(expression.xreplace(exact), numbers) for expression in expressions]


def expression_ball(expression: sympy.Expr, values: Mapping[str, Any]) -> Any:
    """A ball that contains the expression, symbols replaced by balls.

    Parameters
    ----------
    values
        Balls by symbol name.

    Raises
    ------
    ConvergenceError
        If the expression holds a function without ball arithmetic here.
    """
    if expression.is_Symbol:
        return values[expression.name]
    if expression.is_Rational:
        return flint.arb(flint.fmpq(int(expression.p), int(expression.q)))
    if expression.is_Float:
        return flint.arb(str(expression))
    if expression is sympy.I:
        return flint.acb(0, 1)
    if expression is sympy.pi:
        return flint.arb.pi()
    if expression is sympy.E:
        return flint.arb.const_e()
    if expression.is_Pow:
        base, exponent = expression.args
        return _power(base, exponent, values)
    if expression.func.__name__ == "WilsonCoefficient":
        return _wilson_ball(expression)
    arguments = [expression_ball(argument, values) for argument in expression.args]
    if expression.is_Add:
        return reduce(add, arguments)
    if expression.is_Mul:
        return reduce(mul, arguments)
    return _function(expression, arguments)


def _power(base: sympy.Expr, exponent: sympy.Expr, values: Mapping[str, Any]) -> Any:
    inner = expression_ball(base, values)
    if exponent.is_Integer:
        return inner ** int(exponent)
    if exponent == sympy.Rational(1, 2):
        return inner.sqrt()
    return inner ** expression_ball(exponent, values)


_ELEMENTARY = {"exp", "log", "sin", "cos", "tan", "sinh", "cosh", "tanh"}


def _function(expression: sympy.Expr, arguments: list[Any]) -> Any:
    name = expression.func.__name__
    if name in _ELEMENTARY:
        return getattr(arguments[0], name)()
    if name == "besseli":
        return arguments[1].bessel_i(arguments[0])
    if name == "Abs":
        return abs(arguments[0])
    if name == "conjugate":
        return arguments[0].conjugate() if isinstance(arguments[0], flint.acb) else arguments[0]
    raise ConvergenceError(
        f"{name} has no ball arithmetic here, so that nothing is proven for {expression}: "
        "certification knows powers, exp, log, trigonometric and hyperbolic functions, and besseli."
    )


def _wilson_ball(expression: sympy.Expr) -> Any:
    """k_r of the Wilson action from integer determinants, with the relative error that they are good for."""
    from haarloom.actions.wilson_kernel import wilson_fraction

    n, beta = expression.args[:2]
    if not beta.is_Rational:
        raise ConvergenceError(
            "Wilson coefficients have ball arithmetic at single rational β: give a fraction or a decimal."
        )
    exact = beta / n
    value = wilson_fraction(expression.irrep, Fraction(int(exact.p), int(exact.q)), flint.ctx.prec + 4)
    found = _rational(value)
    return found + flint.arb(0, 1) * abs(found) * flint.arb(2) ** (-flint.ctx.prec)
