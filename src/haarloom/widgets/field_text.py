"""Text of a weight's field: what a control shows, and what a constructor takes for it."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from haarloom.exceptions import ParameterError

if TYPE_CHECKING:
    from haarloom.actions.parameters import Field
    from haarloom.algebra.group import SU

__all__ = ["choices_of", "default_text", "read_text", "shown_text"]

_BETWEEN_ENTRIES = re.compile(r",(?![^(]*\))")
"""A comma that is not inside the brackets of a label tuple."""


def read_text(field: Field, text: str) -> Any:
    """The argument that a constructor takes for what stands in a control.

    Numbers and expressions stay text: the constructors parse it by the safe grammar.

    Raises
    ------
    ParameterError
        For a whole number or a table that cannot be read.
    """
    if field.domain == "positive integer":
        return _whole(field, text)
    if field.domain == "irrep table":
        return _table(field, text)
    return text.strip()


def shown_text(value: Any) -> str:
    """A described value as a control shows it."""
    if isinstance(value, Mapping):
        return ", ".join(f"{name}: {entry}" for name, entry in value.items())
    return str(value)


def default_text(field: Field, group: SU) -> str:
    """The field's default, with the irreps of a table renamed for groups other than SU(3)."""
    if field.domain != "irrep table":
        return field.default
    names = {"1": group.trivial, "3": group.fundamental, "3bar": group.antifundamental}
    return shown_text(
        {
            names[key].name if key in names else key: entry
            for key, entry in _table(field, field.default).items()
        }
    )


def choices_of(field: Field) -> tuple[str, ...]:
    """The words of a ``"choice: a, b"`` domain, else none."""
    head, _, words = field.domain.partition("choice:")
    return () if head else tuple(word.strip() for word in words.split(",") if word.strip())


def _whole(field: Field, text: str) -> int:
    if not re.fullmatch(r"\s*\+?\d+\s*", text):
        raise ParameterError(f"{field.name} = {text!r} is not allowed: it must be an integer ≥ 1.")
    return int(text)


def _table(field: Field, text: str) -> dict[str, str]:
    table: dict[str, str] = {}
    for entry in _BETWEEN_ENTRIES.split(text):
        name, value = (part.strip() for part in (*entry.split(":", 1), "")[:2])
        if not (name and value):
            raise ParameterError(
                f"{field.name}: {entry.strip()!r} is no entry; write irrep: value, separated by commas, "
                f"e.g. {field.default}."
            )
        if name in table:
            raise ParameterError(f"{field.name} names {name} twice; keep one of the two.")
        table[name] = value
    return table
