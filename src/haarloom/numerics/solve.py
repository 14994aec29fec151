"""Which solver: dense for small bases and for links that mix irreps, Krylov beyond."""

from __future__ import annotations

from haarloom.numerics.compile import check_memory
from haarloom.numerics.dense import EigenSystem, solve_dense
from haarloom.numerics.krylov import solve_krylov
from haarloom.numerics.site_action import FusionAction, TorusAction
from haarloom.numerics.truncation import Truncation

__all__ = ["DENSE_LIMIT", "solve"]

DENSE_LIMIT = 160
"""Largest basis that is solved densely: from there on LAPACK takes longer than ARPACK (measured)."""

KRYLOV_VECTORS = 6
"""Vectors in memory for each level wanted, in a Krylov solver."""


def solve(truncation: Truncation, levels: int) -> EigenSystem:
    """At least ``levels`` leading eigenvalues of T inside the basis.

    Raises
    ------
    SizeError
        If matrix or vectors would take more than 4 GB; the message says the size first.
    """
    mixed = not isinstance(truncation.action, FusionAction | TorusAction)
    if mixed or truncation.size <= max(DENSE_LIMIT, 4 * levels):
        check_memory(
            2 * truncation.size**2, f"{truncation.size:,} × {truncation.size:,} elements and vectors"
        )
        return solve_dense(truncation)
    check_memory(
        truncation.size * KRYLOV_VECTORS * levels, f"{levels:,} levels of {truncation.size:,} irreps"
    )
    return solve_krylov(truncation, levels)
