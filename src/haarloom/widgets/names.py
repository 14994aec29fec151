"""Irreps, parameters and errors as short Unicode text, for labels that no MathJax reaches."""

from __future__ import annotations

from sympy.printing.pretty.pretty_symbology import pretty_symbol

__all__ = ["irrep_face", "parameter_face", "short_error"]

_OVERLINE = "\N{COMBINING OVERLINE}"


def irrep_face(name: str) -> str:
    """``"15'bar"`` as digits with an overline and a prime sign; other names as they are.

    Examples
    --------
    >>> irrep_face("10bar") == "1\\N{COMBINING OVERLINE}0\\N{COMBINING OVERLINE}"
    True
    """
    stem = name.removesuffix("bar")
    if stem == name:
        return name.replace("'", "\N{PRIME}")
    barred = "".join(letter + _OVERLINE if letter.isalnum() else letter for letter in stem)
    return barred.replace("'", "\N{PRIME}")


def parameter_face(name: str) -> str:
    """``"beta"`` as β, ``"zbar"`` as z with an overline.

    Examples
    --------
    >>> parameter_face("beta")
    'β'
    """
    # lambda is a keyword of Python, so that lam stands for it
    return "λ" if name == "lam" else str(pretty_symbol(name))


def short_error(error: float) -> str:
    """One digit and a power of ten; an error of zero is just 0, an unknown one ∞."""
    if error == 0:
        return "0"
    return f"{error:.0e}" if error < float("inf") else "∞"
