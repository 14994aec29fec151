"""Invariant subspaces known beforehand: parts of the pattern, and the two parities under conjugation."""

from __future__ import annotations

from itertools import pairwise
from math import gcd
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.labels import label_array
from haarloom.numerics.site_action import FusionAction
from haarloom.numerics.truncation import Truncation

__all__ = ["component_labels", "sectors"]

MIXED = 2000
"""Largest basis of a link that mixes irreps whose pattern is looked at element by element."""


def component_labels(truncation: Truncation) -> tuple[int, NDArray[np.int64]]:
    """Number of parts that T does not connect, and the part of each irrep, shape (n,).

    An irrep with k_r = 0 is a part of its own. Read off the pattern where there is one; else from the
    N-alities that W carries.
    """
    from scipy import sparse
    from scipy.sparse.csgraph import connected_components

    action, size = truncation.action, truncation.size
    if isinstance(action, FusionAction):
        alive = truncation.root > 0
        kept = (action.rows < size) & (action.elements != 0) & alive[action.rows] & alive[action.columns]
        places = (action.rows[kept], action.columns[kept])
        pattern = sparse.csr_array((np.ones(int(kept.sum())), places), shape=(size, size))
        parts, labels = connected_components(pattern, directed=True, connection="strong")
        return int(parts), np.asarray(labels, dtype=np.int64)
    if not truncation.mirrored and truncation.size <= MIXED:
        parts, labels = connected_components(truncation.dense != 0, directed=True, connection="strong")
        return int(parts), np.asarray(labels, dtype=np.int64)
    irreps, weights, errors = truncation.site
    order = truncation.rank + 1
    step = gcd(
        order,
        *(irrep.nality for irrep, w, error in zip(irreps, weights, errors, strict=True) if abs(w) > error),
    )
    labels = label_array(truncation.rank, truncation.cutoff)
    classes, part = np.unique(labels @ np.arange(1, order) % step, return_inverse=True)
    return len(classes), np.asarray(part, dtype=np.int64)


def sectors(truncation: Truncation) -> list[Any]:
    """Isometries (n, m), SciPy CSC arrays, onto subspaces that T leaves invariant; they add up to the whole.

    Irreps r and r̄ in one connected part are combined to r ± r̄ where T commutes with conjugation.
    """
    from scipy import sparse

    parts, labels = component_labels(truncation)
    mirror = truncation.conjugate[: truncation.size]
    split = truncation.mirrored and truncation.self_conjugate
    order = np.argsort(labels, kind="stable")
    bounds = np.searchsorted(labels[order], np.arange(parts + 1))
    found = []
    for start, stop in pairwise(bounds.tolist()):
        members = order[start:stop]
        if split and labels[mirror[members[0]]] == labels[members[0]]:
            found += _parities(members, mirror, truncation.size)
        else:
            places = (members, np.arange(len(members)))
            found.append(
                sparse.csc_array((np.ones(len(members)), places), shape=(truncation.size, len(members)))
            )
    return found


def _parities(members: NDArray[np.int64], mirror: NDArray[np.int64], size: int) -> list[Any]:
    from scipy import sparse

    fixed = members[mirror[members] == members]
    first = members[mirror[members] > members]
    pairs, half = len(first), np.sqrt(0.5)
    rows = np.concatenate([first, mirror[first], fixed])
    columns = np.concatenate([np.arange(pairs), np.arange(pairs), pairs + np.arange(len(fixed))])
    data = np.concatenate([np.full(2 * pairs, half), np.ones(len(fixed))])
    even = sparse.csc_array((data, (rows, columns)), shape=(size, pairs + len(fixed)))
    if not pairs:
        return [even]
    data = np.concatenate([np.full(pairs, half), np.full(pairs, -half)])
    odd = sparse.csc_array((data, (rows[: 2 * pairs], columns[: 2 * pairs])), shape=(size, pairs))
    return [even, odd]
