"""Many points on one basis at once: dense matrices stacked along the first axis, and their errors.

The bound is that of :mod:`haarloom.numerics.bounds`, evaluated for all points together.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.numerics.dense import biorthogonal
from haarloom.numerics.labels import conjugation
from haarloom.numerics.link_numbers import link_coefficients_at
from haarloom.numerics.ordering import spectral_order
from haarloom.numerics.site_components import outward_reach, site_components
from haarloom.numerics.truncation import EPS, phase_of

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["BatchErrors", "TruncationBatch", "batch_errors", "truncate_batch"]


@dataclass(frozen=True, eq=False)
class TruncationBatch:
    """M points on the irreps with Σ a_i ≤ cutoff; notation of :class:`~haarloom.numerics.truncation.Truncation`.

    Attributes
    ----------
    matrix
        T inside, shape (M, n, n).
    upwards, downwards
        C (M, m, n) and Bᵀ (M, m, n): what couples to the m irreps of the shell beyond.
    norm, outside, rest, noise
        ‖W‖; |k| beyond the basis; what couples beyond the shell; η. Shape (M,) each.
    mirror, phase
        J on the basis, shape (n,); Φ, shape (M, n).
    mirrored
        Whether left vectors follow from right ones.
    """

    matrix: NDArray[Any]
    upwards: NDArray[Any]
    downwards: NDArray[Any]
    norm: NDArray[np.float64]
    outside: NDArray[np.float64]
    rest: NDArray[np.float64]
    noise: NDArray[np.float64]
    mirror: NDArray[np.int64]
    phase: NDArray[Any]
    mirrored: bool

    @property
    def real(self) -> bool:
        """Whether T is real at every point."""
        return not np.iscomplexobj(self.matrix)

    @cached_property
    def hermitian(self) -> NDArray[np.bool_]:
        """Whether T is Hermitian up to rounding, point by point, shape (M,)."""
        turned = np.conj(np.swapaxes(self.matrix, 1, 2))
        largest = np.abs(self.matrix).max(axis=(1, 2))
        return np.asarray(np.abs(self.matrix - turned).max(axis=(1, 2)) <= 8 * EPS * largest)

    def solved(self) -> tuple[NDArray[Any], NDArray[Any], NDArray[Any]]:
        """All eigenvalues (M, n) in spectral order, right and left vectors (M, n, n) in columns."""
        symmetric = bool(self.hermitian.all())
        if symmetric:
            values, right = np.linalg.eigh(self.matrix)
        else:
            values, right = np.linalg.eig(self.matrix)
        order = spectral_order(values)
        right = np.take_along_axis(right, order[:, None, :], axis=2)
        left = right.conj() if symmetric else biorthogonal(right)
        return np.take_along_axis(values, order, axis=1), right, left


def truncate_batch(model: RingModel, cutoff: int, values: Mapping[str, NDArray[Any]]) -> TruncationBatch:
    """Stack T at M points.

    Parameters
    ----------
    values
        Arrays of shape (M,) or (1,), already checked.
    """
    rank, points = model.group.rank, max((len(array) for array in values.values()), default=1)
    outer = cutoff + outward_reach(model.site, cutoff, values)
    size = count_up_to(rank, cutoff)
    components = site_components(model.site, cutoff, outer)
    weights, weight_errors = components.coefficients(values)
    k, k_errors = link_coefficients_at(model.link, outer, values)
    root, phase = np.sqrt(np.abs(k)), phase_of(k)
    pattern = components.pattern
    site = np.zeros((len(weights), pattern.outer_size * size), dtype=weights.dtype)
    site[:, pattern.rows * size + pattern.columns] = components.elements(weights)
    site = site.reshape(len(weights), pattern.outer_size, size)
    dressed = root[:, :, None] * site * (root * phase)[:, None, :size]
    mirror = conjugation(rank, outer)
    # row o of Bᵀ: √k_o Φ_o Σ_i W_{i o} √k_i with W_{io} = W_{ō ī}
    turned = site[:, mirror[size:], :][:, :, mirror[:size]]
    beyond = (root * phase)[:, size:, None]
    matrix = np.broadcast_to(dressed[:, :size], (points, size, size))
    norm = _flat(model.site.norm_bound(values))
    relative = np.divide(k_errors, np.abs(k), out=np.zeros(k.shape), where=k != 0).max(axis=1)
    dimensions = np.array([irrep.dimension for irrep in components.support], dtype=float)
    noise = 8 * EPS * np.linalg.norm(matrix, axis=(1, 2)) + np.abs(k).max(axis=1) * (
        weight_errors @ dimensions + relative * norm
    )
    tail = 0.0 if model.site.finite else _flat(model.site.tail_bound(outer - cutoff, values))
    far = _flat(model.link.largest_outside(outer, values))
    ones = np.ones(points)
    return TruncationBatch(
        matrix=matrix,
        upwards=dressed[:, size:],
        downwards=beyond * turned * root[:, None, :size],
        norm=norm * ones,
        outside=_flat(model.link.largest_outside(cutoff, values)) * ones,
        rest=tail * np.sqrt(far * np.abs(k).max(axis=1)) * ones,
        noise=noise * ones,
        mirror=mirror[:size],
        phase=phase[:, :size],
        mirrored=bool((np.abs(k[:, mirror] - k) <= 8 * EPS * np.abs(k)).all()),
    )


def _flat(numbers: Any) -> NDArray[np.float64]:
    return np.asarray(numbers, dtype=float).reshape(-1)


@dataclass(frozen=True, eq=False)
class BatchErrors:
    """Radii of the leading eigenvalues (M, L), infinite where the bound does not close, and all κ (M, m)."""

    radius: NDArray[np.float64]
    condition: NDArray[np.float64]


def batch_errors(
    batch: TruncationBatch,
    values: NDArray[Any],
    right: NDArray[Any],
    left: NDArray[Any],
    levels: int,
) -> BatchErrors:
    """Radius around each leading eigenvalue that holds one of the untruncated T.

    Parameters
    ----------
    values
        Shape (M, m).
    right, left
        Biorthonormal vectors in columns, shape (M, n, m).
    """
    size_right, size_left = (np.linalg.norm(vectors, axis=1) for vectors in (right, left))
    rest = batch.rest[:, None]
    up = np.linalg.norm(batch.upwards @ right, axis=1) + rest * size_right
    down = np.linalg.norm(batch.downwards @ left, axis=1) + rest * size_left
    noise = batch.noise[:, None]
    radius = np.full((len(values), levels), np.inf)
    for level in range(levels):
        centre = values[:, level]
        room = np.abs(centre) - batch.norm * batch.outside
        distance = np.abs(values - centre[:, None])
        start = np.zeros(len(values))
        for growth in (0.0, 1.0, 1.02, 2.0, 4.0, 16.0, 64.0):
            start, load = _load(start, growth, room, distance, level, (up, down, size_right, size_left), noise)
            closed = (load < 1) & (room > start) & ~np.isfinite(radius[:, level])
            radius[closed, level] = start[closed]
    return BatchErrors(radius, size_right * size_left)


def _load(
    radius: NDArray[np.float64],
    growth: float,
    room: NDArray[np.float64],
    distance: NDArray[np.float64],
    level: int,
    sizes: tuple[NDArray[np.float64], ...],
    noise: NDArray[np.float64],
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """The next radius to try, and the left side of the inequality there.

    Growth 0 starts from the level alone; 1 takes the other levels into account; more than 1 retries
    with a larger circle.
    """
    up, down, right, left = sizes
    with np.errstate(divide="ignore", invalid="ignore"):
        strength = _strength(room - radius, up, down, right, left, noise)
        if growth > 1:
            radius = radius * growth
        else:
            others = strength / np.abs(distance - radius[:, None])
            others[:, level] = 0.0
            crowd = np.clip(others.sum(axis=1), 0.0, 0.9)
            radius = np.maximum(1.02 * strength[:, level] / (1 - crowd), 1e-300)
        strength = _strength(room - radius, up, down, right, left, noise)
        load = (strength / np.abs(distance - radius[:, None])).sum(axis=1)
    return radius, np.where(np.isfinite(load), load, np.inf)


def _strength(
    margin: NDArray[np.float64],
    up: NDArray[np.float64],
    down: NDArray[np.float64],
    right: NDArray[np.float64],
    left: NDArray[np.float64],
    noise: NDArray[np.float64],
) -> NDArray[np.float64]:
    gain = np.where(margin > 0, 1 / margin, np.inf)[:, None]
    return np.asarray(np.sqrt((up**2 * gain + right**2 * noise) * (down**2 * gain + left**2 * noise)))
