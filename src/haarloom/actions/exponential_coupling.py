"""The exponentiated coupling of neighbouring loops, exp[λ(L L′* + L* L′)]."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, ClassVar

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr

from haarloom.actions.base import Link, refuse_group
from haarloom.actions.named_coefficient import NamedCoefficient
from haarloom.actions.parameters import Field, Parameter, Values, as_parameter
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.products import multiply
from haarloom.exceptions import SizeError

__all__ = ["LAM", "ExponentialCoupling", "exponential_coupling"]

LAM = Field("lam", "real", "lam", "coupling λ of neighbouring loops, λ(L L'* + L* L')")
_EPS = float(np.finfo(float).eps)
_MOST_IRREPS = 60_000
_MOST_ORDERS = 120


def exponential_coupling(group: SU, lam: Parameter) -> ExponentialCoupling:
    """Exponentiated coupling of neighbouring loops, K = exp[λ(L L′* + L* L′)].

    Parameters
    ----------
    group : SU
    lam : number, expression or name
        λ, real; for λ ≥ 0 the kernel is positive.
    """
    refuse_group("exponential_coupling", group)
    return ExponentialCoupling(group, as_parameter(lam, LAM))


@dataclass(frozen=True)
class ExponentialCoupling(Link):
    """exp[λ(L L′* + L* L′)] = Σ λ^{m+n}/(m! n!) (L^m L*^n)(P) (L^m L*^n)(P′)*; see `exponential_coupling`."""

    group: SU
    lam: Expr

    kind: ClassVar[str] = "exponential loop coupling"
    FIELDS: ClassVar[tuple[Field, ...]] = (LAM,)
    accuracy: ClassVar[str] = "Power series in the coupling with a proven bound on the orders left out."
    bounds_proven: ClassVar[bool] = True
    diagonal: ClassVar[bool] = False
    letter: ClassVar[str] = "k"

    def coefficient(self, irrep: Irrep) -> Expr:
        """The diagonal element k_rr, a named coefficient."""
        return NamedCoefficient.of(self, irrep)

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """Diagonal elements of the kernel."""
        kernel, error = self.kernel_at(irreps, values)
        return np.diagonal(kernel, axis1=-2, axis2=-1), np.diagonal(error, axis1=-2, axis2=-1)

    def kernel(self, irreps: Sequence[Irrep]) -> sympy.ImmutableMatrix:
        """Named elements k_rs; zero where r and s differ in N-ality."""
        elements = [
            NamedCoefficient.of(self, r, s) if r.nality == s.nality else sympy.S.Zero
            for r in irreps
            for s in irreps
        ]
        return sympy.ImmutableMatrix(len(irreps), len(irreps), elements)

    def kernel_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """k_rs = Σ_mn λ^{m+n}/(m! n!) c_r^{mn} c_s^{mn}, c_r^{mn} the multiplicity of r in F^m F̄^n.

        The error bounds the orders left out: with c_r^{mn} ≤ N^{m+n}/d_r and Σ_r c_r² = ∫|L|^{2M} ≤ M!.
        """
        lam = self._value("lam", values)
        order = _orders(self.group.n, float(np.abs(lam).max()))
        powers, counts = _multiplicities(self.group, tuple(irreps), order)
        weights = lam[..., None] ** powers.sum(axis=1) / np.array(
            [math.factorial(int(m)) * math.factorial(int(n)) for m, n in powers], dtype=float
        )
        kernel = np.einsum("...p,pr,ps->...rs", weights, counts, counts)
        absolute = np.einsum("...p,pr,ps->...rs", np.abs(weights), counts, counts)
        rest = _rest(self.group.n, np.abs(lam), order + 1)
        return kernel, absolute * (8 + order) * _EPS + rest[..., None, None]

    def kernel_density_at(self, angles: NDArray[Any], others: NDArray[Any], values: Values) -> NDArray[Any]:
        """K(P, P′) on two copies of the torus, all N eigenphases in each, the two broadcast."""
        loops = (np.exp(1j * np.asarray(phases)).sum(axis=-1) for phases in (angles, others))
        first, second = loops
        return np.asarray(np.exp(2 * float(self._value("lam", values)) * (first * second.conj()).real))

    def largest_outside(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Norm of all orders m + n beyond the cutoff: proven, and the rest of the kernel lives inside it."""
        return _rest(self.group.n, np.abs(self._value("lam", values)), cutoff + 1)

    def formula(self) -> str:
        """LaTeX of the double series."""
        lam = sympy.latex(self.lam)
        series = rf"k_{{rs}}=\sum_{{mn}}\frac{{{lam}^{{m+n}}}}{{m!\,n!}}\,c_r^{{mn}}c_s^{{mn}}"
        return series + r",\quad F^m\bar F^n=\sum_r c_r^{mn}r"

    def latex(self) -> str:
        """The kernel in closed form."""
        lam = sympy.latex(self.lam)
        return rf"K(P,P')=\exp\left[{lam}\left(L{{L'}}^*+L^*L'\right)\right],\qquad {self.formula()}"


def _terms(n: int, lam: NDArray[np.float64], orders: NDArray[np.int_]) -> NDArray[np.float64]:
    """(2λ)^M/M! · min(N^{2M}, M!): the norm of all terms of total order M."""
    from scipy.special import gammaln

    factorials = gammaln(orders + 1)
    with np.errstate(divide="ignore"):
        logs = (
            orders * np.log(2 * lam)[..., None]
            - factorials
            + np.minimum(2 * orders * math.log(n), factorials)
        )
    return np.asarray(np.exp(logs))


def _rest(n: int, lam: NDArray[np.float64], start: int) -> NDArray[np.float64]:
    last = max(start, int(np.ceil(8 * float(np.max(lam)) * n * n))) + 80
    # beyond `last` the terms fall by more than half each time
    return np.asarray(_terms(n, lam, np.arange(start, last)).sum(axis=-1) * (1 + 1e-12))


def _orders(n: int, lam: float) -> int:
    orders = np.arange(1, _MOST_ORDERS + 1)
    terms = _terms(n, np.asarray(lam), orders)
    small = np.flatnonzero(terms[::-1].cumsum()[::-1] < _EPS)
    if not len(small):
        raise SizeError(
            f"lam = {lam:.4g} needs more than {_MOST_ORDERS} orders of exp[λ(L L'* + L* L')] on SU({n}); "
            f"make it smaller."
        )
    return max(1, int(small[0]))


@lru_cache(maxsize=16)
def _multiplicities(
    group: SU, irreps: tuple[Irrep, ...], order: int
) -> tuple[NDArray[np.int_], NDArray[np.float64]]:
    """(m, n) with m + n ≤ order, shape (p, 2), and the multiplicities c_r^{mn}, shape (p, irreps)."""
    from scipy.sparse import csr_matrix

    count = group.count_irreps(order)
    if count > _MOST_IRREPS:
        raise SizeError(
            f"Order {order} of the exponential coupling reaches {count:,} irreps of {group}, more than "
            f"{_MOST_IRREPS:,}; make "
            "lam smaller."
        )
    basis = group.irreps(order)
    place = {irrep.labels: i for i, irrep in enumerate(basis)}
    entries = [
        (place[target], place[source.labels])
        for source in basis
        for target in multiply(source.labels, group.fundamental.labels)
        if target in place
    ]
    rows, columns = np.array(entries).T
    up = csr_matrix((np.ones(len(entries)), (rows, columns)), shape=(count, count))
    chosen = [place.get(irrep.labels, -1) for irrep in irreps]
    powers, counts = [], []
    first = np.zeros(count)
    first[0] = 1.0
    for m in range(order + 1):
        vector = first
        for n in range(order + 1 - m):
            powers.append((m, n))
            counts.append([vector[i] if i >= 0 else 0.0 for i in chosen])
            vector = up.T @ vector
        first = up @ first
    return np.array(powers), np.array(counts)
