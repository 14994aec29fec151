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
from haarloom.numerics.truncation import EPS, character_errors, input_errors, phase_of

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["LevelSet", "TruncationBatch", "batch_errors", "complete_levels", "truncate_batch"]


@dataclass(frozen=True, eq=False)
class TruncationBatch:
    """M points on the irreps with Σ a_i ≤ cutoff, in the notation of :mod:`haarloom.numerics.truncation`.

    Attributes
    ----------
    matrix
        T inside, shape (M, n, n).
    whole, site
        S W S Φ and W with all bras up to the shell beyond, shapes (M, bras, n).
    root
        S on all bras, shape (M, bras).
    norm, outside, rest, rim, noise
        ‖W‖; |k| beyond the basis; what couples beyond the shell; bound of ‖B‖ and ‖C‖; η. Shape (M,).
    mirror, phase
        J on all bras, shape (bras,); Φ on them, shape (M, bras).
    mirrored
        Whether left vectors follow from right ones.
    """

    matrix: NDArray[Any]
    whole: NDArray[Any]
    site: NDArray[Any]
    root: NDArray[np.float64]
    norm: NDArray[np.float64]
    outside: NDArray[np.float64]
    rest: NDArray[np.float64]
    rim: NDArray[np.float64]
    noise: NDArray[np.float64]
    mirror: NDArray[np.int64]
    phase: NDArray[Any]
    mirrored: bool

    @property
    def size(self) -> int:
        """Number n of irreps inside."""
        return self.matrix.shape[1]

    @property
    def upwards(self) -> NDArray[Any]:
        """C, what couples to the irreps of the shell beyond, shape (M, m, n)."""
        return self.whole[:, self.size :]

    @cached_property
    def downwards(self) -> NDArray[Any]:
        """Bᵀ, shape (M, m, n): row o is √k_o Φ_o Σ_i W_{io} √k_i with W_{io} = W_{ō ī}."""
        size = self.size
        turned = self.site[:, self.mirror[size:], :][:, :, self.mirror[:size]]
        return np.asarray((self.root * self.phase)[:, size:, None] * turned * self.root[:, None, :size])

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
        values, right = np.linalg.eigh(self.matrix) if symmetric else np.linalg.eig(self.matrix)
        values, right = _in_order(values, right)
        return values, right, right.conj() if symmetric else biorthogonal(right)

    def leading(self, count: int) -> tuple[NDArray[Any], NDArray[Any]]:
        """The first ``count`` + 1 eigenvalues, and ``count`` right vectors."""
        values, right = np.linalg.eig(self.matrix)
        # ties at the end are settled among one more level
        first = np.argsort(-np.abs(values), axis=1)[:, : count + 1]
        values = np.take_along_axis(values, first, axis=1)
        order = spectral_order(values)
        columns = np.take_along_axis(first, order[:, :count], axis=1)
        return np.take_along_axis(values, order, axis=1), np.take_along_axis(right, columns[:, None], axis=2)


def _in_order(values: NDArray[Any], right: NDArray[Any]) -> tuple[NDArray[Any], NDArray[Any]]:
    order = spectral_order(values)
    vectors = np.take_along_axis(right, order[:, None, :], axis=2)
    return np.take_along_axis(values, order, axis=1), vectors


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
    matrix = np.broadcast_to(dressed[:, :size], (points, size, size))
    norm = _flat(model.site.norm_bound(values))
    noise = 8 * EPS * np.linalg.norm(matrix, axis=(1, 2)) + input_errors(
        character_errors(components.support, weight_errors), norm, root, k_errors
    )
    tail = 0.0 if model.site.finite else _flat(model.site.tail_bound(outer - cutoff, values))
    far = _flat(model.link.largest_outside(outer, values))
    outside = _flat(model.link.largest_outside(cutoff, values))
    edge = root[:, count_up_to(rank, 2 * cutoff - outer) : size].max(axis=1)
    rest = tail * np.sqrt(far) * root.max(axis=1)
    ones = np.ones(points)
    return TruncationBatch(
        matrix=matrix,
        whole=dressed,
        site=site,
        root=root,
        norm=norm * ones,
        outside=outside * ones,
        rest=rest * ones,
        rim=(norm * edge * np.sqrt(outside) + rest) * ones,
        noise=noise * ones,
        mirror=mirror,
        phase=phase,
        mirrored=bool((np.abs(k[:, mirror] - k) <= 8 * EPS * np.abs(k)).all()),
    )


def _flat(numbers: Any) -> NDArray[np.float64]:
    return np.asarray(numbers, dtype=float).reshape(-1)


@dataclass(frozen=True, eq=False)
class LevelSet:
    """Levels at M points with what the bound needs of each.

    Attributes
    ----------
    values
        Eigenvalues, shape (M, m).
    right, left
        Norms of the vectors, shape (M, m); their product is the condition number.
    upwards, downwards
        ‖C x‖ and ‖yᵀ B‖, shape (M, m).
    """

    values: NDArray[Any]
    right: NDArray[np.float64]
    left: NDArray[np.float64]
    upwards: NDArray[np.float64]
    downwards: NDArray[np.float64]


def complete_levels(
    batch: TruncationBatch, values: NDArray[Any], right: NDArray[Any], left: NDArray[Any]
) -> LevelSet:
    """The level set of biorthonormal vectors in columns, shape (M, n, m)."""
    sizes = [np.linalg.norm(vectors, axis=1) for vectors in (right, left)]
    beyond = batch.rest[:, None]
    up = np.linalg.norm(batch.upwards @ right, axis=1) + beyond * sizes[0]
    down = np.linalg.norm(batch.downwards @ left, axis=1) + beyond * sizes[1]
    return LevelSet(values, sizes[0], sizes[1], up, down)


def batch_errors(batch: TruncationBatch, found: LevelSet, levels: int) -> NDArray[np.float64]:
    """Radius around each leading eigenvalue that holds one of the untruncated T, shape (M, levels).

    Infinite where the bound does not close.
    """
    terms = _Terms.of(batch, found)
    radius = np.full((len(found.values), levels), np.inf)
    for level in range(levels):
        centre = found.values[:, level]
        room = np.abs(centre) - batch.norm * batch.outside
        distance = np.abs(found.values - centre[:, None])
        trial = np.zeros(len(centre))
        for growth in (0.0, 1.0, 1.02, 2.0, 8.0, 64.0):
            trial, load = terms.load(trial, growth, room, distance, level)
            closed = (load < 1) & (room > trial) & ~np.isfinite(radius[:, level])
            radius[closed, level] = trial[closed]
            if growth and np.isfinite(radius[:, level])[room > 0].all():
                break
    return radius


@dataclass(frozen=True, eq=False)
class _Terms:
    """Squares that make up the strength √(c² g + a) √(b² g + a′) of each level, g = 1/(|λ| − d)."""

    up: NDArray[np.float64]
    down: NDArray[np.float64]
    fixed_up: NDArray[np.float64]
    fixed_down: NDArray[np.float64]

    @classmethod
    def of(cls, batch: TruncationBatch, found: LevelSet) -> _Terms:
        noise = batch.noise[:, None]
        up, down = found.upwards**2, found.downwards**2
        fixed = [found.right**2 * noise, found.left**2 * noise]
        return cls(up, down, fixed[0], fixed[1])

    def strength(self, margin: NDArray[np.float64]) -> NDArray[np.float64]:
        gain = np.where(margin > 0, 1 / margin, np.inf)[:, None]
        return np.asarray(np.sqrt((self.up * gain + self.fixed_up) * (self.down * gain + self.fixed_down)))

    def load(
        self,
        radius: NDArray[np.float64],
        growth: float,
        room: NDArray[np.float64],
        distance: NDArray[np.float64],
        level: int,
    ) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """The next radius to try, and the left side of the inequality there.

        Growth 0 starts from the level alone; 1 takes the other levels into account; more than 1
        retries with a larger circle.
        """
        with np.errstate(divide="ignore", invalid="ignore"):
            if growth > 1:
                radius = radius * growth
            else:
                strength = self.strength(room - radius)
                others = strength / np.abs(distance - radius[:, None])
                others[:, level] = 0.0
                crowd = np.clip(others.sum(axis=1), 0.0, 0.9)
                radius = np.maximum(1.02 * strength[:, level] / (1 - crowd), 1e-300)
            load = (self.strength(room - radius) / np.abs(distance - radius[:, None])).sum(axis=1)
        return radius, np.where(np.isfinite(load), load, np.inf)
