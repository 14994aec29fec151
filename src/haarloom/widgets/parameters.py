"""Starting values and slider ranges for the parameters of a model or weight."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Protocol

from sympy import Symbol

from haarloom.exceptions import ParameterError

__all__ = ["Parametric", "checked_start", "ranges_of"]


class Parametric(Protocol):
    """A model or a weight."""

    @property
    def parameters(self) -> tuple[Symbol, ...]: ...


COMMON: dict[str, tuple[float, float, float]] = {
    "t": (0.1, 3.0, 1.0),
    "z": (0.0, 3.0, 0.3),
    "zbar": (0.0, 1.0, 0.0),
    "beta": (0.0, 12.0, 3.0),
}
"""Lowest, highest and starting value for names in common use: strong to moderate coupling, and
fugacities from an empty lattice past half filling at z = 1."""

OTHERWISE = (0.0, 1.0, 0.1)


def ranges_of(owner: Parametric, given: Mapping[str, tuple[float, float]]) -> dict[str, tuple[float, float]]:
    """Slider ranges by name; ``given`` ones first."""
    return {
        symbol.name: given.get(symbol.name, COMMON.get(symbol.name, OTHERWISE)[:2])
        for symbol in owner.parameters
    }


def checked_start(
    owner: Parametric, given: Mapping[str, float] | None, keep: Mapping[str, float] | None = None
) -> dict[str, float]:
    """A number for each parameter: the given one, else the one to keep, else a starting value.

    Raises
    ------
    ParameterError
        For a name that is no parameter, or a value that is no real number.
    """
    names = [symbol.name for symbol in owner.parameters]
    given = dict(given or {})
    for name in given:
        if name not in names:
            raise ParameterError(
                f"values name {name!r}, which is no parameter here: allowed are {', '.join(names) or 'none'}."
            )
    kept = dict(keep or {})
    return {name: _real(name, given.get(name, kept.get(name, COMMON.get(name, OTHERWISE)[2]))) for name in names}


def _real(name: str, value: Any) -> float:
    try:
        return float(value)
    except (TypeError, ValueError):
        raise ParameterError(f"{name} = {value!r}: a slider needs one real number.") from None
