"""The three names of one coupling in two dimensions: g², β and τ."""

from __future__ import annotations

from typing import Literal

from sympy import Expr, Rational

from haarloom.actions.parameters import Field, Parameter, as_parameter
from haarloom.algebra.group import SU
from haarloom.exceptions import ParameterError

__all__ = ["CONVENTIONS", "convert_coupling"]

Name = Literal["g2", "beta", "tau"]

CONVENTIONS: dict[str, str] = {
    "g2": "g² a²: the squared coupling in lattice units, one plaquette exp[(2/g²)(Re tr U − N)], generators "
    "with T_F = 1/2",
    "beta": "β = 2N/g²: one plaquette exp[(β/N) Re tr U] (common practice)",
    "tau": "τ = g²/2 = N/β: one plaquette w_r = exp(−τ C₂(r)); agrees with the Wilson and the Manton action "
    "at large β",
}
"""What each name means; the three are the same coupling where the lattice is fine, not at finite coupling."""


def convert_coupling(group: SU, value: Parameter, given: Name, wanted: Name) -> Expr:
    """Convert between g², β and τ by their definitions.

    Parameters
    ----------
    group : SU
    value : number, expression or name
        > 0.
    given, wanted : {"g2", "beta", "tau"}
        Names as in `CONVENTIONS`.

    Notes
    -----
    This is the naive relation, exact for the leading term at small g². For couplings at which two actions
    share a string tension use `haarloom.actions.matching.matching_curve`.

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> convert_coupling(SU(3), 6, "beta", "tau"), convert_coupling(SU(3), "beta", "beta", "g2")
    (1/2, 6/beta)
    """
    for role, name in (("given", given), ("wanted", wanted)):
        if name not in CONVENTIONS:
            raise ParameterError(
                f"{role} = {name!r} is no coupling; known are {', '.join(CONVENTIONS)}: give one of these."
            )
    coupling = as_parameter(value, Field(given, "positive real", given, CONVENTIONS[given].split(":")[0]))
    squared = {"g2": coupling, "beta": 2 * group.n / coupling, "tau": 2 * coupling}[given]
    return {"g2": squared, "beta": 2 * group.n / squared, "tau": squared * Rational(1, 2)}[wanted]
