"""The basis as arrays of Dynkin labels: what the engine uses where a list of irreps would be slow.

The order is that of ``group.irreps(cutoff)``: by Σ a_i, then labels descending lexicographically.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

__all__ = ["conjugation", "label_array", "label_keys", "positions"]

Labels = NDArray[np.int64]


@lru_cache(maxsize=64)
def label_array(rank: int, cutoff: int) -> Labels:
    """Labels of every irrep with Σ a_i ≤ cutoff.

    Parameters
    ----------
    rank
        N − 1.
    cutoff
        K ≥ 0.

    Returns
    -------
    int64 array of shape (n, rank), read-only, in basis order.

    Examples
    --------
    >>> label_array(2, 1).tolist()
    [[0, 0], [1, 0], [0, 1]]
    """
    labels = np.zeros((1, 0), dtype=np.int64)
    left = np.array([cutoff], dtype=np.int64)
    for _ in range(rank):
        counts = left + 1
        starts = np.cumsum(counts) - counts
        entry = np.arange(counts.sum()) - np.repeat(starts, counts)
        labels = np.column_stack([np.repeat(labels, counts, axis=0), entry])
        left = np.repeat(left, counts) - entry
    order = np.lexsort((*(-labels[:, i] for i in reversed(range(rank))), labels.sum(axis=1)))
    labels = np.ascontiguousarray(labels[order])
    labels.flags.writeable = False
    return labels


def label_keys(labels: Labels, base: int) -> NDArray[np.int64]:
    """One integer for each row of labels, all of them below ``base``."""
    weights = np.array([base**i for i in range(labels.shape[-1])], dtype=np.int64)
    return np.asarray(labels @ weights, dtype=np.int64)


def positions(labels: Labels, cutoff: int) -> NDArray[np.int64]:
    """Row of each label tuple in ``label_array(rank, cutoff)``, −1 where the cutoff leaves it out.

    Parameters
    ----------
    labels
        Integers, shape (m, rank); rows with a negative entry count as left out.
    """
    rank = labels.shape[-1]
    inside = (labels >= 0).all(axis=-1) & (labels.sum(axis=-1) <= cutoff)
    keys, order = _sorted_keys(rank, cutoff)
    found = np.searchsorted(keys, label_keys(labels[inside], cutoff + 1))
    rows = np.full(len(labels), -1, dtype=np.int64)
    rows[inside] = order[found]
    return rows


@lru_cache(maxsize=64)
def _sorted_keys(rank: int, cutoff: int) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    keys = label_keys(label_array(rank, cutoff), cutoff + 1)
    order = np.argsort(keys)
    return keys[order], order


@lru_cache(maxsize=64)
def conjugation(rank: int, cutoff: int) -> NDArray[np.int64]:
    """Row of the conjugate irrep for each row of the basis (labels reversed)."""
    rows = positions(label_array(rank, cutoff)[:, ::-1], cutoff)
    rows.flags.writeable = False
    return rows
