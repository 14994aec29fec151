"""The site weight as numbers on index arrays: ⟨r|W|s⟩ = Σ_c w_c N_{cs}^r."""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.exceptions import ConvergenceError
from haarloom.numerics.fusion import FusionPattern, fusion_pattern

if TYPE_CHECKING:
    from haarloom.actions.protocols import SiteWeight
    from haarloom.algebra.irrep import Irrep

__all__ = ["SiteComponents", "negligible_beyond", "outward_reach", "site_components"]

TAIL = 1e-9
"""An infinite W counts as ending where the rest of its character sum is below this part of sup|W|."""

FARTHEST = 200
"""Most steps of Σ a_i that an infinite W is followed."""


@dataclass(frozen=True, eq=False)
class SiteComponents:
    """Irreps of W's expansion that matter on a basis, and where their fusion is not zero."""

    site: SiteWeight
    support: tuple[Irrep, ...]
    pattern: FusionPattern

    def coefficients(self, values: Mapping[str, Any]) -> tuple[NDArray[Any], NDArray[np.float64]]:
        """w_c and their errors, each of shape broadcast(values) + (C,)."""
        return self.site.coefficients_at(self.support, values)

    def elements(self, coefficients: NDArray[Any]) -> NDArray[Any]:
        """⟨r|W|s⟩ at the places of the pattern, shape (..., m)."""
        return self.pattern.combined(coefficients)


@lru_cache(maxsize=48)
def site_components(site: SiteWeight, cutoff: int, outer: int) -> SiteComponents:
    """Fusion of W between kets with Σ s ≤ cutoff and bras with Σ r ≤ outer.

    For an infinite W every irrep c with Σ c ≤ cutoff + outer enters: no other can connect a ket
    and a bra of these sets, so that nothing is cut off inside.
    """
    support = tuple(site.support() if site.finite else site.group.irreps(cutoff + outer))
    return SiteComponents(site, support, fusion_pattern(support, site.group.rank, cutoff, outer))


def outward_reach(site: SiteWeight, cutoff: int, values: Mapping[str, Any]) -> int:
    """How many steps of Σ a_i beyond the basis the coupling of W is followed.

    All of it for a finite W; for an infinite one as far as its tail is not negligible, at most as
    far again as the basis itself.
    """
    if site.finite:
        return negligible_beyond(site, values, 0.0)
    return min(negligible_beyond(site, values, TAIL), max(cutoff, 2))


def negligible_beyond(site: SiteWeight, values: Mapping[str, Any], part: float) -> int:
    """Σ c beyond which the characters of W add up to less than this part of sup|W|.

    Raises
    ------
    ConvergenceError
        If FARTHEST steps do not suffice.
    """
    reach = site.reach(values)
    if reach is not None:
        return int(reach)
    size = float(np.max(site.norm_bound(values)))

    def small(steps: int) -> bool:
        return float(np.max(site.tail_bound(steps, values))) <= part * size

    if not small(FARTHEST):
        raise ConvergenceError(
            f"the characters of the site weight do not die out by Σ a_i = {FARTHEST} at {_spans(values)}: "
            "its parameters are too close to the edge of their domain; move them inwards."
        )
    # Tails fall with the steps, and a product's may cost a transform each: halve instead of counting up.
    return bisect_left(range(1, FARTHEST), True, key=small) + 1


def _spans(values: Mapping[str, Any]) -> str:
    """Values for a message; of an array its smallest and largest."""
    texts = []
    for name, value in values.items():
        numbers = np.asarray(value).reshape(-1)
        ends = (numbers[0],) if numbers.size == 1 else (numbers.min(), numbers.max())
        texts.append(f"{name} = " + " … ".join(f"{end:.6g}" for end in ends))
    return ", ".join(texts)
