"""Which solver: dense for small bases and for links that mix irreps, Krylov beyond."""

from __future__ import annotations

from haarloom.numerics.dense import EigenSystem, solve_dense
from haarloom.numerics.krylov import solve_krylov
from haarloom.numerics.site_action import FusionAction, TorusAction
from haarloom.numerics.truncation import Truncation

__all__ = ["DENSE_LIMIT", "solve"]

DENSE_LIMIT = 160
"""Largest basis that is solved densely: from there on LAPACK takes longer than ARPACK (measured)."""


def solve(truncation: Truncation, levels: int) -> EigenSystem:
    """At least ``levels`` leading eigenvalues of T inside the basis."""
    mixed = not isinstance(truncation.action, FusionAction | TorusAction)
    if mixed or truncation.size <= max(DENSE_LIMIT, 4 * levels):
        return solve_dense(truncation)
    return solve_krylov(truncation, levels)
