"""Truncated power series with exact coefficients, and their extension by one square root.

A pair of levels that starts degenerate is a ± σ b with σ = √d · ε^{v/2}: a and b are ordinary power
series in ε, and σ² = d ε^v, so that fractional powers need no arithmetic of their own.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

__all__ = ["Rooted", "add", "divided", "logarithm", "product", "square_root"]

Series = list[Any]
"""Coefficients of ε⁰, ε¹, …; all series of a calculation have the same length."""


def add(first: Series, second: Series) -> Series:
    """Sum."""
    return [a + b for a, b in zip(first, second, strict=True)]


def product(first: Series, second: Series) -> Series:
    """Product, truncated."""
    zero = first[0] * 0
    total = [zero] * len(first)
    for i, a in enumerate(first):
        if a != 0:
            for j in range(len(first) - i):
                if second[j] != 0:
                    total[i + j] = total[i + j] + a * second[j]
    return total


def divided(series: Series, number: Any) -> Series:
    """Every coefficient divided by a number."""
    return [a / number for a in series]


def shifted(series: Series, powers: int) -> Series:
    """ε^powers times the series, truncated."""
    zero = series[0] * 0
    return ([zero] * powers + series)[: len(series)]


def square_root(series: Series) -> Series:
    """√(1 + …), by Newton's recursion coefficient by coefficient."""
    root = [series[0]]
    for order in range(1, len(series)):
        rest = series[order] - sum((root[i] * root[order - i] for i in range(1, order)), series[0] * 0)
        root.append(rest / 2)
    return root


@dataclass(frozen=True, eq=False)
class Rooted:
    """plain + σ · rooted, σ² = d ε^v.

    Attributes
    ----------
    plain, rooted
        Power series.
    square, valuation
        d and v; d = 0 where there is no root.
    """

    plain: Series
    rooted: Series
    square: Any
    valuation: int

    def times(self, other: Rooted) -> Rooted:
        """Product."""
        both = product(self.rooted, other.rooted)
        back = shifted([self.square * a for a in both], self.valuation)
        plain = add(product(self.plain, other.plain), back)
        rooted = add(product(self.plain, other.rooted), product(self.rooted, other.plain))
        return Rooted(plain, rooted, self.square, self.valuation)

    def conjugated(self) -> Rooted:
        """The other branch."""
        return Rooted(self.plain, [-a for a in self.rooted], self.square, self.valuation)


def logarithm(argument: Rooted) -> Rooted:
    """ln(1 + x) for an x without constant term: Σ (−1)^{k+1} x^k / k."""
    power = argument
    plain, rooted = list(argument.plain), list(argument.rooted)
    # x starts at ε^{1/2} at the lowest
    for k in range(2, 2 * len(plain) + 1):
        power = power.times(argument)
        sign = 1 if k % 2 else -1
        plain = add(plain, [sign * a / k for a in power.plain])
        rooted = add(rooted, [sign * a / k for a in power.rooted])
    return Rooted(plain, rooted, argument.square, argument.valuation)
