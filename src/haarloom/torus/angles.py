"""Eigenphases on the maximal torus: the shapes that every function of this station accepts."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.exceptions import ParameterError

__all__ = ["full_angles"]

_TOLERANCE = 1e-9


def full_angles(n: int, angles: Any) -> NDArray[np.float64]:
    """All N eigenphases from N − 1 of them, or N checked ones.

    Parameters
    ----------
    n : int
        N of SU(N).
    angles : array of shape (..., N − 1) or (..., N)
        In radians. N of them must add up to 0 mod 2π.

    Returns
    -------
    ndarray of shape (..., N)

    Raises
    ------
    ParameterError
        For a wrong last axis, a wrong sum, or values that are no real numbers.
    """
    try:
        array = np.asarray(angles, dtype=np.float64)
    except (TypeError, ValueError):
        raise ParameterError(
            "angles are not an array of real numbers; give radians, last axis N − 1 or N."
        ) from None
    if not np.all(np.isfinite(array)):
        raise ParameterError("angles given that are not finite; give radians.")
    if array.ndim == 0 or array.shape[-1] not in (n - 1, n):
        raise ParameterError(
            f"angles of shape {array.shape} given; the last axis must hold {n - 1} eigenphases of "
            f"SU({n}), or all {n}."
        )
    total = array.sum(axis=-1, keepdims=True)
    if array.shape[-1] == n - 1:
        return np.concatenate([array, -total], axis=-1)
    excess = np.abs(total - 2 * np.pi * np.round(total / (2 * np.pi)))
    if np.any(excess > _TOLERANCE * (1 + np.abs(array).max(initial=0.0))):
        raise ParameterError(
            f"{n} eigenphases given whose sum misses 0 mod 2π by up to {excess.max():.2g}: det P must be 1; "
            f"give {n - 1} of them and the last follows."
        )
    return array
