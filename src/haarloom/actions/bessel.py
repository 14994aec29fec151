"""Modified Bessel functions of integer order as integers of any length.

Determinants of I_ν with neighbouring orders cancel ~ x^{−N(N−1)/2} of their size, so I_ν is needed
to more digits than a float has. Integers give them at little cost.
"""

from __future__ import annotations

import math
from fractions import Fraction
from functools import lru_cache

__all__ = ["bessel_integers", "margin_of"]


def bessel_integers(x: Fraction, order: int, bits: int) -> list[int]:
    """Integers proportional to I_0(x), …, I_order(x), each to relative accuracy 2^−bits.

    Miller's backward recurrence I_{ν−1} = I_{ν+1} + (2ν/x) I_ν (NIST DLMF §10.29, §3.6): every term
    is positive, so rounding down costs one unit in the last place a step and nothing is lost.

    Parameters
    ----------
    x : Fraction
        Argument ≥ 0.
    order : int
        Highest order returned.
    bits : int
        Working accuracy in bits.
    """
    if x == 0:
        return [1 << bits, *[0] * order]
    start = _starting_order(float(x), order, bits)
    guard = bits + 2 + start.bit_length()
    upper, current = 0, 1 << guard
    table = [0] * (start + 1)
    table[start] = current
    numerator, denominator = x.numerator, 2 * x.denominator
    for nu in range(start, 0, -1):
        upper, current = current, upper + (nu * denominator * current) // numerator
        table[nu - 1] = current
    return table[: order + 1]


def _starting_order(x: float, order: int, bits: int) -> int:
    """Where the recurrence may start: the forgotten solution has decayed by 2^−bits at `order`.

    Uses the bound I_{ν+1}/I_ν ≤ x / (ν + ½ + √((ν + ½)² + x²)) (D. E. Amos, Math. Comp. 28 (1974) 239).
    """
    decay, nu = 0.0, order
    while decay < bits + 4:
        ratio = x / (nu + 0.5 + math.hypot(nu + 0.5, x))
        decay -= 2 * math.log2(ratio) if ratio > 0 else -2000.0
        nu += 1
    return nu + 1


@lru_cache(maxsize=4096)
def margin_of(x: float, bits: int) -> int:
    """Smallest m with I_m(x)/I_0(x) ≤ 2^−bits, by the bound of Amos on successive ratios."""
    decay, nu = 0.0, 0
    while decay < bits and x > 0:
        decay -= math.log2(x / (nu + 0.5 + math.hypot(nu + 0.5, x)))
        nu += 1
    return nu
