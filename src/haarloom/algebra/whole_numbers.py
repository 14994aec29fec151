"""Whole numbers that a user gives: one check, one message."""

from __future__ import annotations

from operator import index
from typing import Any

from haarloom.exceptions import ParameterError

__all__ = ["whole_number"]


def whole_number(name: str, raw: Any, least: int, hint: str) -> int:
    """A value as an int.

    Parameters
    ----------
    name : str
        What the user calls it, for the message.
    raw
        Anything that counts as an index: int, NumPy or SymPy integer; a bool does not.
    least : int
        Smallest value allowed.
    hint : str
        How to mend a bad one, for the message.

    Raises
    ------
    ParameterError
        For anything else.
    """
    try:
        value = least - 1 if isinstance(raw, bool) else index(raw)
    except TypeError:
        value = least - 1
    if value < least:
        raise ParameterError(f"{name} {raw!r} given; it must be an integer ≥ {least}: {hint}.")
    return value
