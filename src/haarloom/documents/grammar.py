"""The grammar of expressions: a precedence parser that builds an exact SymPy value while it reads.

Building while reading keeps the depth of recursion equal to the depth of parentheses, which is
bounded; so are the sizes of exact powers, which could otherwise fill the memory from ten characters.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

import sympy

from haarloom.documents.tokens import Token, refusal, tokenize
from haarloom.exceptions import ExpressionError

__all__ = ["CONSTANTS", "FUNCTIONS", "CallReader", "Reader", "SymbolReader"]

_DEEPEST = 50
_LARGEST_POWER = 1000
_MOST_BITS = 10_000
_LARGEST_EXPONENTIAL = 10**6
_SUM, _PRODUCT, _SIGN, _POWER = 10, 20, 30, 40
_BINDING = {"+": _SUM, "-": _SUM, "*": _PRODUCT, "/": _PRODUCT, "^": _POWER, "**": _POWER}

CONSTANTS: dict[str, sympy.Expr] = {"pi": sympy.pi, "I": sympy.I, "E": sympy.E}
FUNCTIONS: dict[str, Callable[[sympy.Expr], sympy.Expr]] = {
    "sqrt": sympy.sqrt,
    "exp": sympy.exp,
    "log": sympy.log,
    "sin": sympy.sin,
    "cos": sympy.cos,
    "sinh": sympy.sinh,
    "cosh": sympy.cosh,
    "conj": sympy.conjugate,
    "conjugate": sympy.conjugate,
    "re": sympy.re,
    "im": sympy.im,
    "abs": sympy.Abs,
    "Abs": sympy.Abs,
}

SymbolReader = Callable[["Reader", Token], sympy.Expr]
CallReader = Callable[["Reader", Token, list[sympy.Expr]], sympy.Expr]


@dataclass
class Reader:
    """One pass over one text.

    ``symbol`` gives the value of a name that is no constant, ``calls`` the words beyond
    :data:`FUNCTIONS` that take arguments in parentheses.
    """

    text: str
    symbol: SymbolReader
    calls: Mapping[str, CallReader] = field(default_factory=dict)
    tokens: list[Token] = field(init=False)
    place: int = field(init=False, default=0)
    depth: int = field(init=False, default=0)

    def __post_init__(self) -> None:
        self.tokens = tokenize(self.text)

    @property
    def here(self) -> Token:
        """The token that is read next."""
        return self.tokens[self.place]

    def whole(self) -> sympy.Expr:
        """The value of the whole text."""
        value = self._binding_tighter_than(0)
        if self.here.kind != "end":
            raise self.refuse(self.here, self._misplaced(self.here))
        return value

    def take(self) -> Token:
        """The next token, and step over it."""
        token = self.here
        self.place = min(self.place + 1, len(self.tokens) - 1)
        return token

    def refuse(self, token: Token, complaint: str) -> ExpressionError:
        """The error that points at ``token``."""
        return refusal(self.text, token.start, complaint)

    def _misplaced(self, token: Token) -> str:
        if token.text in (")", ","):
            return f"{token.text!r} has no '(' that it could belong to"
        return f"an operator is missing before {token.text!r}; write a product with '*'"

    def _binding_tighter_than(self, level: int) -> sympy.Expr:
        self.depth += 1
        if self.depth > _DEEPEST:
            raise self.refuse(self.here, f"nested more than {_DEEPEST} deep")
        value = self._signed()
        while self.here.kind == "sign" and _BINDING.get(self.here.text, -1) > level:
            sign = self.take()
            # Equal precedence groups to the left, powers to the right: 2^3^2 = 2^9, and 2^-1 is fine.
            right = self._binding_tighter_than(_SIGN - 1 if sign.text in ("^", "**") else _BINDING[sign.text])
            value = self._joined(sign, value, right)
        self.depth -= 1
        return value

    def _signed(self) -> sympy.Expr:
        if self.here.text in ("+", "-"):
            negative = self.take().text == "-"
            value = self._binding_tighter_than(_SIGN)
            return -value if negative else value
        return self._atom()

    def _atom(self) -> sympy.Expr:
        token = self.take()
        if token.kind == "number":
            return sympy.Rational(token.text)
        if token.kind == "name":
            return self._named(token)
        if token.text == "(":
            return self._closed(token, self._binding_tighter_than(0))
        found = "the end" if token.kind == "end" else repr(token.text)
        raise self.refuse(token, f"a number, a name or '(' is needed here, not {found}")

    def _closed(self, opening: Token, value: sympy.Expr) -> sympy.Expr:
        if self.here.text != ")":
            if self.here.kind == "end":
                raise self.refuse(opening, "this '(' is never closed")
            raise self.refuse(self.here, f"')' or an operator is needed here, not {self.here.text!r}")
        self.take()
        return value

    def _named(self, token: Token) -> sympy.Expr:
        known = token.text in FUNCTIONS or token.text in self.calls
        if self.here.text == "(":
            if not known:
                words = ", ".join(sorted({*FUNCTIONS, *self.calls}))
                raise self.refuse(
                    token, f"{token.text!r} is no known function ({words}); write a product with '*'"
                )
            return self._call(token, self._arguments(self.take()))
        if known:
            raise self.refuse(token, f"the function {token.text!r} needs its argument in parentheses")
        return CONSTANTS[token.text] if token.text in CONSTANTS else self.symbol(self, token)

    def _arguments(self, opening: Token) -> list[sympy.Expr]:
        found = [self._binding_tighter_than(0)]
        while self.here.text == ",":
            self.take()
            found.append(self._binding_tighter_than(0))
        self._closed(opening, found[0])
        return found

    def _call(self, token: Token, arguments: list[sympy.Expr]) -> sympy.Expr:
        if token.text in self.calls:
            return self.calls[token.text](self, token, arguments)
        if len(arguments) != 1:
            raise self.refuse(token, f"{token.text!r} takes one argument, not {len(arguments)}")
        argument = arguments[0]
        too_large = token.text in ("exp", "sinh", "cosh") and _is_beyond(argument, _LARGEST_EXPONENTIAL)
        if too_large:
            raise self.refuse(token, f"{token.text} of a number beyond ±{_LARGEST_EXPONENTIAL:,}")
        return self._finite(token, FUNCTIONS[token.text](argument))

    def _joined(self, sign: Token, left: sympy.Expr, right: sympy.Expr) -> sympy.Expr:
        if sign.text == "+":
            return left + right
        if sign.text == "-":
            return left - right
        if sign.text == "*":
            return left * right
        if sign.text == "/":
            if right == 0:
                raise self.refuse(sign, "division by zero")
            return left / right
        return self._power(sign, left, right)

    def _power(self, sign: Token, base: sympy.Expr, exponent: sympy.Expr) -> sympy.Expr:
        if base == 0 and exponent.is_negative:
            raise self.refuse(sign, "division by zero: a negative power of 0")
        if _is_beyond(exponent, _LARGEST_POWER):
            raise self.refuse(sign, f"an exponent beyond ±{_LARGEST_POWER}")
        if base.is_Rational and exponent.is_Rational:
            bits = max(abs(base.p).bit_length(), base.q.bit_length()) * abs(exponent)
            if bits > _MOST_BITS:
                raise self.refuse(sign, f"an exact power of more than {_MOST_BITS:,} binary digits")
        return self._finite(sign, base**exponent)

    def _finite(self, token: Token, value: sympy.Expr) -> sympy.Expr:
        if value.has(sympy.nan, sympy.zoo, sympy.oo, -sympy.oo):
            raise self.refuse(token, "this has no finite value")
        return value


def _is_beyond(value: sympy.Expr, limit: int) -> bool:
    return bool(value.is_number and abs(value.evalf(5)) > limit)
