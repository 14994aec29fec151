"""Class functions of P from text: the grammar of expressions with the words for class functions.

``L`` is tr P; ``L*`` or ``conj(L)`` is tr P†; ``tr(P, n)`` is tr Pⁿ; ``chi(p, q, …)`` is the character
with these Dynkin labels. The result is an ordinary SymPy expression in the spellings of
:mod:`haarloom.algebra.words`; :func:`haarloom.algebra.expressions.class_function_from` turns it into a
class function.
"""

from __future__ import annotations

from collections.abc import Iterable

import sympy

from haarloom.algebra.words import P, chi, tr
from haarloom.documents.expressions import symbol_reader
from haarloom.documents.grammar import CallReader, Reader
from haarloom.documents.tokens import Token

__all__ = ["parse_class_expression"]

LOOP = sympy.Symbol("L")
LOOP_CONJUGATE = sympy.Symbol("L^*")
_HIGHEST = 1000


def parse_class_expression(text: str, allowed_symbols: Iterable[str] | None = None) -> sympy.Expr:
    """Read a class function of P.

    ``L*z`` is a product and ``L*`` before a closing sign, an operator or the end is tr P†; where both
    readings are near (``L*-2``, ``L* z``) the text is refused rather than guessed at.

    Parameters
    ----------
    text
        For example ``"1 + z*L + z^2*L* + z^3"`` or ``"h*(L + conj(L))/2 + chi(1, 1)"``.
    allowed_symbols
        Names of parameters that may occur beside the words; any when left out.

    Raises
    ------
    ExpressionError
        As :func:`haarloom.documents.expressions.parse_expression`, and for wrong arguments of tr and chi.

    Examples
    --------
    >>> parse_class_expression("1 + z*L + z^2*L* + z^3")
    L*z + L^**z**2 + z**3 + 1
    >>> parse_class_expression("tr(P, 2) - chi(2, 0)")
    -chi(2, 0) + tr(P, 2)
    """
    parameter = symbol_reader(allowed_symbols)

    def symbol(reader: Reader, token: Token) -> sympy.Expr:
        if token.text != "L":
            return parameter(reader, token)
        return LOOP_CONJUGATE if _star_belongs_to_loop(reader) else LOOP

    return Reader(text, symbol, _WORDS).whole()


def _star_belongs_to_loop(reader: Reader) -> bool:
    """Whether ``L`` is followed by the star of L*; steps over that star."""
    star = reader.here
    if star.text != "*" or star.spaced:
        return False
    after = reader.tokens[reader.place + 1]
    operand = after.kind in ("number", "name") or after.text == "("
    glued_minus = after.text == "-" and not after.spaced
    if (operand and after.spaced) or glued_minus:
        raise reader.refuse(star, "this could be L* or a product; write conj(L), or 'L * …' with spaces")
    if operand:
        return False
    reader.take()
    return True


def _trace(reader: Reader, token: Token, arguments: list[sympy.Expr]) -> sympy.Expr:
    if len(arguments) != 2 or arguments[0] != P or not _is_whole(arguments[1]):
        raise reader.refuse(token, f"tr takes P and a whole number up to ±{_HIGHEST}, as in tr(P, 2)")
    return tr(P, arguments[1])


def _character(reader: Reader, token: Token, arguments: list[sympy.Expr]) -> sympy.Expr:
    if not all(_is_whole(label) and label >= 0 for label in arguments):
        raise reader.refuse(token, f"chi takes Dynkin labels, whole numbers from 0 to {_HIGHEST}: chi(1, 1)")
    return chi(*arguments)


def _is_whole(value: sympy.Expr) -> bool:
    return bool(value.is_Integer and abs(value) <= _HIGHEST)


_WORDS: dict[str, CallReader] = {"tr": _trace, "chi": _character}
