"""Text cut into numbers, names and signs, each with its place, and the error that points at a place."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Literal

from haarloom.exceptions import ExpressionError

__all__ = ["MOST_CHARACTERS", "Token", "refusal", "tokenize"]

MOST_CHARACTERS = 4000
_MOST_DIGITS = 300
_LARGEST_EXPONENT = 300

_PATTERN = re.compile(
    r"(?P<number>(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?)"
    r"|(?P<name>[A-Za-z_\u0370-\u03ff][A-Za-z_0-9\u0370-\u03ff]*)"
    r"|(?P<sign>\*\*|[-+*/^(),])"
    r"|(?P<space>\s+)",
    re.ASCII,
)
_LOOK_ALIKES = {
    "−": "-",
    "–": "-",
    "·": "*",
    "×": "*",
    "⋅": "*",
    "÷": "/",
    "[": "(",
    "]": ")",
    "{": "(",
    "}": ")",
}


@dataclass(frozen=True)
class Token:
    """One piece of the text; ``start`` counts characters from 0."""

    kind: Literal["number", "name", "sign", "end"]
    text: str
    start: int
    spaced: bool = False
    """Whether white space stands before it."""


def refusal(text: str, position: int, complaint: str) -> ExpressionError:
    """The error for ``text``, with a caret below the character at ``position``."""
    line = re.sub(r"\s", " ", text)
    start = max(0, position - 60)
    shown = line[start : position + 20]
    place = "at the end" if position >= len(text) else f"at character {position + 1}"
    head = f"{complaint} ({place})"
    return ExpressionError(f"{head}\n    {shown}\n    {' ' * (position - start)}^")


def tokenize(text: str) -> list[Token]:
    """Cut the text; the last token is the end.

    Raises
    ------
    ExpressionError
        For no text, too long a text, a character without meaning, or a number with too many digits.
    """
    if not isinstance(text, str):
        raise ExpressionError(f"{text!r} given where the text of an expression is needed: put it in quotes.")
    if len(text) > MOST_CHARACTERS:
        raise ExpressionError(
            f"the expression has {len(text)} characters; at most {MOST_CHARACTERS} are read."
        )
    tokens: list[Token] = []
    place, spaced = 0, False
    while place < len(text):
        match = _PATTERN.match(text, place)
        if match is None:
            raise refusal(text, place, _unknown(text[place]))
        if match.lastgroup == "space":
            spaced = True
        else:
            tokens.append(_token(text, match, spaced))
            spaced = False
        place = match.end()
    return [*tokens, Token("end", "", len(text), spaced)]


def _token(text: str, match: re.Match[str], spaced: bool) -> Token:
    kind, piece = str(match.lastgroup), match.group()
    if kind == "number":
        _check_size(text, match.start(), piece)
        return Token("number", piece, match.start(), spaced)
    return Token("name" if kind == "name" else "sign", piece, match.start(), spaced)


def _check_size(text: str, place: int, piece: str) -> None:
    mantissa, _, exponent = piece.lower().partition("e")
    if len(mantissa) > _MOST_DIGITS:
        raise refusal(text, place, f"a number of {len(mantissa)} digits; at most {_MOST_DIGITS} are read")
    if len(exponent) > 5 or abs(int(exponent or 0)) > _LARGEST_EXPONENT:
        raise refusal(text, place, f"a power of ten beyond ±{_LARGEST_EXPONENT}")


def _unknown(character: str) -> str:
    if character in _LOOK_ALIKES:
        return f"{character!r} has no meaning here; write {_LOOK_ALIKES[character]!r}"
    return f"{character!r} has no meaning here; allowed are numbers, names, + - * / ^ ( ) and commas"
