"""Real or complex: what the error of each level allows to say."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["COMPLEX", "PAIR", "REAL", "UNDECIDED", "VERDICTS", "verdict_codes", "verdict_words"]

REAL = "real"
PAIR = "complex pair"
COMPLEX = "complex"
UNDECIDED = "undecided"

VERDICTS = (REAL, PAIR, COMPLEX, UNDECIDED)
"""All verdicts; arrays of verdicts hold their positions here."""

_CODE = {word: np.int8(place) for place, word in enumerate(VERDICTS)}


def verdict_codes(
    values: NDArray[Any],
    errors: NDArray[np.float64],
    everything: NDArray[Any],
    real: bool,
    hermitian: bool | NDArray[np.bool_],
) -> NDArray[np.int8]:
    """One verdict for each level beyond λ_0.

    A disc that is centred on the real axis and holds one eigenvalue of a real T holds a real one:
    a complex one would bring its conjugate along.

    Parameters
    ----------
    values, errors
        Leading eigenvalues and radii, shape (..., L).
    everything
        All eigenvalues that were computed, shape (..., m), for the count inside each disc.
    real, hermitian
        Whether T is real, and whether (at each point of a batch) it is Hermitian.

    Returns
    -------
    Positions in ``VERDICTS``, shape (..., L − 1).
    """
    centres, radii = values[..., 1:], errors[..., 1:]
    off_axis = np.abs(np.imag(centres)) > radii
    symmetric = np.broadcast_to(np.asarray(hermitian)[..., None], centres.shape)
    if not real:
        # λ_0 itself may lie off the axis; a mass is real where λ_n/λ_0 is.
        ground, ratio = values[..., :1], centres / values[..., :1]
        spread = (radii + np.abs(ratio) * errors[..., :1]) / np.abs(ground)
        turned = np.abs(np.imag(ratio)) > spread
        return np.where(symmetric, _CODE[REAL], np.where(turned, _CODE[COMPLEX], _CODE[UNDECIDED]))
    near = np.abs(everything[..., None, :] - centres[..., :, None]) <= radii[..., :, None]
    on_axis = (near.sum(axis=-1) == 1) & (np.imag(centres) == 0) & np.isfinite(radii)
    decided = np.where(symmetric | on_axis, _CODE[REAL], _CODE[UNDECIDED])
    return np.where(off_axis & ~symmetric, _CODE[PAIR], decided)


def verdict_words(codes: NDArray[np.int8]) -> NDArray[np.str_]:
    """Verdicts in words."""
    return np.array(VERDICTS)[codes]
