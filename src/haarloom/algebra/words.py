"""The words in which SymPy expressions speak of class functions.

``chi(a_1, …, a_{N−1})`` is a character, ``tr(P, n)`` is tr Pⁿ, ``P`` the group element; the fundamental
loops are ``L``, ``E_2``, …, ``L^*`` (``Lstar`` is understood as well). Symbols and functions are plain
SymPy ones and are recognised by name, so an expression built elsewhere means the same.
"""

from __future__ import annotations

from sympy import Expr, Function, Integer, S, Symbol
from sympy.core.function import AppliedUndef

from haarloom.algebra.eigenphases import eigenphase_symbols
from haarloom.algebra.eigenvalues import eigenvalue_symbols
from haarloom.algebra.labels import Labels
from haarloom.algebra.loops import loop_symbols

__all__ = ["P", "character_word", "chi", "conjugate_word", "is_word", "tr", "trace_word", "words_in"]

chi = Function("chi")
tr = Function("tr")
P = Symbol("P")

_STARRED = ("L^*", "Lstar")


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


def is_word(part: Expr, n: int) -> bool:
    """Whether a symbol or an applied function is a word of SU(n): a loop, a trace or a character."""
    if isinstance(part, AppliedUndef):
        return part.func.__name__ in ("tr", "chi")
    return isinstance(part, Symbol) and (part in loop_symbols(n) or part.name in _STARRED)


def words_in(expression: Expr, n: int) -> list[Expr]:
    """The words of SU(n) in an expression, in a fixed order."""
    return sorted((atom for atom in expression.atoms(Symbol, AppliedUndef) if is_word(atom, n)), key=str)


def conjugate_word(part: Expr, n: int) -> Expr | None:
    """The complex conjugate of a word, an eigenvalue or an eigenphase of SU(n); None for anything else."""
    if part in eigenvalue_symbols(n):
        return 1 / part
    if part in eigenphase_symbols(n):
        return part
    if not is_word(part, n):
        return None
    if isinstance(part, AppliedUndef):
        if part.func.__name__ == "chi":
            return part.func(*reversed(part.args))
        return part.func(part.args[0], -(part.args[1] if len(part.args) > 1 else 1))
    symbols = loop_symbols(n)
    return symbols[::-1][symbols.index(part)] if part in symbols else symbols[0]
