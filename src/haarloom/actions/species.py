"""Several species of static matter at once, each with inputs of its own."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Literal

from haarloom.actions.base import Site, refuse_group
from haarloom.actions.bosons import static_bosons
from haarloom.actions.fermions import static_fermions
from haarloom.actions.fugacities import PHYSICAL
from haarloom.actions.parameters import Field, Parameter, as_parameter
from haarloom.actions.product import product_of
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ParameterError

__all__ = ["Species", "static_species"]

_ISOSPIN = Field("isospin", "real", "1/2", "third component I₃ of the isospin")
_SPLITTING = Field("isospin_mu", "complex", "mu_I", "isospin chemical potential μ_I", True)


@dataclass(frozen=True)
class Species:
    """One kind of static particle.

    Attributes
    ----------
    mass : number, expression or name
    mu : number, expression or name
        Chemical potential of its own, in the same units; an imaginary one is ``I*theta*T``.
    copies : int
        Spin states × flavours that share all else.
    irrep : Irrep, name or labels
    statistics : {"fermions", "bosons"}
    isospin : number
        I₃; it adds I₃ μ_I to μ. The two flavours of a doublet have ± 1/2.
    """

    mass: Parameter
    mu: Parameter = 0
    copies: int = 1
    irrep: Irrep | str | tuple[int, ...] = "fundamental"
    statistics: Literal["fermions", "bosons"] = "fermions"
    isospin: int | Fraction | str = 0


def static_species(
    group: SU, species: Sequence[Species], temperature: Parameter, isospin_mu: Parameter = 0
) -> Site:
    """Site weight of several species of static matter.

    Parameters
    ----------
    group : SU
    species : sequence of Species
    temperature : number, expression or name
        T, common to all.
    isospin_mu : number, expression or name
        μ_I: a species with I₃ has μ + I₃ μ_I, so that a doublet is split by μ_I.

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> doublet = [Species("m", "mu", isospin="1/2"), Species("m", "mu", isospin="-1/2")]
    >>> site = static_species(SU(3), doublet, "T", "mu_I")
    >>> [symbol.name for symbol in site.parameters]
    ['T', 'm', 'mu', 'mu_I']
    """
    refuse_group("static_species", group)
    if not species or not all(isinstance(one, Species) for one in species):
        raise ParameterError(
            f"species = {species!r}: at least one Species is needed and nothing else; give a list such as "
            '[Species("m", "mu", copies=2)].'
        )
    splitting = as_parameter(isospin_mu, _SPLITTING)
    factors = []
    for one in species:
        constructors = {"fermions": static_fermions, "bosons": static_bosons}
        if one.statistics not in constructors:
            raise ParameterError(
                f"statistics = {one.statistics!r} is not allowed: give 'fermions' or 'bosons'."
            )
        mu = as_parameter(one.mu, PHYSICAL["mu"]) + as_parameter(one.isospin, _ISOSPIN) * splitting
        build = constructors[one.statistics]
        factors.append(
            build(group, copies=one.copies, irrep=one.irrep, mass=one.mass, mu=mu, temperature=temperature)
        )
    return factors[0] if len(factors) == 1 else product_of(*factors)
