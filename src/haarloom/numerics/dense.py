"""All eigenvalues and vectors of a small T, by LAPACK."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.ordering import spectral_order
from haarloom.numerics.truncation import Truncation

__all__ = ["EigenSystem", "biorthogonal", "solve_dense"]


@dataclass(frozen=True, eq=False)
class EigenSystem:
    """Eigenvalues with right and left vectors, yᵢᵀ xⱼ = δᵢⱼ.

    Attributes
    ----------
    values
        Shape (m,), in spectral order.
    right, left
        Shape (n, m); columns, right ones of unit norm.
    residual
        ‖T x − λ x‖ for each, shape (m,).
    rest
        Estimate of the largest |λ| of the levels left out; 0 where m = n.
    solver
        ``"dense"`` or the name of what else found them.
    """

    values: NDArray[Any]
    right: NDArray[Any]
    left: NDArray[Any]
    residual: NDArray[np.float64]
    rest: float
    solver: str

    @property
    def condition(self) -> NDArray[np.float64]:
        """κ = ‖x‖ ‖y‖ ≥ 1 of each eigenvalue: 1 where T is normal, infinite at an exceptional point."""
        return np.asarray(np.linalg.norm(self.right, axis=0) * np.linalg.norm(self.left, axis=0))


def solve_dense(truncation: Truncation) -> EigenSystem:
    """Every eigenvalue of T inside the basis.

    A Hermitian T goes to the symmetric solver, so that its eigenvalues come out real.
    """
    matrix = truncation.dense
    if truncation.hermitian:
        values, right = np.linalg.eigh(matrix)
        order = spectral_order(values)
        values, right = values[order], right[:, order]
        left = right.conj()
    else:
        values, right = np.linalg.eig(matrix)
        order = spectral_order(values)
        values, right = values[order], right[:, order]
        left = biorthogonal(right)
    residual = np.linalg.norm(matrix @ right - right * values, axis=0)
    return EigenSystem(values, right, left, residual, 0.0, "dense")


def biorthogonal(right: NDArray[Any]) -> NDArray[Any]:
    """Columns y with yᵢᵀ xⱼ = δᵢⱼ: the inverse, transposed; least squares where vectors coalesce.

    Parameters
    ----------
    right
        Shape (..., n, n).
    """
    try:
        inverse = np.linalg.inv(right)
    except np.linalg.LinAlgError:
        inverse = np.linalg.pinv(right)
    return np.asarray(np.swapaxes(inverse, -1, -2))
