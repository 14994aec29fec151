"""The words in which SymPy expressions speak of class functions, beside L, L* and the eigenvalues.

``chi(a_1, …, a_{N−1})`` is a character, ``tr(P, n)`` is tr Pⁿ, ``P`` the group element. Symbols and functions are
plain SymPy ones and are recognised by name, so an expression built elsewhere means the same.
"""

from __future__ import annotations

from sympy import Expr, Function, Integer, S, Symbol

from haarloom.algebra.labels import Labels

__all__ = ["P", "character_word", "chi", "tr", "trace_word"]

chi = Function("chi")
tr = Function("tr")
P = Symbol("P")


def character_word(labels: Labels) -> Expr:
    """``chi(labels)``, and 1 for the trivial irrep.

    >>> character_word((1, 1)), character_word((0, 0))
    (chi(1, 1), 1)
    """
    return chi(*labels) if any(labels) else S.One


def trace_word(n: int) -> Expr:
    """``tr(P, n)``, the power sum of the eigenvalues; for n < 0 the complex conjugate of ``tr(P, -n)``.

    >>> trace_word(2)
    tr(P, 2)
    """
    return tr(P, Integer(n))
