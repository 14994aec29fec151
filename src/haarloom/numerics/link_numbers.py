"""Link coefficients k_r on a whole basis."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from haarloom.actions.protocols import LinkWeight

__all__ = ["link_coefficients", "link_coefficients_at"]


def link_coefficients(
    link: LinkWeight, cutoff: int, values: Mapping[str, Any]
) -> tuple[NDArray[Any], NDArray[np.float64]]:
    """k_r and their errors for Σ a_i ≤ cutoff at one point, each of shape (n,)."""
    k, errors = link_coefficients_at(link, cutoff, values)
    return k.reshape(-1), errors.reshape(-1)


def link_coefficients_at(
    link: LinkWeight, cutoff: int, values: Mapping[str, Any]
) -> tuple[NDArray[Any], NDArray[np.float64]]:
    """k_r and their errors for Σ a_i ≤ cutoff, each of shape (M, n), M = 1 where nothing varies."""
    k, errors = link.coefficients_at(link.group.irreps(cutoff), values)
    k = np.atleast_2d(np.asarray(k))
    return k, np.broadcast_to(np.asarray(errors, dtype=float), k.shape)
