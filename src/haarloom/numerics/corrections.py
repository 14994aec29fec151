"""One correction of approximate invariant subspaces, for many points at once.

For V near an invariant subspace of T, with left partner Y, B = (Yᵀ V)⁻¹ Yᵀ T V and R = T V − V B, the
bordered system

    [T − σ   V] [X]   [R]
    [ Yᵀ     0] [G] = [0],        σ = tr B / s,

gives V − X, whose error is that of V times the spread of the s levels over their distance to all others,
and of second order besides; the border keeps the matrix regular although σ is nearly an eigenvalue
(G. Peters, J. H. Wilkinson, *SIAM Rev.* 21 (1979) 339, inverse iteration as Newton's method).
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["corrected"]


def corrected(
    matrix: NDArray[Any],
    vectors: NDArray[Any],
    dual: tuple[NDArray[Any], NDArray[np.int64]],
    groups: Sequence[slice],
) -> NDArray[Any]:
    """Better bases of all groups.

    Parameters
    ----------
    matrix
        T, shape (M, n, n).
    vectors
        V of all groups in columns, shape (M, n, m).
    dual
        (Φ, J): the left partner of V is Φ · V[J]; Φ of shape (M, n).
    groups
        Slices of the m columns.

    Returns
    -------
    Shape (M, n, m); as given where some bordered matrix of the stack is singular.
    """
    phase, mirror = dual
    found = np.empty_like(vectors)
    for group in groups:
        basis = vectors[:, :, group]
        partner = np.swapaxes(phase[:, :, None] * basis[:, mirror], 1, 2)
        found[:, :, group] = basis - _correction(matrix, basis, partner)
    return found


def _correction(matrix: NDArray[Any], basis: NDArray[Any], partner: NDArray[Any]) -> NDArray[Any]:
    points, size, count = basis.shape
    image = matrix @ basis
    bordered = np.zeros((points, size + count, size + count), dtype=matrix.dtype)
    right = np.zeros((points, size + count, count), dtype=matrix.dtype)
    try:
        block = np.linalg.solve(partner @ basis, partner @ image)
        shift = np.trace(block, axis1=1, axis2=2) / count
        bordered[:, :size, :size] = matrix
        bordered[:, range(size), range(size)] -= shift[:, None]
        bordered[:, :size, size:] = basis
        bordered[:, size:, :size] = partner
        right[:, :size] = image - basis @ block
        return np.asarray(np.linalg.solve(bordered, right)[:, :size])
    except np.linalg.LinAlgError:
        # one singular point spoils the stack: none is corrected, and their residuals say so
        return np.zeros_like(basis)
