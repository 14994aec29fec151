"""The list of all built-in weights, from which documents and panes rebuild them."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from difflib import get_close_matches
from typing import Any, Literal

from haarloom.actions.bilinear import BilinearCoupling, bilinear_coupling
from haarloom.actions.bosons import StaticBosons, static_bosons
from haarloom.actions.coefficient_table import CoefficientTable, link_from_coefficients
from haarloom.actions.exponential_coupling import ExponentialCoupling, exponential_coupling
from haarloom.actions.fermions import StaticFermions, static_fermions
from haarloom.actions.heat_kernel import HeatKernel, heat_kernel
from haarloom.actions.link_products import CoupledLink, StackedLinks, coupled_link, stacked_links
from haarloom.actions.loop_coupling import LoopCoupling, loop_coupling
from haarloom.actions.loop_field import LoopField, loop_field
from haarloom.actions.manton import Manton, manton
from haarloom.actions.mixed import MixedWilson, mixed_wilson
from haarloom.actions.parameters import Field
from haarloom.actions.potentials import (
    LogarithmicPotential,
    PolynomialPotential,
    logarithmic_potential,
    polynomial_potential,
)
from haarloom.actions.product import SiteProduct, product_of
from haarloom.actions.reduced_measure import HaarPower, haar_power
from haarloom.actions.wilson import Wilson, wilson
from haarloom.actions.written_weights import WrittenPlaquette, WrittenSite, link_from_plaquette, site_from
from haarloom.algebra.group import SU
from haarloom.exceptions import DocumentError

__all__ = ["REGISTRY", "Entry", "build"]


@dataclass(frozen=True)
class Entry:
    """A built-in weight.

    Attributes
    ----------
    kind : str
        Key of the registry, ``kind`` of the weight.
    family : {"link", "site"}
    constructor : callable
        Called as ``constructor(group, **fields)``.
    name : str
        Public name of the constructor in ``haarloom``.
    fields : tuple of Field
        Name, domain, default and help of every argument after the group.
    help : str
        One line.
    """

    kind: str
    family: Literal["link", "site"]
    constructor: Callable[..., Any]
    name: str
    fields: tuple[Field, ...]
    help: str


def _entry(family: Literal["link", "site"], weight: Any, constructor: Callable[..., Any]) -> Entry:
    summary = (constructor.__doc__ or "").strip().splitlines()[0]
    return Entry(weight.kind, family, constructor, constructor.__name__, weight.FIELDS, summary)


def _product(group: SU, factors: list[Any]) -> SiteProduct:
    """Product of site weights."""
    return product_of(*(build(group, part) if isinstance(part, Mapping) else part for part in factors))


_ENTRIES = (
    _entry("link", HeatKernel, heat_kernel),
    _entry("link", Wilson, wilson),
    _entry("link", MixedWilson, mixed_wilson),
    _entry("link", Manton, manton),
    _entry("link", WrittenPlaquette, link_from_plaquette),
    _entry("link", CoefficientTable, link_from_coefficients),
    _entry("link", LoopCoupling, loop_coupling),
    _entry("link", ExponentialCoupling, exponential_coupling),
    _entry("link", BilinearCoupling, bilinear_coupling),
    _entry("link", StackedLinks, stacked_links),
    _entry("link", CoupledLink, coupled_link),
    _entry("site", StaticFermions, static_fermions),
    _entry("site", StaticBosons, static_bosons),
    _entry("site", LoopField, loop_field),
    _entry("site", PolynomialPotential, polynomial_potential),
    _entry("site", LogarithmicPotential, logarithmic_potential),
    _entry("site", HaarPower, haar_power),
    _entry("site", WrittenSite, site_from),
    _entry("site", SiteProduct, _product),
)

REGISTRY: dict[str, Entry] = {entry.kind: entry for entry in _ENTRIES}
"""Built-in weights by kind, links first, in the order in which a menu shows them."""


def build(group: SU, description: Mapping[str, Any]) -> Any:
    """The weight that ``describe()`` described.

    Parameters
    ----------
    group : SU
    description : mapping
        ``kind`` and the constructor's fields; expressions as text.

    Raises
    ------
    DocumentError
        If the kind is unknown or a field is missing or foreign.
    """
    fields = dict(description)
    kind = fields.pop("kind", None)
    if kind not in REGISTRY:
        near = get_close_matches(str(kind), REGISTRY, n=3)
        hint = f"; did you mean {' or '.join(near)}?" if near else f"; known kinds: {', '.join(REGISTRY)}."
        raise DocumentError(f"Unknown kind of weight {kind!r}{hint}")
    entry = REGISTRY[kind]
    known = {field.name for field in entry.fields}
    missing = {field.name for field in entry.fields if not field.optional} - set(fields)
    if missing or set(fields) - known:
        raise DocumentError(
            f"A weight of kind {kind!r} has the fields {', '.join(sorted(known))}; "
            f"missing: {', '.join(sorted(missing)) or 'none'}; unknown: "
            f"{', '.join(sorted(set(fields) - known)) or 'none'}. Give each "
            "known field once."
        )
    return entry.constructor(group, **fields)
