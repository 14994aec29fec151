"""Multiplication by a class function in the character basis, as index arrays.

A class function is a sum over weights, and a weight ω acts on a character by reflection: s + ρ goes
to s + ω + ρ, and the Weyl reflection that makes this dominant gives the sign (G. Racah and
D. Speiser, *Fortschr. Phys.* 12 (1964) 1). Weights of one Weyl orbit share their coefficient, so that
⟨r|W|s⟩ = Σ_c w_c N_{cs}^r is a product of two integer matrices: multiplicities of orbits in each χ_c,
and what each orbit does to the irreps. Labels shift by the few weights of a finite W: the matrix is
banded in the labels, and building it costs a constant for each irrep.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from itertools import permutations
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to, rows_from_labels
from haarloom.numerics.labels import label_array, positions

if TYPE_CHECKING:
    from haarloom.algebra.irrep import Irrep

__all__ = [
    "FusionPattern",
    "count_weights",
    "fusion_pattern",
    "reflection_signs",
    "strict_rows",
    "weight_orbit",
]

CHUNK = 1_000_000
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
        SciPy CSR array, float64, shape (C, m): N_{cs}^r for each irrep c of the support. Exact:
        multiplicities are far below 2^53.
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
    from scipy import sparse

    size, outer_size = count_up_to(rank, cutoff), count_up_to(rank, outer)
    orbits, multiplicity = _orbits(support)
    keys: list[NDArray[np.int64]] = []
    values: list[NDArray[np.int64]] = []
    owners: list[NDArray[np.int64]] = []
    for owner, orbit in enumerate(orbits):
        for rows, columns, signs in _shifted(weight_orbit(orbit), rank, cutoff, outer):
            keys.append(rows * size + columns)
            values.append(signs)
            owners.append(np.full(len(rows), owner))
    places, where = np.unique(np.concatenate([*keys, np.zeros(0, np.int64)]), return_inverse=True)
    entries = np.concatenate([*values, np.zeros(0)]).astype(float)
    owned = np.concatenate([*owners, np.zeros(0, np.int64)])
    actions = sparse.csr_array((entries, (owned, where)), shape=(len(orbits), len(places)))
    components = (multiplicity @ actions).tocsc()
    components.eliminate_zeros()
    kept = np.flatnonzero(np.diff(components.indptr))
    rows, columns = np.divmod(places[kept], size)
    return FusionPattern(size, outer_size, rows, columns, components[:, kept].tocsr())


@lru_cache(maxsize=64)
def count_weights(support: tuple[Irrep, ...]) -> int:
    """Number of distinct weights of all irreps of a support: elements in a row of W, far from the walls."""
    return sum(len(weight_orbit(orbit)) for orbit in _orbits(support)[0])


@lru_cache(maxsize=64)
def _orbits(support: tuple[Irrep, ...]) -> tuple[list[tuple[int, ...]], Any]:
    """Dominant weights that occur, and their multiplicities in each irrep: SciPy CSR array (C, orbits)."""
    from scipy import sparse

    systems = [irrep.dominant_weights() for irrep in support]
    orbits = sorted({weight for system in systems for weight in system})
    number = {weight: place for place, weight in enumerate(orbits)}
    entries = [(c, number[w], count) for c, system in enumerate(systems) for w, count in system.items()]
    rows, columns, counts = (
        (np.array(list(column)) for column in zip(*entries, strict=True)) if entries else ([],) * 3
    )
    shape = (len(support), len(orbits))
    return orbits, sparse.csr_array((np.asarray(counts, dtype=float), (rows, columns)), shape=shape)


@lru_cache(maxsize=4096)
def weight_orbit(weight: tuple[int, ...]) -> NDArray[np.int64]:
    """All images of a dominant weight under permutations, as rows of N integers: shape (size, N)."""
    images = np.array(sorted(set(permutations(rows_from_labels(weight)))), dtype=np.int64)
    images.flags.writeable = False
    return images


def _shifted(
    weights: NDArray[np.int64], rank: int, cutoff: int, outer: int
) -> Iterator[tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.int64]]]:
    """(bra rows, ket columns, signs) of all weights acting on all kets, in chunks."""
    kets = strict_rows(label_array(rank, cutoff) + 1)
    step = max(1, CHUNK // len(kets))
    for start in range(0, len(weights), step):
        moved = (weights[start : start + step, None, :] + kets[None, :, :]).reshape(-1, rank + 1)
        signs = reflection_signs(moved)
        alive = np.flatnonzero(signs)
        ordered = -np.sort(-moved[alive], axis=1)
        rows = positions(ordered[:, :-1] - ordered[:, 1:] - 1, outer)
        found = rows >= 0
        alive = alive[found]
        yield rows[found], alive % len(kets), signs[alive]


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
