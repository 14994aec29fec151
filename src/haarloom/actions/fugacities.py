"""Fugacities of static matter from masses, chemical potentials and temperature, or from hopping."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import sympy
from sympy import Expr, Integer, S

from haarloom.actions.parameters import Field, Parameter, as_parameter
from haarloom.algebra.whole_numbers import whole_number
from haarloom.exceptions import ParameterError

__all__ = ["PHYSICAL", "fugacities", "known_inputs"]

PHYSICAL: dict[str, Field] = {
    "mass": Field("mass", "real", "m", "mass M of a static particle", True),
    "mu": Field("mu", "complex", "mu", "chemical potential μ; imaginary ones as I*theta*T", True),
    "temperature": Field("temperature", "positive real", "T", "temperature T", True),
    "kappa": Field("kappa", "nonnegative real", "kappa", "hopping parameter κ of heavy Wilson quarks", True),
    "n_t": Field("n_t", "positive integer", "4", "lattice sites N_t around the temperature circle", True),
}


def known_inputs(physical: Mapping[str, Any]) -> dict[str, Any]:
    """The physical inputs as given, once their names are known to be right."""
    unknown = sorted(set(physical) - set(PHYSICAL))
    if unknown:
        raise ParameterError(
            f"{', '.join(unknown)} is no input of static matter; known are z, zbar, {', '.join(PHYSICAL)}: "
            "rename it or leave it out."
        )
    return dict(physical)


def fugacities(
    z: Parameter | None, zbar: Parameter, fields: tuple[Field, Field], **physical: Any
) -> tuple[Expr, Expr]:
    """z and z̄ from fugacities given as such, or from physical inputs.

    Parameters
    ----------
    z, zbar : number, expression or name
        Used as they are; then nothing physical may be given.
    fields : (Field, Field)
        Domains of z and z̄.
    **physical
        ``mass``, ``mu`` and ``temperature``: z = e^{(μ − M)/T}, z̄ = e^{−(μ + M)/T}. ``kappa``, ``n_t`` and
        ``mu``: heavy Wilson quarks to leading order in the hopping parameter, z = (2κ)^{N_t} e^{μ/T}, z̄ =
        (2κ)^{N_t} e^{−μ/T}, with μ/T = N_t μ for μ in lattice units unless a temperature is given. None
        stands for "not given".

    Raises
    ------
    ParameterError
        For inputs that contradict each other or that do not suffice.

    References
    ----------
    P. Hasenfratz, F. Karsch, Phys. Lett. B 125 (1983) 308: chemical potential in the hopping expansion.
    """
    given = {name: value for name, value in physical.items() if value is not None}
    if not given:
        if z is None:
            raise ParameterError(
                "z is missing: give the fugacity z, or mass and temperature (and mu), or kappa and n_t (and "
                "mu)."
            )
        return as_parameter(z, fields[0]), as_parameter(zbar, fields[1])
    if z is not None or zbar != 0:
        both = " and ".join([*(["z"] if z is not None else []), *(["zbar"] if zbar != 0 else []), *given])
        raise ParameterError(
            f"z follows from the physical inputs, but {both} were given; keep the fugacities or the others."
        )
    if ("mass" in given) == ("kappa" in given):
        raise ParameterError(
            f"Given: {', '.join(given)}. Static matter needs either mass and temperature, or kappa and n_t, "
            f"not both "
            "and not neither; mu goes with each."
        )
    values = {name: as_parameter(value, PHYSICAL[name]) for name, value in given.items() if name != "n_t"}
    pair = _from_mass(given, values) if "mass" in given else _from_hopping(given, values)
    return as_parameter(pair[0], fields[0]), as_parameter(pair[1], fields[1])


def _from_mass(given: dict[str, Any], values: dict[str, Expr]) -> tuple[Expr, Expr]:
    if "n_t" in given:
        raise ParameterError(
            "n_t was given with a mass; it goes with kappa: leave it out and give the temperature."
        )
    if "temperature" not in given:
        raise ParameterError(
            "temperature is missing: with a mass, z = exp((mu - mass)/temperature); give a number or a name, "
            'such as temperature="T".'
        )
    mass, mu, temperature = values["mass"], values.get("mu", S.Zero), values["temperature"]
    return sympy.exp((mu - mass) / temperature), sympy.exp(-(mu + mass) / temperature)


def _from_hopping(given: dict[str, Any], values: dict[str, Expr]) -> tuple[Expr, Expr]:
    if "n_t" not in given:
        raise ParameterError(
            "n_t is missing: with kappa, z = (2*kappa)^n_t * exp(mu/T); give n_t=4 or another whole number."
        )
    sites = Integer(whole_number("n_t", given["n_t"], 1, "it counts the sites around the temperature circle"))
    mu = values.get("mu", S.Zero)
    ratio = mu / values["temperature"] if "temperature" in values else sites * mu
    hop = (2 * values["kappa"]) ** sites
    return hop * sympy.exp(ratio), hop * sympy.exp(-ratio)
