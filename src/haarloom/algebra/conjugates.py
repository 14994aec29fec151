"""Complex conjugation inside expressions: conjugate, re, im and |…|² written in the words themselves."""

from __future__ import annotations

from sympy import Abs, Expr, I, Pow, S, Symbol, conjugate, im, re
from sympy.core.function import AppliedUndef

from haarloom.algebra.words import conjugate_word

__all__ = ["without_conjugates"]


def without_conjugates(expression: Expr, n: int) -> Expr:
    """Replace real and imaginary parts and even powers of moduli of words by the words and their conjugates.

    >>> from sympy.abc import L, z
    >>> without_conjugates(Abs(L) ** 2 + z * re(L), 3)
    L*L^* + z*(L/2 + L^*/2)
    """

    def speaks(part: Expr) -> bool:
        return any(conjugate_word(atom, n) is not None for atom in part.atoms(Symbol, AppliedUndef))

    opened = expression.replace(lambda part: _opens(part) and speaks(part), _opened)
    return opened.replace(
        lambda part: isinstance(part, conjugate) and conjugate_word(part.args[0], n) is not None,
        lambda part: conjugate_word(part.args[0], n),
    )


def _opens(part: Expr) -> bool:
    if isinstance(part, Pow):
        return bool(isinstance(part.base, Abs) and part.exp.is_even and part.exp.is_positive)
    return isinstance(part, (re, im))


def _opened(part: Expr) -> Expr:
    if isinstance(part, Pow):
        inside = part.base.args[0]
        return (inside * conjugate(inside)) ** (part.exp / 2)
    scaled = part.args[0] * (S.Half if isinstance(part, re) else 1 / (2 * I))
    return scaled + conjugate(scaled)
