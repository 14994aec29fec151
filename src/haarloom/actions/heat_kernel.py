"""The heat-kernel action: k_r = exp(−t C₂(r))."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, ClassVar

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr

from haarloom.actions.base import Link, refuse_group
from haarloom.actions.parameters import Field, Parameter, Values, as_parameter
from haarloom.actions.plaquette_count import PLAQUETTES, plaquette_count
from haarloom.actions.windings import heat_kernel_at
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ParameterError
from haarloom.torus.angles import full_angles
from haarloom.torus.determinant_forms import WindingGaussian

__all__ = ["HeatKernel", "heat_kernel"]

_T = Field("t", "nonnegative real", "t", "total diffusion time t = N_t τ")


def heat_kernel(group: SU, t: Parameter, plaquettes: int = 1) -> HeatKernel:
    """Link weight of the heat-kernel action.

    Parameters
    ----------
    group : SU
    t : number, expression or name
        Total time t = N_t τ ≥ 0; one plaquette has w_r = exp(−τ C₂(r)), generators with T_F = 1/2.
    plaquettes : int
        N_t; it changes the plaquette weight (τ = t/N_t), not the k_r.

    Raises
    ------
    ParameterError
        If t is a negative or complex number, or N_t no positive integer.

    References
    ----------
    P. Menotti, E. Onofri, Nucl. Phys. B 190 (1981) 288.

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> heat_kernel(SU(3), "t").coefficient(SU(3).irrep(1, 0))
    exp(-4*t/3)
    """
    refuse_group("heat_kernel", group)
    return HeatKernel(group, as_parameter(t, _T), plaquette_count(plaquettes))


@dataclass(frozen=True)
class HeatKernel(Link):
    """k_r = exp(−t C₂(r)); see `heat_kernel`."""

    group: SU
    t: Expr
    plaquettes: int = 1

    kind: ClassVar[str] = "heat kernel"
    FIELDS: ClassVar[tuple[Field, ...]] = (_T, PLAQUETTES)
    accuracy: ClassVar[str] = "Exact exponentials; floats with a bound on rounding."
    bounds_proven: ClassVar[bool] = True
    positive: ClassVar[bool] = True
    monotone: ClassVar[bool] = True

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact exp(−t C₂)."""
        return sympy.exp(-self.t * irrep.casimir(2))

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """exp(−t C₂) with the error of rounding t·C₂ and the exponential."""
        t = self._value("t", values)[..., None]
        exponent = t * np.array([float(irrep.casimir(2)) for irrep in irreps])
        k = np.exp(-exponent)
        return k, np.finfo(float).eps * (2 + 2 * exponent) * k

    def largest_outside(self, cutoff: int, values: Values) -> NDArray[Any]:
        """exp(−t C) with C the least Casimir outside: proven.

        The inverse Cartan matrix min(i,j)(N − max(i,j))/N is concave along each row, so moving a label to
        one of the two ends lowers C₂; among (p, 0, …, 0, q) with p + q fixed the balanced one is least, and
        C₂ grows with every label.
        """
        t = self._value("t", values)
        least = float(_least_casimir(self.group, cutoff + 1))
        return np.asarray(np.exp(-t * least) * (1 + 4 * np.finfo(float).eps * (1 + t * least)))

    def plaquette_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any] | None:
        """w(U) = Σ_r d_r exp(−τ C₂) χ_r(U) at one t > 0; where τ is small, as a sum over windings."""
        tau = float(self._value("t", values)) / self.plaquettes
        if tau == 0:
            raise ParameterError("t = 0 makes the plaquette weight a delta function at U = 1; give t > 0.")
        return heat_kernel_at(self.group.n, full_angles(self.group.n, angles), tau)

    def determinant_form(self, values: Values) -> WindingGaussian:
        """The sum over windings, unrolled."""
        return WindingGaussian(self.group, float(self._value("t", values)) / self.plaquettes)

    def strong_coupling(self, irrep: Irrep, order: int) -> Expr:
        """The exact k_r = q^{C₂}, q = e^{−t}: one term, so the order cuts off nothing."""
        return self.coefficient(irrep)

    def large_coupling(self, irrep: Irrep) -> Expr:
        """1 − t C₂ + t² C₂²/2, the width being τ = t/N_t itself."""
        exponent = self.t * irrep.casimir(2)
        return 1 - exponent + exponent**2 / 2

    def formula(self) -> str:
        """LaTeX of exp(−t C₂(r))."""
        return rf"e^{{-{_factor_latex(self.t)}\,C_2(r)}}"


def _factor_latex(expression: Expr) -> str:
    text = sympy.latex(expression)
    return rf"\left({text}\right)" if expression.is_Add else text


@lru_cache(maxsize=256)
def _least_casimir(group: SU, shell: int) -> Expr:
    ends = (shell,) if group.n == 2 else ((shell + 1) // 2, *(0,) * (group.rank - 2), shell // 2)
    return group.irrep(*ends).casimir(2)
