"""Multiplication by a class function in the character basis, as index arrays.

χ_c χ_s = Σ_r N_{cs}^r χ_r with N from weight reflection: every weight ω of c sends s + ρ to
s + ω + ρ, and the Weyl reflection that makes this dominant gives the sign (G. Racah and D. Speiser,
*Fortschr. Phys.* 12 (1964) 1). Labels shift by the few weights of a finite W, so the matrix is
banded in the labels and building it costs a constant for each irrep.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from itertools import permutations
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.numerics.labels import label_array, positions

if TYPE_CHECKING:
    from haarloom.algebra.group import SU
    from haarloom.algebra.irrep import Irrep

__all__ = ["FusionPattern", "dense_fusion_pattern", "fusion_pattern", "reflection_signs", "strict_rows"]

CHUNK = 2_000_000
"""Most (weight, irrep) pairs reflected at once: bounds the scratch memory at about 200 MB."""


@dataclass(frozen=True, eq=False)
class FusionPattern:
    """Where ⟨r|χ_c|s⟩ is not zero, for kets s inside a cutoff and bras r inside a wider one.

    Attributes
    ----------
    size
        Number of kets n (Σ a_i ≤ cutoff). The first n bras are the same irreps.
    outer_size
        Number of bras.
    rows, columns
        int64, shape (m,): places of the non-zero elements, row by row.
    components
        float64, shape (C, m), an array or a SciPy CSR array: N_{cs}^r for each irrep c of the
        support. Exact: multiplicities are far below 2^53.
    """

    size: int
    outer_size: int
    rows: NDArray[np.int64]
    columns: NDArray[np.int64]
    components: Any

    def combined(self, coefficients: NDArray[Any]) -> NDArray[Any]:
        """Σ_c w_c N_{cs}^r at every place, from w of shape (..., C): shape (..., m)."""
        flat = coefficients.reshape(-1, coefficients.shape[-1])
        sums = np.asarray((self.components.T @ flat.T).T)
        return sums.reshape(*coefficients.shape[:-1], len(self.rows))

    def inside(self) -> FusionPattern:
        """The square part: bras inside the cutoff of the kets."""
        return self._part(self.rows < self.size)

    def outside(self) -> FusionPattern:
        """The part that couples kets to bras beyond the cutoff."""
        return self._part(self.rows >= self.size)

    def _part(self, kept: NDArray[np.bool_]) -> FusionPattern:
        return FusionPattern(
            self.size, self.outer_size, self.rows[kept], self.columns[kept], self.components[:, kept]
        )


@lru_cache(maxsize=24)
def fusion_pattern(support: tuple[Irrep, ...], rank: int, cutoff: int, outer: int) -> FusionPattern:
    """Elements ⟨r|χ_c|s⟩ for all c in ``support``, Σ s ≤ cutoff, Σ r ≤ outer.

    Parameters
    ----------
    support
        Irreps c whose characters make up W.
    rank
        N − 1.
    cutoff, outer
        Cutoffs of the kets and of the bras, cutoff ≤ outer.
    """
    size, outer_size = count_up_to(rank, cutoff), count_up_to(rank, outer)
    keys: list[NDArray[np.int64]] = []
    values: list[NDArray[np.float64]] = []
    owners: list[NDArray[np.int64]] = []
    for owner, irrep in enumerate(support):
        for rows, columns, counts in _shifted(irrep, rank, cutoff, outer):
            keys.append(rows * size + columns)
            values.append(counts)
            owners.append(np.full(len(rows), owner))
    if not keys:
        empty = np.zeros(0, dtype=np.int64)
        return FusionPattern(size, outer_size, empty, empty, np.zeros((len(support), 0)))
    places, where = np.unique(np.concatenate(keys), return_inverse=True)
    components = np.zeros((len(support), len(places)))
    np.add.at(components, (np.concatenate(owners), where), np.concatenate(values))
    kept = components.any(axis=0)
    rows, columns = np.divmod(places[kept], size)
    return FusionPattern(size, outer_size, rows, columns, components[:, kept])


def _shifted(
    irrep: Irrep, rank: int, cutoff: int, outer: int
) -> Iterator[tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.float64]]]:
    """(bra rows, ket columns, signed multiplicities) from all weights of one irrep, in chunks."""
    kets = strict_rows(label_array(rank, cutoff) + 1)
    system = irrep.weights()
    weights = strict_rows(np.array(list(system), dtype=np.int64).reshape(-1, rank))
    counts = np.array(list(system.values()), dtype=float)
    step = max(1, CHUNK // len(kets))
    for start in range(0, len(weights), step):
        part = slice(start, start + step)
        moved = (weights[part, None, :] + kets[None, :, :]).reshape(-1, rank + 1)
        signs = reflection_signs(moved)
        alive = np.flatnonzero(signs)
        ordered = -np.sort(-moved[alive], axis=1)
        rows = positions(ordered[:, :-1] - ordered[:, 1:] - 1, outer)
        found = rows >= 0
        alive = alive[found]
        yield rows[found], alive % len(kets), signs[alive] * counts[part][alive // len(kets)]


def strict_rows(labels: NDArray[np.int64]) -> NDArray[np.int64]:
    """Partition rows Σ_{j≥i} a_j with a last row 0: shape (m, N)."""
    rows = np.cumsum(labels[:, ::-1], axis=1)[:, ::-1]
    return np.column_stack([rows, np.zeros(len(rows), dtype=np.int64)])


def reflection_signs(rows: NDArray[np.int64]) -> NDArray[np.int64]:
    """Sign of the permutation that sorts each row downwards, 0 where two entries coincide."""
    signs = np.ones(len(rows), dtype=np.int64)
    width = rows.shape[1]
    for i in range(width):
        for j in range(i + 1, width):
            signs *= np.sign(rows[:, i] - rows[:, j])
    return signs


@lru_cache(maxsize=8)
def dense_fusion_pattern(group: SU, cutoff: int, outer: int) -> FusionPattern:
    """Elements ⟨r|χ_c|s⟩ for every c with Σ c ≤ cutoff + outer: all that can be non-zero.

    Uses the Fourier modes of χ_c on the maximal torus, its weights, and Weyl's integral formula
    ⟨r|f|s⟩ = Σ_σ sgn(σ) f̂(r + ρ − σ(s + ρ)): two sparse integer matrices, multiplied.
    """
    from scipy import sparse

    rank = group.rank
    size, outer_size = count_up_to(rank, cutoff), count_up_to(rank, outer)
    support = group.irreps(cutoff + outer)
    # r + ρ − σ(s + ρ) reaches at most 2(N − 1) beyond the irreps that matter
    modes = cutoff + outer + 2 * rank
    multiplicity = _mode_multiplicities(support, rank, modes)
    places = sparse.csr_array((count_up_to(rank, modes), outer_size * size))
    bras = strict_rows(label_array(rank, outer) + 1)
    kets = strict_rows(label_array(rank, cutoff) + 1)
    cells = np.arange(outer_size * size)
    for order in permutations(range(rank + 1)):
        sign = reflection_signs(-np.array([order]))[0]
        differences = (bras[:, None, :] - kets[None, :, list(order)]).reshape(-1, rank + 1)
        ordered = -np.sort(-differences, axis=1)
        mode = positions(ordered[:, :-1] - ordered[:, 1:], modes)
        kept = mode >= 0
        entries = (np.full(kept.sum(), float(sign)), (mode[kept], cells[kept]))
        places = places + sparse.csr_array(entries, shape=places.shape)
    product = (multiplicity @ places).tocsc()
    product.eliminate_zeros()
    filled = np.flatnonzero(np.diff(product.indptr))
    rows, columns = np.divmod(filled, size)
    return FusionPattern(size, outer_size, rows, columns, product[:, filled].tocsr())


def _mode_multiplicities(support: tuple[Irrep, ...], rank: int, modes: int) -> Any:
    """Multiplicity of each dominant weight in each irrep of the support: SciPy CSR array (C, modes)."""
    from scipy import sparse

    data: list[int] = []
    owners: list[int] = []
    weights: list[tuple[int, ...]] = []
    for owner, irrep in enumerate(support):
        for weight, count in irrep.weights().items():
            if min(weight) >= 0:
                data.append(count)
                owners.append(owner)
                weights.append(weight)
    columns = positions(np.array(weights, dtype=np.int64).reshape(-1, rank), modes)
    shape = (len(support), count_up_to(rank, modes))
    return sparse.csr_array((np.array(data, dtype=float), (owners, columns)), shape=shape)
