"""The geodesic-distance action of Manton."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr, S

from haarloom.actions.alcove_determinants import alcove_gaussian
from haarloom.actions.base import refuse_group
from haarloom.actions.parameters import Field, Parameter, Values, as_parameter
from haarloom.actions.plaquette_count import PLAQUETTES, plaquette_count
from haarloom.actions.plaquette_link import PlaquetteLink
from haarloom.actions.torus_site import Point
from haarloom.actions.windings import shortest_phases
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.torus.angles import full_angles

__all__ = ["Manton", "manton"]

_BETA = Field("beta", "nonnegative real", "beta", "coupling β of exp[−(β/2N) d²(U)], d the geodesic distance")


def manton(group: SU, beta: Parameter, plaquettes: int = 1) -> Manton:
    """Link weight of the action quadratic in the geodesic distance from the identity.

    Parameters
    ----------
    group : SU
    beta : number, expression or name
        β ≥ 0 in w(U) = exp[−(β/2N) d²(U)], d² = min Σ_j θ_j² over all phases with Σ_j θ_j = 0; normalised
        to agree with exp[(β/N) Re tr U] near U = 1.
    plaquettes : int
        N_t.

    Notes
    -----
    On SU(N) phases in (−π, π] may add up to a multiple of 2π; near another element of the centre the shortest
    geodesic has some of them shifted. ``N`` cut loci meet where two such images are equally far.

    References
    ----------
    N. S. Manton, Phys. Lett. B 96 (1980) 328.
    """
    refuse_group("manton", group)
    return Manton(group, as_parameter(beta, _BETA), plaquette_count(plaquettes))


@dataclass(frozen=True)
class Manton(PlaquetteLink):
    """exp[−(β/2N) d²(U)] on N_t plaquettes; see `manton`."""

    group: SU
    beta: Expr
    plaquettes: int = 1

    kind: ClassVar[str] = "Manton"
    FIELDS: ClassVar[tuple[Field, ...]] = (_BETA, PLAQUETTES)
    creased: ClassVar[bool] = True
    accuracy: ClassVar[str] = "Determinants of one-dimensional integrals; the error is measured on two grids."

    def plaquette_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any] | None:
        """exp[−(β/2N) d²]."""
        beta = self._value("beta", values)
        phases = full_angles(self.group.n, angles)
        shortest = shortest_phases(phases.reshape(-1, self.group.n))
        squared = (shortest**2).sum(axis=1).reshape(phases.shape[:-1])
        return np.asarray(np.exp(-beta / (2 * self.group.n) * squared))

    def _one_plaquette(
        self, irreps: Sequence[Irrep], point: Point
    ) -> tuple[NDArray[Any], NDArray[np.float64]]:
        """On the alcove d² = Σ θ_j², a product over the phases."""
        x = float(self._value("beta", dict(point))) / self.group.n
        dimensions = np.array([float(irrep.dimension) for irrep in irreps])
        ratio, error = alcove_gaussian(self.group, irreps, x)
        return ratio / dimensions, error / dimensions

    def inverse_width(self) -> tuple[Expr, Expr, Expr]:
        """1/τ = β/N, and nothing beyond the quadratic term."""
        return self.beta / self.group.n, S.Zero, S.Zero

    def formula(self) -> str:
        """LaTeX of the integral that defines k_r."""
        beta, n = sympy.latex(self.beta), self.group.n
        power = "" if self.plaquettes == 1 else f"^{{{self.plaquettes}}}"
        weight = rf"e^{{-\frac{{{beta}}}{{{2 * n}}}d^2(U)}}"
        return rf"\left[\frac{{\int dU\,\chi_r(U)^*\,{weight}}}{{d_r\int dU\,{weight}}}\right]{power}"
