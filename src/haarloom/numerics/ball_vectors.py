"""Approximate eigenvectors of a ball matrix, each connected part by itself."""

from __future__ import annotations

from typing import Any

import flint
import numpy as np

from haarloom.numerics.ordering import spectral_order

__all__ = ["approximate_vectors"]


def approximate_vectors(matrix: Any) -> Any:
    """Eigenvectors of the mid-points in columns, in spectral order, an acb_mat without radii.

    No proof rests on their accuracy. A matrix that falls into parts is solved part by part, so that
    levels of different parts may coincide.
    """
    middle = matrix.mid()
    size = middle.nrows()
    columns: list[tuple[complex, list[int], Any, int]] = []
    for members in _parts(middle):
        block = flint.acb_mat(len(members), len(members), [middle[i, j] for i in members for j in members])
        values, vectors = block.eig(right=True, algorithm="approx")
        columns += [(_complex(value), members, vectors, column) for column, value in enumerate(values)]
    order = spectral_order(np.array([value for value, *_ in columns]))
    found = flint.acb_mat(size, size)
    for place, index in enumerate(order):
        _, members, vectors, column = columns[index]
        for row, member in enumerate(members):
            found[member, place] = vectors[row, column].mid()
    return found


def _parts(matrix: Any) -> list[list[int]]:
    from scipy import sparse
    from scipy.sparse.csgraph import connected_components

    pattern = np.array([[not entry.is_zero() for entry in row] for row in matrix.table()])
    count, labels = connected_components(sparse.csr_array(pattern), directed=True, connection="strong")
    return [np.flatnonzero(labels == part).tolist() for part in range(count)]


def _complex(value: Any) -> complex:
    return complex(float(value.real.mid()), float(value.imag.mid()))
