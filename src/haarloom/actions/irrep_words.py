"""Irreps by words that mean the same for every N, beside names and labels."""

from __future__ import annotations

from typing import Any

from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep

__all__ = ["irrep_of"]

_WORDS = ("trivial", "fundamental", "antifundamental", "adjoint")


def irrep_of(group: SU, key: Any) -> Irrep:
    """An irrep from itself, its name, its labels, or one of the words trivial, fundamental,
    antifundamental, adjoint.

    >>> irrep_of(SU(4), "adjoint").dimension
    15
    """
    if isinstance(key, str) and key.strip() in _WORDS:
        irrep: Irrep = getattr(group, key.strip())
        return irrep
    return group.irrep(key)
