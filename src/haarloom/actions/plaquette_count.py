"""N_t, the number of plaquettes between neighbouring loops: an argument of every gauge action."""

from __future__ import annotations

from typing import Any

from haarloom.actions.parameters import Field
from haarloom.algebra.whole_numbers import whole_number

__all__ = ["PLAQUETTES", "plaquette_count"]

PLAQUETTES = Field("plaquettes", "positive integer", "1", "plaquettes N_t between neighbouring loops", True)


def plaquette_count(plaquettes: Any) -> int:
    """N_t as an int ≥ 1, or a `ParameterError`."""
    return whole_number("plaquettes", plaquettes, 1, "N_t counts the plaquettes between neighbouring loops")
