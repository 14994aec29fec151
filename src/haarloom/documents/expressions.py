"""Exact expressions from text, by a grammar of our own: nothing that is typed is ever run as code.

::

    sum      = product { ("+" | "-") product }
    product  = signed { ("*" | "/") signed }
    signed   = ("+" | "-") signed | power
    power    = atom [ ("^" | "**") signed ]                groups to the right, binds tighter than a sign
    atom     = number | name | name "(" sum { "," sum } ")" | "(" sum ")"

Numbers are exact rationals, decimals included: ``0.3`` is 3/10. Known words are the constants
``pi``, ``I``, ``E`` and the functions ``sqrt exp log sin cos sinh cosh conj re im abs``; any
other name is a plain symbol.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable

import sympy

from haarloom.documents.grammar import CONSTANTS, FUNCTIONS, Reader, SymbolReader
from haarloom.documents.tokens import Token
from haarloom.exceptions import ExpressionError

__all__ = ["format_expression", "parse_expression", "symbol_reader"]


def parse_expression(text: str, allowed_symbols: Iterable[str] | None = None) -> sympy.Expr:
    """Read an exact expression.

    Parameters
    ----------
    text
        For example ``"3*t/2"``, ``"exp(-0.3)*cos(mu)"``, ``"(1 + I)/sqrt(2)"``.
    allowed_symbols
        Names that may occur; any name when left out.

    Returns
    -------
    sympy.Expr
        Without floating-point numbers; symbols are plain ``sympy.Symbol`` without assumptions.

    Raises
    ------
    ExpressionError
        For anything the grammar does not know, with a caret below the place; for names that are not
        allowed; for expressions too long, too deep or too large.

    Examples
    --------
    >>> parse_expression("0.3*z^2 - sqrt(8)/4")
    3*z**2/10 - sqrt(2)/2
    >>> parse_expression("2t")
    Traceback (most recent call last):
    ...
    haarloom.exceptions.ExpressionError: an operator is missing before 't'; ... (at character 2)
        2t
         ^
    """
    return Reader(text, symbol_reader(allowed_symbols)).whole()


def symbol_reader(allowed_symbols: Iterable[str] | None) -> SymbolReader:
    """What turns a name into a plain symbol, or refuses it."""
    allowed = None if allowed_symbols is None else tuple(allowed_symbols)

    def symbol(reader: Reader, token: Token) -> sympy.Expr:
        if allowed is not None and token.text not in allowed:
            raise reader.refuse(token, _not_allowed(token.text, allowed))
        return sympy.Symbol(token.text)

    return symbol


def _not_allowed(name: str, allowed: tuple[str, ...]) -> str:
    near = difflib.get_close_matches(name, [*allowed, *CONSTANTS, *FUNCTIONS], n=1)
    listed = ", ".join(sorted(allowed)) or "none"
    hint = f"; did you mean {near[0]!r}?" if near else ""
    return f"the symbol {name!r} is not known here (known: {listed}){hint}"


def format_expression(value: sympy.Expr) -> str:
    """Text that :func:`parse_expression` reads back to the same expression.

    Raises
    ------
    ExpressionError
        If the expression holds a floating-point number or a function that the grammar does not have.

    Examples
    --------
    >>> format_expression(sympy.Rational(3, 10) * sympy.Symbol("z") ** 2)
    '3*z**2/10'
    """
    exact = sympy.sympify(value)
    text = str(exact)
    if exact.has(sympy.Float):
        raise ExpressionError(f"{text} holds a floating-point number: give it as an exact one, e.g. '3/10'.")
    if parse_expression(text) != exact:
        raise ExpressionError(f"{text} cannot be written as text: it does not read back as itself.")
    return text
