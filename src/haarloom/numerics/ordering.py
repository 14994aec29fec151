"""The order of levels, and their continuous labels along a path."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["clean_cut", "masses_from", "spectral_order"]

TIE = 1e-9
"""Moduli that agree to this relative accuracy count as equal when levels are ordered."""


def spectral_order(values: NDArray[Any]) -> NDArray[np.int64]:
    """Order by |λ| falling; equal moduli by Re λ falling, then Im λ rising.

    Im λ < 0 comes first because m = −ln λ then has Im m > 0.

    Parameters
    ----------
    values
        Levels on the last axis; every other axis is a batch.

    Returns
    -------
    int array of the same shape, for ``np.take_along_axis(values, order, axis=-1)``.
    """
    size = np.abs(values)
    first = np.argsort(-size, axis=-1, kind="stable")
    ordered = np.take_along_axis(size, first, axis=-1)
    # a new group starts where the modulus drops by more than the tie
    drops = ordered[..., 1:] < ordered[..., :-1] * (1 - TIE)
    group = np.concatenate([np.zeros_like(first[..., :1]), np.cumsum(drops, axis=-1)], axis=-1)
    members = np.take_along_axis(values, first, axis=-1)
    second = np.lexsort((np.imag(members), -np.real(members), group), axis=-1)
    return np.asarray(np.take_along_axis(first, second, axis=-1))


def masses_from(values: NDArray[Any]) -> NDArray[np.complex128]:
    """m_n = −ln(λ_n/λ_0) for n ≥ 1, last axis the level; Im m in (−π, π]. A vanishing λ gives Re m = ∞."""
    ratio = values[..., 1:].astype(complex) / values[..., :1]
    with np.errstate(divide="ignore"):
        masses = -np.log(np.abs(ratio)) - 1j * np.angle(ratio)
    masses.imag[masses.imag <= -np.pi] = np.pi
    masses.imag[masses.imag == 0] = 0.0
    return np.asarray(masses)


def clean_cut(values: NDArray[Any], levels: int, most: int) -> int:
    """A number of levels, at least ``levels``, after which |λ| drops most clearly.

    No degenerate or conjugate partner is left behind.

    Parameters
    ----------
    values
        In spectral order, shape (m,).
    most
        Largest number to return.
    """
    sizes = np.abs(values[: most + 1])
    if len(sizes) <= levels:
        return len(sizes)
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.nan_to_num(sizes[levels:] / sizes[levels - 1 : -1], nan=1.0)
    return levels + int(np.argmin(ratio))
