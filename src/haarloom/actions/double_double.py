"""Determinants of small matrices in double-double arithmetic (about 31 digits), in batches.

A number is an unevaluated sum of two floats. Error-free sums after D. E. Knuth, products after
T. J. Dekker, Numer. Math. 18 (1971) 224.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["PRECISION", "determinants"]

Floats = NDArray[np.float64]
Pair = tuple[Floats, Floats]

PRECISION = 2.0**-98  # relative error allowed for one multiplication or division

_SPLITTER = 134217729.0  # 2^27 + 1


def determinants(high: Floats, low: Floats) -> Pair:
    """Determinants of a batch of matrices, by elimination with row pivoting.

    Parameters
    ----------
    high, low : ndarray, shape (batch, n, n)
        The matrices are high + low, |low| at most an ulp of high.

    Returns
    -------
    high, low : ndarray, shape (batch,)
        Backward stable: the error is that of changing each column by about n·`PRECISION` of its norm.
    """
    matrix = (high.copy(), low.copy())
    n = high.shape[-1]
    result = (np.ones(len(high)), np.zeros(len(high)))
    for k in range(n):
        sign = _pivot(matrix, k)
        pivot = (matrix[0][:, k, k].copy(), matrix[1][:, k, k].copy())
        result = _times(result, (sign * pivot[0], sign * pivot[1]))
        pivot[0][pivot[0] == 0] = 1.0  # the result is already zero there
        if k + 1 < n:
            _eliminate(matrix, pivot, k)
    return result


def _pivot(matrix: Pair, k: int) -> Floats:
    """Bring the largest entry of column k to the diagonal; the sign that this costs."""
    batch = np.arange(len(matrix[0]))
    row = k + np.abs(matrix[0][:, k:, k]).argmax(axis=1)
    for part in matrix:
        part[batch, k], part[batch, row] = part[batch, row], part[batch, k]
    return np.where(row == k, 1.0, -1.0)


def _eliminate(matrix: Pair, pivot: Pair, k: int) -> None:
    column = tuple(part[:, k + 1 :, k] for part in matrix)
    factor = _over(column, tuple(part[:, None] for part in pivot))  # type: ignore[arg-type]
    row = tuple(part[:, None, k, k + 1 :] for part in matrix)
    product = _times(tuple(part[:, :, None] for part in factor), row)  # type: ignore[arg-type]
    rest = tuple(part[:, k + 1 :, k + 1 :] for part in matrix)
    matrix[0][:, k + 1 :, k + 1 :], matrix[1][:, k + 1 :, k + 1 :] = _minus(rest, product)  # type: ignore[arg-type]


def _exact_product(a: Floats, b: Floats) -> Pair:
    product = a * b
    a_high, b_high = _upper_half(a), _upper_half(b)
    a_low, b_low = a - a_high, b - b_high
    return product, ((a_high * b_high - product) + a_high * b_low + a_low * b_high) + a_low * b_low


def _upper_half(a: Floats) -> Floats:
    scaled = _SPLITTER * a
    return scaled - (scaled - a)


def _normalised(high: Floats, low: Floats) -> Pair:
    total = high + low
    return total, low - (total - high)


def _times(a: Pair, b: Pair) -> Pair:
    high, low = _exact_product(a[0], b[0])
    return _normalised(high, low + (a[0] * b[1] + a[1] * b[0]))


def _minus(a: Pair, b: Pair) -> Pair:
    total = a[0] - b[0]
    part = total - a[0]
    error = (a[0] - (total - part)) - (b[0] + part)
    return _normalised(total, error + (a[1] - b[1]))


def _over(a: Pair, b: Pair) -> Pair:
    first = a[0] / b[0]
    remainder = _minus(a, _times((first, np.zeros_like(first)), b))
    return _normalised(first, remainder[0] / b[0])
