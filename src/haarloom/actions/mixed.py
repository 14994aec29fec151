"""Mixed actions exp[Σ_r β_r Re χ_r(U)/d_r], the fundamental–adjoint one among them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr, Rational, S

from haarloom.actions.base import refuse_group
from haarloom.actions.coefficient_table import irrep_table
from haarloom.actions.large_coupling import quartic_moments
from haarloom.actions.parameters import Field, Parameter, Values, evaluate
from haarloom.actions.plaquette_count import PLAQUETTES, plaquette_count
from haarloom.actions.plaquette_link import PlaquetteLink
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ParameterError
from haarloom.torus.characters import characters

__all__ = ["MixedWilson", "mixed_wilson"]

_COUPLINGS = Field(
    "couplings",
    "irrep table",
    "fundamental: beta, adjoint: beta_A",
    "coupling β_r by irrep, exp[Σ β_r Re χ_r/d_r]",
)
_ENTRY = Field("beta", "real", "beta", "coupling of one irrep")


def mixed_wilson(
    group: SU, couplings: Mapping[Irrep | str | tuple[int, ...], Parameter], plaquettes: int = 1
) -> MixedWilson:
    """Link weight of the action Σ_r β_r Re χ_r(U)/d_r.

    Parameters
    ----------
    group : SU
    couplings : mapping
        From an irrep, its name or its labels to β_r, of either sign; r and its conjugate mean the same
        term. With the fundamental and the adjoint alone this is the mixed fundamental–adjoint action.
    plaquettes : int
        N_t.

    Raises
    ------
    ParameterError
        If r and its conjugate are both listed, if the trivial irrep is, or a coupling is complex.
    """
    refuse_group("mixed_wilson", group)
    table = irrep_table(group, couplings, _ENTRY)
    for irrep, _ in table:
        if not any(irrep.labels):
            raise ParameterError(
                f"couplings names {irrep.name}; the trivial irrep only changes the normalisation, which "
                "cancels: leave it out."
            )
        if irrep.conjugate != irrep and irrep.conjugate in dict(table):
            raise ParameterError(
                f"Re χ is the same for {irrep.name} and {irrep.conjugate.name}; list one of them, with the "
                f"sum."
            )
    return MixedWilson(group, table, plaquette_count(plaquettes))


@dataclass(frozen=True)
class MixedWilson(PlaquetteLink):
    """exp[Σ β_r Re χ_r/d_r] on N_t plaquettes; see `mixed_wilson`."""

    group: SU
    couplings: tuple[tuple[Irrep, Expr], ...]
    plaquettes: int = 1

    kind: ClassVar[str] = "mixed Wilson"
    FIELDS: ClassVar[tuple[Field, ...]] = (_COUPLINGS, PLAQUETTES)

    def exponent(self) -> ClassFunction:
        """Σ_r β_r (χ_r + χ_r̄)/2d_r."""
        terms: dict[Irrep, Expr] = {}
        for irrep, beta in self.couplings:
            for end in (irrep, irrep.conjugate):
                terms[end] = terms.get(end, S.Zero) + beta / (2 * irrep.dimension)
        return ClassFunction(self.group, terms)

    def plaquette_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any] | None:
        """exp[Σ β_r (Re χ_r/d_r − 1)], scaled to 1 at U = 1 so that nothing overflows."""
        numbers = evaluate([beta for _, beta in self.couplings], values)
        irreps = [irrep for irrep, _ in self.couplings]
        table = characters(irreps, angles).real
        checked = [_ENTRY.check(number) for number in numbers]
        return np.asarray(
            np.exp(
                sum(
                    b * (table[..., i] / r.dimension - 1)
                    for i, (r, b) in enumerate(zip(irreps, checked, strict=True))
                )
            )
        )

    def inverse_width(self) -> tuple[Expr, Expr, Expr]:
        """1/τ = Σ β_r 2T(r)/d_r; the quartic terms from the fourth moments of the weights of r."""
        inverse, a, b = S.Zero, S.Zero, S.Zero
        for irrep, beta in self.couplings:
            fourth, square = quartic_moments(irrep)
            inverse += beta * 2 * irrep.index / irrep.dimension
            a += beta * fourth * Rational(1, 24 * irrep.dimension)
            b += beta * square * Rational(1, 24 * irrep.dimension)
        return inverse, a, b

    def formula(self) -> str:
        """LaTeX of the integral that defines k_r."""
        power = "" if self.plaquettes == 1 else f"^{{{self.plaquettes}}}"
        terms = " + ".join(
            rf"\tfrac{{{sympy.latex(beta)}}}{{{r.dimension}}}\mathrm{{Re}}\,\chi_{{{r.latex()}}}"
            for r, beta in self.couplings
        )
        weight = rf"e^{{{terms}}}"
        return rf"\left[\frac{{\int dU\,\chi_r^*\,{weight}}}{{d_r\int dU\,{weight}}}\right]{power}"
