"""Direct couplings of neighbouring loops, 1 + λ(L L′* + L* L′) and its exponential."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, ClassVar, Literal

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr, S

from haarloom.actions.base import Link, refuse_group
from haarloom.actions.exponential_coupling import LAM, ExponentialCoupling, exponential_coupling
from haarloom.actions.parameters import Field, Parameter, Values, as_parameter
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ParameterError

__all__ = ["LoopCoupling", "loop_coupling"]


def loop_coupling(
    group: SU, lam: Parameter, form: Literal["resummed", "exponential"] = "resummed"
) -> LoopCoupling | ExponentialCoupling:
    """Direct coupling of neighbouring loops, K = 1 + λ(L L′* + L* L′) or its exponentiated form.

    Parameters
    ----------
    group : SU
    lam : number, expression or name
        λ, real.
    form : {"resummed", "exponential"}
        1 + λ(L L′* + L* L′), or exp[λ(L L′* + L* L′)], which mixes irreps of one N-ality.

    Notes
    -----
    For N ≥ 3 the resummed form is diagonal, k_1 = 1, k_F = k_F̄ = λ; for SU(2) L is real and k_F = 2λ.

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> loop_coupling(SU(3), "lam").coefficient(SU(3).fundamental)
    lam
    """
    refuse_group("loop_coupling", group)
    if form not in ("resummed", "exponential"):
        raise ParameterError(f"form = {form!r} is not allowed: give 'resummed' or 'exponential'.")
    if form == "exponential":
        return exponential_coupling(group, lam)
    return LoopCoupling(group, as_parameter(lam, LAM))


@dataclass(frozen=True)
class LoopCoupling(Link):
    """1 + λ(L L′* + L* L′); see `loop_coupling`."""

    group: SU
    lam: Expr

    kind: ClassVar[str] = "loop coupling"
    FIELDS: ClassVar[tuple[Field, ...]] = (LAM,)
    bounds_proven: ClassVar[bool] = True
    monotone: ClassVar[bool] = True

    def coefficient(self, irrep: Irrep) -> Expr:
        """1 for the trivial irrep, λ for F and F̄ (2λ for SU(2)), else 0."""
        if not any(irrep.labels):
            return S.One
        if irrep not in (self.group.fundamental, self.group.antifundamental):
            return S.Zero
        return 2 * self.lam if self.group.n == 2 else self.lam

    def largest_outside(self, cutoff: int, values: Values) -> NDArray[Any]:
        """|k_F| below cutoff 1, else 0: proven."""
        if cutoff >= 1:
            return np.zeros(())
        k, error = self.coefficients_at([self.group.fundamental], values)
        return np.asarray((np.abs(k) + error)[..., 0])

    @property
    def kernel_reach(self) -> int:
        """1: the fundamental and its conjugate."""
        return 1

    def kernel_density_at(self, angles: NDArray[Any], others: NDArray[Any], values: Values) -> NDArray[Any]:
        """K(P, P′) on two copies of the torus, all N eigenphases in each, the two broadcast."""
        first, second = (np.exp(1j * np.asarray(phases)).sum(axis=-1) for phases in (angles, others))
        return np.asarray(1 + 2 * self._value("lam", values) * (first * second.conj()).real)

    def formula(self) -> str:
        """LaTeX of the k_r."""
        fundamental = sympy.latex(self.coefficient(self.group.fundamental))
        return rf"1,\ {fundamental},\ {fundamental},\ 0,\dots\quad(r=\mathbf 1,F,\bar F,\text{{others}})"

    def latex(self) -> str:
        """The kernel in loops."""
        lam = sympy.latex(self.lam)
        lam = rf"\left({lam}\right)" if self.lam.is_Add else lam
        return rf"K(P,P')=1+{lam}\left(L{{L'}}^*+L^*L'\right)"
