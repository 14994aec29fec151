"""A JSON document as a tree whose every node knows its path, read strictly.

Duplicate keys and NaN are legal to Python's reader and wrong in a model document; they are caught
here, with the path where they stand.
"""

from __future__ import annotations

import json
from collections.abc import Collection, Iterator
from dataclasses import dataclass
from decimal import Decimal
from typing import Any, NoReturn

from haarloom.exceptions import DocumentError

__all__ = ["Node", "read_tree"]

_MOST_CHARACTERS = 1_000_000
_DEEPEST = 20
_MOST_DIGITS = 300


@dataclass(frozen=True)
class _Unreadable:
    """Stands where JSON holds something that no document may; refused once its path is known."""

    complaint: str


@dataclass(frozen=True)
class Node:
    """A value of the document and the path to it, such as ``site[1].parameters.z``."""

    value: Any
    path: str

    def refuse(self, complaint: str) -> NoReturn:
        """Raise the error that names this place."""
        raise DocumentError(f"{self.path or 'the document'}: {complaint}")

    def child(self, key: str) -> Node:
        """The value of a key that is known to be there."""
        return Node(self.value[key], f"{self.path}.{key}" if self.path else key)

    def children(self) -> Iterator[tuple[str, Node]]:
        """Every key with its value."""
        self._expect(dict, "an object {…}")
        return ((key, self.child(key)) for key in self.value)

    def items(self) -> Iterator[Node]:
        """The members of a list."""
        self._expect(list, "a list […]")
        return (Node(member, f"{self.path}[{i}]") for i, member in enumerate(self.value))

    def keys(self, required: Collection[str], optional: Collection[str] = ()) -> set[str]:
        """The keys of an object, none missing and none unknown."""
        self._expect(dict, "an object {…}")
        missing = [key for key in required if key not in self.value]
        unknown = [key for key in self.value if key not in (*required, *optional)]
        if missing:
            self.refuse(f"the key {missing[0]!r} is missing; required: {', '.join(required)}")
        if unknown:
            self.refuse(f"unknown key {unknown[0]!r}; allowed: {', '.join((*required, *optional))}")
        return set(self.value)

    def text(self) -> str:
        """A string."""
        self._expect(str, "text in quotes")
        return str(self.value)

    def whole(self, least: int, most: int) -> int:
        """A whole number within bounds."""
        if isinstance(self.value, bool) or not isinstance(self.value, int):
            self.refuse(f"{self._shown()} given; a whole number from {least} to {most} is needed")
        if not least <= self.value <= most:
            self.refuse(f"{self.value} given; allowed are {least} to {most}")
        return self.value

    def _expect(self, kind: type, words: str) -> None:
        if not isinstance(self.value, kind):
            self.refuse(f"{self._shown()} given; {words} is needed")

    def _shown(self) -> str:
        shown = repr(self.value) if not isinstance(self.value, Decimal) else str(self.value)
        return shown if len(shown) <= 40 else f"{shown[:40]}…"


def read_tree(text: str) -> Node:
    """Read JSON. Decimals come as :class:`decimal.Decimal`, digit for digit, never as floats.

    Raises
    ------
    DocumentError
        For text that is no JSON (with line and column), too long or nested too deep, and for duplicate
        keys, NaN, infinities and overlong numbers (with their path).
    """
    if len(text) > _MOST_CHARACTERS:
        raise DocumentError(f"{len(text):,} characters; a model document has at most {_MOST_CHARACTERS:,}")
    try:
        value = json.loads(
            text, object_pairs_hook=_unique, parse_constant=_no_number, parse_float=_exact, parse_int=_whole
        )
    except json.JSONDecodeError as problem:
        where = f"line {problem.lineno}, column {problem.colno}"
        raise DocumentError(f"this is no JSON: {problem.msg} at {where}") from None
    except RecursionError:
        raise DocumentError(f"nested more than {_DEEPEST} deep") from None
    root = Node(value, "")
    _check(root, 0)
    return root


def _unique(pairs: list[tuple[str, Any]]) -> Any:
    keys = [key for key, _ in pairs]
    twice = next((key for i, key in enumerate(keys) if key in keys[:i]), None)
    return dict(pairs) if twice is None else _Unreadable(f"the key {twice!r} stands there twice")


def _no_number(text: str) -> _Unreadable:
    return _Unreadable(f"{text} is no number that a model could have")


def _exact(text: str) -> Decimal | _Unreadable:
    return Decimal(text) if len(text) <= _MOST_DIGITS else _Unreadable("a number with too many digits")


def _whole(text: str) -> int | _Unreadable:
    return int(text) if len(text) <= _MOST_DIGITS else _Unreadable("a number with too many digits")


def _check(node: Node, depth: int) -> None:
    if depth > _DEEPEST:
        node.refuse(f"nested more than {_DEEPEST} deep")
    if isinstance(node.value, _Unreadable):
        node.refuse(node.value.complaint)
    members: Iterator[Node] = iter(())
    if isinstance(node.value, dict):
        members = (child for _, child in node.children())
    elif isinstance(node.value, list):
        members = node.items()
    for member in members:
        _check(member, depth + 1)
