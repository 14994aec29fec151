"""Starting values and slider ranges for the parameters of a model or weight."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from math import isfinite
from typing import Any, Protocol

from sympy import Symbol

from haarloom.exceptions import ParameterError
from haarloom.widgets.arguments import checked_mapping, checked_span

__all__ = ["Parametric", "checked_start", "ranges_of"]


class Parametric(Protocol):
    """A model or a weight."""

    @property
    def parameters(self) -> tuple[Symbol, ...]:
        """The symbols that need values."""


Span = tuple[float, float, float]
"""Lowest, highest and starting value."""

BY_NAME: dict[str, Span] = {
    "t": (0.1, 3.0, 1.0),
    "beta": (0.5, 12.5, 3.0),
    "z": (0.0, 3.0, 0.3),
    "zbar": (0.0, 1.0, 0.0),
}
"""Names in common use: strong to moderate coupling; fugacities from an empty lattice past half filling."""

BY_DOMAIN: dict[str, Span] = {
    "boson fugacity": (0.0, 0.8, 0.2),
    "positive real": (0.1, 3.0, 1.0),
    "nonnegative real": (0.0, 3.0, 1.0),
}

_COMPLEX_WAY_OUT = (
    " For a complex one ask model.spectrum({name}=0.6+0.8j, …), or write {name} in real parameters: "
    'a fugacity as "exp(I*theta)" has a slider for theta.'
)

OTHERWISE: Span = (0.0, 1.0, 0.1)


def ranges_of(owner: Parametric, given: Mapping[str, tuple[float, float]]) -> dict[str, tuple[float, float]]:
    """Slider ranges by name; ``given`` ones first, else what suits the name and the domain.

    Raises
    ------
    ParameterError
        For a range that is no pair of finite numbers, the lower one first.
    """
    spans = _spans(owner)
    wanted = {name: checked_span(f"range of {name}", span) for name, span in given.items()}
    return {name: wanted.get(name, span[:2]) for name, span in spans.items()}


def checked_start(
    owner: Parametric, given: Mapping[str, float] | None, keep: Mapping[str, float] | None = None
) -> dict[str, float]:
    """A number for each parameter: the given one, else the one to keep, else a starting value.

    Raises
    ------
    ParameterError
        For a name that is no parameter, or a value that is no real number.
    """
    spans, given, kept = _spans(owner), checked_mapping("values", given), dict(keep or {})
    for name in given:
        if name not in spans:
            raise ParameterError(
                f"values name {name!r}, which is no parameter here: allowed are {', '.join(spans) or 'none'}."
            )
    return {name: _real(name, given.get(name, kept.get(name, span[2]))) for name, span in spans.items()}


def _spans(owner: Parametric) -> dict[str, Span]:
    domains = dict(_domains(owner))
    return {symbol.name: _span(symbol.name, domains.get(symbol.name, "")) for symbol in owner.parameters}


def _span(name: str, domain: str) -> Span:
    # a fugacity of bosons is called z as well, but must stay below 1
    if domain == "boson fugacity":
        return BY_DOMAIN[domain]
    return BY_NAME.get(name, BY_DOMAIN.get(domain, OTHERWISE))


def _domains(owner: Any) -> Iterator[tuple[str, str]]:
    """Domains of those parameters that are a whole field of some weight."""
    for part in (getattr(owner, "link", None), getattr(owner, "site", None), *getattr(owner, "sites", ())):
        if part is not None:
            yield from _domains(part)
    for field in getattr(owner, "FIELDS", ()):
        value = getattr(owner, field.name, None)
        if isinstance(value, Symbol):
            yield value.name, field.domain


def _real(name: str, value: Any) -> float:
    try:
        number = float(value)
    except (TypeError, ValueError):
        number = float("nan")
    if not isfinite(number):
        way_out = _COMPLEX_WAY_OUT.format(name=name) if isinstance(value, complex) else ""
        raise ParameterError(f"{name} = {value!r}: a slider needs one finite real number.{way_out}")
    return number
