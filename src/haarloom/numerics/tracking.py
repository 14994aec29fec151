"""Continuous labels for levels along a path, through crossings and complex mergers."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["tracked"]

FAR = 1e6
"""Stands for an infinite mass when branches are matched."""


def tracked(values: NDArray[Any]) -> NDArray[np.int64]:
    """Permutation at each point that makes every level a continuous branch.

    Each step matches the levels to those extrapolated from the two points before, so that the sum
    of squared distances is smallest. Where two real levels merge into a complex pair either may
    take either branch: the one listed first gets the partner with Im > 0.

    Parameters
    ----------
    values
        Masses or eigenvalues, shape (M, m), in any order at each point.

    Returns
    -------
    int array, shape (M, m): ``values[i, order[i]]`` follows the branches, which start in the order
    of the first point.
    """
    from scipy.optimize import linear_sum_assignment

    # a vanishing λ has an infinite mass: place it far away, but within reach of arithmetic
    values = np.where(np.isfinite(values), values, FAR)
    points, count = values.shape
    order = np.empty((points, count), dtype=np.int64)
    if points:
        order[0] = np.arange(count)
    for i in range(1, points):
        last = values[i - 1, order[i - 1]]
        before = values[i - 2, order[i - 2]] if i > 1 else last
        earlier = values[i - 3, order[i - 3]] if i > 2 else before
        step, bend = last - before, last - 2 * before + earlier
        # a merger has a square root in it: extrapolating past one would overshoot; a crossing has none
        safe = (np.abs(step) < 0.5 * _gaps(last)) | (np.abs(bend) < 0.2 * np.abs(step))
        guess = last + np.where(safe, step, 0.0)
        # nothing to extrapolate from an infinite mass: such a level takes its place in spectral order
        guess = np.where(np.abs(last) < FAR, guess, values[i])
        cost = np.abs(guess[:, None] - values[i][None, :]) ** 2
        order[i] = linear_sum_assignment(cost)[1]
        _upper_first(values[i], order[i], last)
    return order


def _gaps(values: NDArray[Any]) -> NDArray[np.float64]:
    """Distance of each value to its nearest neighbour."""
    apart = np.abs(values[:, None] - values[None, :])
    np.fill_diagonal(apart, np.inf)
    return np.asarray(apart.min(axis=1))


def _upper_first(values: NDArray[Any], order: NDArray[np.int64], last: NDArray[Any]) -> None:
    """Give a freshly made pair its branches: the first listed the one with Im > 0."""
    fresh = np.flatnonzero((last.imag == 0) & (values[order].imag != 0))
    for one in fresh:
        for other in fresh[fresh > one]:
            upper, lower = values[order[one]], values[order[other]]
            if upper == np.conj(lower) and upper.imag < 0:
                order[one], order[other] = order[other], order[one]
