"""T at one parameter point, cut at Σ a_i ≤ K: the block inside, what couples it outwards, norms outside.

With K^{1/2} = S and signs (or phases) Φ of k, the engine works on S W S Φ: it is similar to
K^{1/2} W K^{1/2}, equals it where all k_r ≥ 0, and stays real where some k_r < 0.

Conjugation J (irrep ↔ conjugate) gives N_{cs}^r = N_{c r̄}^{s̄}, hence J W J = Wᵀ for every class
function W. If also k_r̄ = k_r, a right eigenvector x has the left eigenvector Φ J x (no complex
conjugation), so that left vectors cost nothing.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property, lru_cache
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.exceptions import ConvergenceError
from haarloom.numerics.fusion import count_weights
from haarloom.numerics.labels import conjugation
from haarloom.numerics.link_numbers import link_coefficients
from haarloom.numerics.site_action import FusionAction, SiteAction, torus_action
from haarloom.numerics.site_components import negligible_beyond, outward_reach, site_components

if TYPE_CHECKING:
    from haarloom.actions.protocols import SiteWeight
    from haarloom.algebra.irrep import Irrep
    from haarloom.ring.model import RingModel

__all__ = ["EPS", "Truncation", "character_errors", "input_errors", "phase_of", "site_numbers", "truncate"]

EPS = float(np.finfo(float).eps)

TRANSFORM_COST = 8.0
"""Elements of a sparse matrix that cost as much as one grid point and one level of a transform (measured)."""

TRANSFORM_ROUNDING = 32 * EPS
"""‖δW‖/‖W‖ when W is applied by transforms: rounding, and characters that wrap around the grid."""

LAPACK_SCALE = 1000
"""Largest basis whose rounding is measured by the Frobenius norm, as LAPACK's error bounds are."""


@dataclass(frozen=True, eq=False)
class Truncation:
    """One point, one basis.

    Attributes
    ----------
    rank, cutoff, size, outer
        N − 1; K; number n of irreps inside; Σ a_i up to which the coupling outwards is explicit.
    root, phase
        S and Φ on all bras up to ``outer``; the first n entries are the basis.
    action
        W as a map from the basis to the bras up to ``outer``.
    site
        (irreps c, w_c, errors) that decide about signs and symmetry of W.
    norm, outside, tail, outside_far
        Bounds of ‖W‖; of |k_r| beyond the basis; of the part of W that couples beyond ``outer``;
        of |k_r| beyond ``outer``.
    input_error
        Bound of ‖δT‖ from the stated errors of k_r and w_c.
    """

    rank: int
    cutoff: int
    size: int
    outer: int
    root: NDArray[np.float64]
    phase: NDArray[Any]
    action: SiteAction
    site: tuple[tuple[Irrep, ...], NDArray[Any], NDArray[np.float64]]
    norm: float
    outside: float
    tail: float
    outside_far: float
    input_error: float

    @cached_property
    def conjugate(self) -> NDArray[np.int64]:
        """J on all bras: row of the conjugate irrep."""
        return conjugation(self.rank, self.outer)

    @cached_property
    def mirrored(self) -> bool:
        """Whether k_r̄ = k_r, so that left eigenvectors are Φ J times right ones."""
        weight = self.root * self.root * self.phase
        change = np.abs(weight[self.conjugate] - weight)
        return bool((change <= 8 * EPS * np.abs(weight)).all())

    @property
    def real(self) -> bool:
        """Whether T is real in this basis (CK invariance)."""
        return not (np.iscomplexobj(self.site[1]) or np.iscomplexobj(self.phase))

    @property
    def nonnegative(self) -> bool:
        """Whether no element of T is negative, up to the stated errors of w_c: fusion numbers count."""
        _, weights, errors = self.site
        return self.real and bool((weights >= -errors).all()) and bool((self.phase > 0).all())

    @cached_property
    def self_conjugate(self) -> bool:
        """Whether w_c̄ = w_c, so that W commutes with J."""
        return self._site_matches(np.asarray)

    @cached_property
    def hermitian(self) -> bool:
        """Whether T is Hermitian up to rounding: k_r ≥ 0 and w_c̄ the complex conjugate of w_c."""
        positive = not np.iscomplexobj(self.phase) and bool((self.phase > 0).all())
        return positive and self._site_matches(np.conj)

    def _site_matches(self, image: Any) -> bool:
        irreps, weights, errors = self.site
        known = dict(zip(irreps, weights, strict=True))
        mirror = np.array([known.get(irrep.conjugate, 0.0) for irrep in irreps])
        return bool((np.abs(image(mirror) - weights) <= 8 * EPS * np.abs(weights) + 2 * errors).all())

    @cached_property
    def sparse(self) -> Any:
        """T inside the basis as a SciPy CSR array, shape (n, n); only for an action by fusion."""
        from scipy import sparse

        assert isinstance(self.action, FusionAction)
        kept = self.action.rows < self.size
        rows, columns = self.action.rows[kept], self.action.columns[kept]
        data = self.root[rows] * self.action.elements[kept] * (self.root * self.phase)[columns]
        return sparse.csr_array((data, (rows, columns)), shape=(self.size, self.size))

    @cached_property
    def dense(self) -> NDArray[Any]:
        """T inside the basis, shape (n, n)."""
        if isinstance(self.action, FusionAction):
            return np.asarray(self.sparse.toarray())
        return self.apply(np.eye(self.size))

    def apply(self, vectors: NDArray[Any]) -> NDArray[Any]:
        """T on columns inside the basis, shape (n, m) or (n,)."""
        if isinstance(self.action, FusionAction):
            return np.asarray(self.sparse @ vectors)
        ladder = (slice(None),) + (None,) * (vectors.ndim - 1)
        root, phase = self.root[: self.size][ladder], self.phase[: self.size][ladder]
        return np.asarray(root * self.action.apply(root * phase * vectors)[: self.size])

    def dual(self, vectors: NDArray[Any]) -> NDArray[Any]:
        """Φ J x for columns x: a left eigenvector for a right one where ``mirrored``."""
        inside = slice(None, self.size)
        return np.asarray(self.phase[inside, None] * vectors[self.conjugate[inside]])

    @property
    def strength(self) -> float:
        """Bound of ‖T‖."""
        return self.norm * float(self.root.max() ** 2)

    @cached_property
    def noise(self) -> float:
        """‖δT‖ from rounding inside an eigen-solver and from the errors of the coefficients."""
        if isinstance(self.action, FusionAction):
            # large bases go to Krylov methods, whose rounding follows the norm
            size = self.strength if self.size > LAPACK_SCALE else float(np.linalg.norm(self.dense))
        else:
            size = 2 * self.strength
        return 8 * EPS * size + self.input_error

    @property
    def outer_norm(self) -> float:
        """Bound of the norm of T beyond the basis: ‖W‖ times the largest |k_r| there."""
        return self.norm * self.outside

    def coupling(self, right: NDArray[Any], left: NDArray[Any]) -> tuple[NDArray[Any], NDArray[Any]]:
        """‖C x‖ and ‖yᵀ B‖ for columns x, y: how strongly vectors couple to what was cut off.

        Parameters
        ----------
        right, left
            Shape (n, m).

        Returns
        -------
        Two arrays of shape (m,): norms of C x = P_out T x and of yᵀ B = yᵀ T P_out.
        """
        root, phase = self.root[: self.size, None], self.phase[: self.size, None]
        beyond = self.root[self.size :, None]
        mirror_beyond = self.conjugate[self.size :] - self.size
        dressed = root * phase * right
        # yᵀ S W between inside bras and outside kets is J (W outwards) J, transposed
        mirrored = (root * left)[self.conjugate[: self.size]]
        both = self.action.apply(np.concatenate([dressed, mirrored], axis=1))[self.size :]
        count = right.shape[1]
        upwards = beyond * both[:, :count]
        downwards = beyond * both[mirror_beyond, count:]
        rest = self.tail * np.sqrt(self.outside_far)
        return (
            np.linalg.norm(upwards, axis=0) + rest * np.linalg.norm(dressed, axis=0),
            np.linalg.norm(downwards, axis=0) + rest * np.linalg.norm(mirrored, axis=0),
        )

    @cached_property
    def rim_norm(self) -> float:
        """Bound of ‖B‖ and ‖C‖: ‖W‖ √(k_rim k_out); the rim are the irreps that W takes out of the basis."""
        rim = self.root[count_up_to(self.rank, self.cutoff - (self.outer - self.cutoff)) : self.size]
        edge = float(np.max(rim, initial=0.0)) * np.sqrt(self.outside)
        return self.norm * edge + self.tail * float(self.root.max()) * np.sqrt(self.outside_far)


def truncate(model: RingModel, cutoff: int, values: Mapping[str, Any]) -> Truncation:
    """Numbers of T at one point on the irreps with Σ a_i ≤ cutoff.

    Parameters
    ----------
    values
        One number for each parameter, already checked.

    Raises
    ------
    ConvergenceError
        If a coefficient comes out infinite or not a number.
    """
    if not model.link.diagonal:
        from haarloom.numerics.kernel_truncation import truncate_kernel

        return truncate_kernel(model, cutoff, values)
    link, site, rank = model.link, model.site, model.group.rank
    outer = cutoff + outward_reach(site, cutoff, values)
    k, k_errors = link_coefficients(link, outer, values)
    support, weights, weight_errors = site_numbers(site, values)
    for name, numbers in (("w_c", weights), ("k_r", k)):
        if not np.isfinite(numbers).all():
            raise ConvergenceError(
                f"{name} is not finite at {dict(values)} (cutoff {cutoff}): "
                "the weight diverges there; move the parameters into its domain."
            )
    root = np.sqrt(np.abs(k))
    norm = float(np.max(site.norm_bound(values)))
    action = _site_action(site, values, cutoff, outer, weights)
    # transforms start from the closed form of W: no coefficient enters, only rounding
    by_fusion = isinstance(action, FusionAction)
    site_error = character_errors(support, weight_errors) if by_fusion else TRANSFORM_ROUNDING * norm
    return Truncation(
        rank=rank,
        cutoff=cutoff,
        size=count_up_to(rank, cutoff),
        outer=outer,
        root=root,
        phase=phase_of(k),
        action=action,
        site=(support, weights, weight_errors),
        norm=norm,
        outside=float(np.max(link.largest_outside(cutoff, values))),
        tail=0.0 if site.finite else float(np.max(site.tail_bound(outer - cutoff, values))),
        outside_far=float(np.max(link.largest_outside(outer, values))),
        input_error=float(input_errors(site_error, norm, root, k_errors)),
    )


def input_errors(site_error: Any, norm: Any, root: NDArray[np.float64], k_errors: NDArray[np.float64]) -> Any:
    """Bound of ‖δ(S W S)‖ ≤ ‖S‖² ‖δW‖ + 2 ‖δS‖ ‖W‖ ‖S‖, with δS = δk/(2S); last axis of S the irreps."""
    shift = np.divide(k_errors, root, out=np.sqrt(k_errors), where=root > 0).max(axis=-1)
    largest = root.max(axis=-1)
    return largest**2 * site_error + shift * norm * largest


def character_errors(support: tuple[Irrep, ...], errors: NDArray[np.float64]) -> Any:
    """‖δW‖ ≤ Σ_c |δw_c| d_c from the errors of the coefficients, last axis the irreps."""
    return errors @ np.array([irrep.dimension for irrep in support], dtype=float)


def site_numbers(
    site: SiteWeight, values: Mapping[str, Any]
) -> tuple[tuple[Irrep, ...], NDArray[Any], NDArray[np.float64]]:
    """All w_c of a finite W; of an infinite one those that are not negligible. Kept for other cutoffs."""
    own = {symbol.name for symbol in site.parameters}
    point = tuple(sorted((name, np.asarray(value).item()) for name, value in values.items() if name in own))
    return _site_numbers(site, point)


@lru_cache(maxsize=32)
def _site_numbers(
    site: SiteWeight, point: tuple[tuple[str, complex], ...]
) -> tuple[tuple[Irrep, ...], NDArray[Any], NDArray[np.float64]]:
    values = dict(point)
    support = site.support() if site.finite else site.group.irreps(negligible_beyond(site, values, EPS))
    weights, errors = site.coefficients_at(support, values)
    return tuple(support), np.asarray(weights).reshape(-1), np.asarray(errors, dtype=float).reshape(-1)


def _site_action(
    site: SiteWeight, values: Mapping[str, Any], cutoff: int, outer: int, weights: NDArray[Any]
) -> SiteAction:
    """Fusion where its elements are few, transforms where they are many."""
    reach = negligible_beyond(site, values, EPS)
    rank = site.group.rank
    if site.finite:
        elements = count_up_to(rank, cutoff) * count_weights(tuple(site.support()))
        grid = (cutoff + outer + 2 * rank + reach + 1) ** rank
        if elements < TRANSFORM_COST * grid * np.log2(grid):
            components = site_components(site, cutoff, outer)
            pattern = components.pattern
            return FusionAction(
                pattern.size, pattern.outer_size, pattern.rows, pattern.columns, components.elements(weights)
            )
    return torus_action(site, values, cutoff, outer, not np.iscomplexobj(weights), reach)


def phase_of(k: NDArray[Any]) -> NDArray[Any]:
    """k/|k|, 1 where k = 0; real where k is."""
    if np.iscomplexobj(k):
        size = np.abs(k)
        return np.asarray(np.divide(k, size, out=np.ones_like(k), where=size > 0))
    return np.where(k < 0, -1.0, 1.0)
