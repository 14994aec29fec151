"""Coefficients of multiplicative site weights to any number of digits."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction

import sympy
from sympy import Expr

from haarloom.actions.multiplicative import Factor
from haarloom.actions.toeplitz import toeplitz_integers
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ConvergenceError

__all__ = ["digits_of"]

_MOST_BITS = 40_000


def digits_of(
    factors: Sequence[Factor], irrep: Irrep, values: Mapping[str, Expr], digits: int
) -> Expr | None:
    """w_c rounded to the digits asked for, or None if an argument is not real.

    The determinants are summed with more and more bits and orders until two rounds agree to two digits more
    than asked for.

    Raises
    ------
    ConvergenceError
        If they do not agree within 40,000 bits.
    """
    numbers = []
    for factor in factors:
        value = factor.argument.subs({sympy.Symbol(name): number for name, number in values.items()})
        exact = sympy.nsimplify(value, rational=True) if value.is_Float else value.evalf(digits + 30)
        if not exact.is_real:
            return None
        numbers.append(Fraction(*sympy.Rational(exact).as_numer_denom()))
    bits = 96 + int(3.33 * digits) + _smallness(numbers, irrep)
    before: sympy.Rational | None = None
    while bits <= _MOST_BITS:
        result = _rounded_sum(factors, numbers, irrep, bits)
        if before is not None:
            if abs(result - before) <= abs(result) * sympy.Rational(10) ** (-digits - 2):
                return result.evalf(digits)
            if max(abs(result), abs(before)) < sympy.Rational(1, 1 << (bits // 2)):
                return sympy.S.Zero
        before, bits = result, bits + bits // 2
    raise ConvergenceError(
        f"The coefficient of {irrep.name} does not settle to {digits} digits within {_MOST_BITS:,} bits; "
        "move boson fugacities away from 1, or ask for fewer digits."
    )


def _smallness(numbers: Sequence[Fraction], irrep: Irrep) -> int:
    """Bits below 1 at which a coefficient that does not vanish must have shown itself.

    It takes at most N factors of the smallest argument to build one box of the diagram.
    """
    least = min((abs(number) for number in numbers if number), default=Fraction(1))
    per_box = max(0, least.denominator.bit_length() - least.numerator.bit_length() + 1)
    return 2 * per_box * irrep.group.n * sum(irrep.labels)


def _rounded_sum(
    factors: Sequence[Factor], numbers: Sequence[Fraction], irrep: Irrep, bits: int
) -> sympy.Rational:
    n = irrep.group.n
    sides = {
        sense: [(f, a) for f, a in zip(factors, numbers, strict=True) if f.direction == sense]
        for sense in (1, -1)
    }
    forward, backward = (_one_sided(sides[sense], bits) for sense in (1, -1))
    reach = irrep.partition[0] + max(len(forward), len(backward)) + 2 * n
    phi = [_laurent(forward, backward, order, bits) for order in range(-reach - n, reach + n + 1)]
    shifts = range(-irrep.partition[0] - len(backward) - n, len(forward) + n + 1)
    total, _ = toeplitz_integers(irrep.partition, phi, reach + n, shifts)
    return sympy.Rational(total, 1 << (n * bits))


def _laurent(forward: Sequence[int], backward: Sequence[int], order: int, bits: int) -> int:
    start = max(0, -order)
    pairs = zip(forward[order + start :], backward[start:], strict=False)
    return sum(a * b for a, b in pairs) >> bits


def _one_sided(side: Sequence[tuple[Factor, Fraction]], bits: int) -> list[int]:
    """Fixed-point series of the factors in one direction, until it has vanished."""
    order = 16
    while True:
        series = [1 << bits, *[0] * order]
        for factor, argument in side:
            series = _product(series, _series(factor, argument, order, bits), bits)
        last = max((k for k, value in enumerate(series) if abs(value) > 1), default=0)
        if last < order // 2 or order > bits * 40:
            return series[: last + 1]
        order *= 2


def _product(a: Sequence[int], b: Sequence[int], bits: int) -> list[int]:
    return [sum(x * y for x, y in zip(a[: k + 1], b[k::-1], strict=True)) >> bits for k in range(len(a))]


def _series(factor: Factor, argument: Fraction, order: int, bits: int) -> list[int]:
    series, n = [1 << bits], factor.copies
    for k in range(1, order + 1):
        weight = {"fermion": n - k + 1, "boson": n + k - 1, "field": 1}[factor.form]
        series.append(series[-1] * argument.numerator * weight // (argument.denominator * k))
    return series
