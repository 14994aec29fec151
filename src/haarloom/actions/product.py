"""Products of site weights: fermions × field × …"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray
from sympy import Expr, S

from haarloom.actions.base import Site
from haarloom.actions.character_factors import CharacterFactor, merged_factors
from haarloom.actions.multiplicative import Factor, multiplicative_coefficients
from haarloom.actions.named_coefficient import NamedCoefficient
from haarloom.actions.parameters import Field, Values, free_parameters
from haarloom.actions.torus_site import Point, TorusSite, each_point
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.products import multiply
from haarloom.exceptions import GroupError

__all__ = ["SiteProduct", "product_of"]

_FACTORS = Field("factors", "weights", "", "site weights that multiply")


def product_of(*sites: Site) -> SiteProduct:
    """The product of site weights of one group; products inside are opened."""
    opened = [
        factor for site in sites for factor in (site.sites if isinstance(site, SiteProduct) else (site,))
    ]
    groups = {site.group for site in opened}
    if len(groups) > 1:
        names = " and ".join(sorted(map(str, groups)))
        raise GroupError(f"Site weights of {names} cannot be multiplied; build both on the same group.")
    return SiteProduct(opened[0].group, tuple(opened))


@dataclass(frozen=True)
class SiteProduct(TorusSite):
    """∏ W_i(P). Exact where at most one factor is infinite; see `product_of`."""

    group: SU
    sites: tuple[Site, ...]

    kind: ClassVar[str] = "product"
    FIELDS: ClassVar[tuple[Field, ...]] = (_FACTORS,)

    @property
    def parameters(self) -> tuple[Any, ...]:
        """Free symbols of all factors."""
        return free_parameters(symbol for site in self.sites for symbol in site.parameters)

    def describe(self) -> dict[str, Any]:
        """Kind and the description of each factor."""
        return {"kind": self.kind, "factors": [site.describe() for site in self.sites]}

    @property
    def finite(self) -> bool:  # type: ignore[override]
        """True if every factor is finite."""
        return all(site.finite for site in self.sites)

    @property
    def bounds_proven(self) -> bool:  # type: ignore[override]
        """True if the bounds of every factor are."""
        return all(site.bounds_proven for site in self.sites)

    @property
    def accuracy(self) -> str:  # type: ignore[override]
        """That of each factor."""
        return " ".join(dict.fromkeys(site.accuracy for site in self.sites))

    @property
    def factors(self) -> tuple[Factor, ...] | None:
        """Factors over the eigenvalues of P, if every site weight has them."""
        parts = [getattr(site, "factors", None) for site in self.sites]
        if any(part is None for part in parts):
            return None
        return tuple(factor for part in parts if part is not None for factor in part)

    def class_function(self) -> ClassFunction:
        """The exact product, if every factor is finite."""
        if not self.finite:
            return super().class_function()
        result = self.sites[0].class_function()
        for site in self.sites[1:]:
            result = result * site.class_function()
        return result

    def character_factors(self) -> tuple[CharacterFactor, ...]:
        """Those of all factors; finite ones are multiplied out."""
        return merged_factors([factor for site in self.sites for factor in site.character_factors()])

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact w_c; with one infinite factor a finite sum over it, with more a named coefficient."""
        if self.finite:
            return self.class_function()[irrep]
        infinite = [site for site in self.sites if not site.finite]
        if len(infinite) > 1:
            return NamedCoefficient.of(self, irrep)
        total = S.Zero
        finite = _finite_part([site for site in self.sites if site.finite])
        for factor, value in finite.coefficients.items():
            # N_{a c'}^c = N_{ā c}^{c'}: the irreps of the infinite factor that reach c by way of a
            for labels, count in multiply(factor.conjugate.labels, irrep.labels).items():
                total += count * value * infinite[0].coefficient(self.group.irrep(*labels))
        return total

    def support(self) -> tuple[Irrep, ...]:
        """Irreps of the exact product."""
        return tuple(self.class_function())

    def reach(self, values: Values) -> int | None:
        """The reaches of the factors add."""
        reaches = [site.reach(values) for site in self.sites]
        return None if None in reaches else sum(reach for reach in reaches if reach is not None)

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """w_c by Toeplitz determinants if all factors allow it, else from exact ones or the torus."""
        if irreps and self.factors:
            return multiplicative_coefficients(self.factors, irreps, values)
        if self.finite:
            return Site.coefficients_at(self, irreps, values)
        return super().coefficients_at(irreps, values)

    def norm_bound(self, values: Values) -> NDArray[Any]:
        """Product of the bounds of the factors."""
        return np.asarray(np.prod(np.broadcast_arrays(*[s.norm_bound(values) for s in self.sites]), axis=0))

    def tail_bound(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Σ |w_c| d_c beyond the cutoff.

        Labels that sum to more than the cutoff need one factor beyond its share of it. With Σ|w|d
        submultiplicative, Σ_i tail_i(share_i) ∏_{j≠i} S_j, S_j = Σ |w_c| d_c of factor j. As good as the
        tails of the factors.
        """
        if self.finite:
            return Site.tail_bound(self, cutoff, values)
        sums = [_absolute_sum(site, values) for site in self.sites]
        taken = sum(site.reach(values) or 0 for site in self.sites if site.finite)
        if cutoff < taken:
            return np.asarray(np.prod(np.broadcast_arrays(*sums), axis=0))
        share = (cutoff - taken) // sum(not site.finite for site in self.sites)
        shares = [share if not site.finite else (site.reach(values) or 0) for site in self.sites]
        total = np.zeros(())
        for i, site in enumerate(self.sites):
            others = [s for j, s in enumerate(sums) if j != i]
            total = total + site.tail_bound(shares[i], values) * np.prod(np.broadcast_arrays(*others), axis=0)
        return np.asarray(total)

    def density_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """Product of the densities of the factors."""
        result = self.sites[0].density_at(angles, values)
        for site in self.sites[1:]:
            result = result * site.density_at(angles, values)
        return np.asarray(result)

    def latex(self) -> str:
        """The factors' formulas side by side."""
        bodies = [site.latex().removeprefix("W(P)=") for site in self.sites]
        return "W(P)=" + r"\,".join(rf"\left[{body}\right]" for body in bodies)


def _finite_part(sites: Sequence[Site]) -> ClassFunction:
    result = sites[0].class_function()
    for site in sites[1:]:
        result = result * site.class_function()
    return result


def _absolute_sum(site: Site, values: Values) -> NDArray[Any]:
    """Upper bound of Σ_c |w_c| d_c at each point of parameter space."""
    shape, points = each_point(site, values)
    return np.array([_absolute_sum_at(site, point) for point in points]).reshape(shape)


@lru_cache(maxsize=256)
def _absolute_sum_at(site: Site, point: Point) -> float:
    """Low shells summed, the tail added."""
    values = dict(point)
    cutoff = 2 * site.group.n
    irreps = site.group.irreps(cutoff)
    w, error = site.coefficients_at(irreps, values)
    dimensions = np.array([float(irrep.dimension) for irrep in irreps])
    return float(((np.abs(w) + error) * dimensions).sum() + site.tail_bound(cutoff, values))
