"""How many digits of an inexact number may be shown, given the bound on its error."""

from __future__ import annotations

import math
from decimal import Decimal
from fractions import Fraction

__all__ = ["bracketed", "shown_with_error"]


def shown_with_error(value: float, error: float) -> tuple[str, str]:
    """A value and its error as text, so that the interval shown contains the interval given.

    The error is rounded up to one significant digit, counting what rounding the value itself adds;
    the value ends at the same digit.

    Parameters
    ----------
    value
        A finite number.
    error
        Bound of its absolute error, ≥ 0. Not finite or NaN means that nothing is known.

    Returns
    -------
    (str, str)
        Value and error; ``("?", "?")`` when nothing is known of the value.

    Examples
    --------
    >>> shown_with_error(4 / 3, 2.2e-7)
    ('1.3333333', '0.0000003')
    >>> shown_with_error(0.25, 0.0)
    ('0.25', '0')
    >>> shown_with_error(1.0, float("inf"))
    ('?', '?')
    """
    if not (math.isfinite(value) and math.isfinite(error)) or error < 0:
        return "?", "?"
    if error == 0:
        return _plain(Decimal(repr(value))), "0"
    exponent = Decimal(error).adjusted()
    while True:
        rounded = _rounded(value, exponent)
        margin = Fraction(error) + abs(Fraction(value) - Fraction(rounded))
        whole = math.ceil(margin / Fraction(Decimal(1).scaleb(exponent)))
        if whole < 10:
            return _plain(rounded), _plain(Decimal(whole).scaleb(exponent))
        exponent += 1


def bracketed(value: float, error: float) -> str:
    """The same in the trade's short form: ``1.3333333(3)`` is 1.3333333 ± 0.0000003.

    Examples
    --------
    >>> bracketed(4 / 3, 2.2e-7), bracketed(-123.4, 30.0), bracketed(0.25, 0.0)
    ('1.3333333(3)', '-120(40)', '0.25')
    """
    shown, margin = shown_with_error(value, error)
    if margin in ("?", "0"):
        return shown
    digits = margin.lstrip("0.")
    return f"{shown}({digits})"


def _rounded(value: float, exponent: int) -> Decimal:
    # Through fractions: a float times a power of ten would be rounded twice.
    return Decimal(round(Fraction(value) / Fraction(Decimal(1).scaleb(exponent)))).scaleb(exponent)


def _plain(number: Decimal) -> str:
    text = format(number, "f")
    return text[1:] if text.startswith("-") and not number else text
