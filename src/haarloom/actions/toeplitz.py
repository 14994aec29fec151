"""Character coefficients of multiplicative class functions by Toeplitz determinants.

A class function that is a product over eigenvalues, F(P) = ∏_j φ(x_j) with φ(x) = Σ_k φ_k x^k, has on
U(N) the coefficients det[φ_{λ_j − j + i}] (Jacobi and Trudi's identity, I. G. Macdonald, *Symmetric
Functions and Hall Polynomials*, §I.3; Heine and Szegő's for the trivial one). On SU(N) a shift of all rows
changes nothing, so c_λ = Σ_m det[φ_{λ_j − j + i + m}], i, j = 1 … N.

Smooth φ make neighbouring columns nearly equal. Rows are therefore replaced by finite differences,
taken in exact integers before rounding: half of the digits that would cancel never arise.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view
from numpy.typing import NDArray

from haarloom.actions.double_double import PRECISION, determinants

__all__ = ["Rows", "difference_rows", "toeplitz_complex", "toeplitz_integers", "toeplitz_sums"]

Floats = NDArray[np.float64]
Partitions = NDArray[np.int_]

_EPS = float(np.finfo(float).eps)
_CHUNK = 1_000_000  # matrix entries worked on at a time


@dataclass(frozen=True)
class Rows:
    """Difference rows of one point: N rows over l = −reach … reach, each divided by its scale.

    Attributes
    ----------
    high, low : ndarray, shape (N, 2·reach + 1)
        Entries as unevaluated sums of two floats.
    scale : int
        Product of all scales, in the unit of the coefficients.
    """

    high: Floats
    low: Floats
    scale: int


def difference_rows(coefficients: Sequence[int], n: int) -> Rows:
    """Rows with the same n×n minors as φ_{l+i}, i = 0 … n − 1, from which the common part is gone.

    Row i is the i-th forward difference of l ↦ φ_l, shifted by (n − 1 − i)//2 to stay centred. As
    polynomials in the shift these span what 1, E, …, E^{n−1} span, by a matrix of determinant one.

    Parameters
    ----------
    coefficients : sequence of int
        φ_l for l = −reach − n … reach + n in a common unit.
    n : int
        The N of SU(N).
    """
    row = list(coefficients)
    columns = len(row) - 2 * n
    high, low = np.empty((n, columns)), np.empty((n, columns))
    scale = 1
    for i in range(n):
        first = n + (n - 1 - i) // 2
        part = row[first : first + columns]
        largest = max(map(abs, part)) or 1
        scale *= largest
        high[i], low[i] = _pair_of_floats(part, largest, both=n > 3)
        row = [after - before for before, after in itertools.pairwise(row)]
    return Rows(high, low, scale)


def _pair_of_floats(integers: list[int], unit: int, both: bool) -> tuple[Floats, Floats]:
    """value/unit as a correctly rounded float, and the rest likewise where it is wanted."""
    upper = [value / unit for value in integers]
    if not both:
        return np.array(upper), np.zeros(len(upper))
    ratios = [near.as_integer_ratio() for near in upper]
    lower = [(v * b - a * unit) / (b * unit) for v, (a, b) in zip(integers, ratios, strict=True)]
    return np.array(upper), np.array(lower)


def toeplitz_sums(partitions: Partitions, points: Sequence[Rows], margin: int) -> tuple[Floats, Floats]:
    """Σ_m det over all shifts that matter, in units of each point's scale.

    Parameters
    ----------
    partitions : ndarray of int, shape (n_irreps, N)
        Young diagrams λ_1 ≥ … ≥ λ_N = 0.
    points : sequence of Rows
        One for each point of parameter space, all of the same reach ≥ max λ_1 + margin + N.
    margin : int
        Shifts run over −λ_1 − margin … margin, of the least column −N + 1 and up.

    Returns
    -------
    sums, error : ndarray, shape (points, n_irreps)
        The error bounds rounding, not the omitted shifts.
    """
    if partitions.shape[1] == 3:
        return _three(partitions, points, margin)
    pairs = [_one_point(partitions, rows, margin) for rows in points]
    return np.array([w for w, _ in pairs]), np.array([error for _, error in pairs])


def _three(partitions: Partitions, points: Sequence[Rows], margin: int) -> tuple[Floats, Floats]:
    """3×3: expand along the column of the last row of λ and sum over shifts by matrix products."""
    rows = np.array([point.high for point in points])
    reach = (rows.shape[2] - 1) // 2
    first, second = partitions[:, 0] + 2, partitions[:, 1] + 1
    shifts = slice(reach - int(partitions.max()) - margin, reach + margin + 1)
    windows = sliding_window_view(rows, int(first.max()) + 1, axis=2)[:, :, shifts, :]
    last = rows[:, :, shifts]
    w = np.zeros((len(points), len(partitions)))
    size = np.zeros_like(w)
    for i, j, k in ((0, 1, 2), (1, 2, 0), (2, 0, 1)):
        parts = windows[:, i], windows[:, j], last[:, k]
        w += _minor_sum(*parts, first, second, -1.0)
        a, b, c = (np.abs(part) for part in parts)
        size += _minor_sum(a, b, c, first, second, 1.0)
    return w, (8 + last.shape[2] ** 0.5) * _EPS * size


def _minor_sum(a: Floats, b: Floats, c: Floats, first: Partitions, second: Partitions, sign: float) -> Floats:
    product = np.matmul((a * c[..., None]).transpose(0, 2, 1), b)
    return np.asarray(product[:, first, second] + sign * product[:, second, first])


def _one_point(partitions: Partitions, rows: Rows, margin: int) -> tuple[Floats, Floats]:
    """N×N: batched determinants to 31 digits; Hadamard's inequality bounds their error."""
    n = partitions.shape[1]
    w, error = np.zeros(len(partitions)), np.zeros(len(partitions))
    reach = (rows.high.shape[1] - 1) // 2
    for piece, columns in _blocks(partitions, margin):
        shape = columns.shape[:2]
        high = rows.high[:, columns + reach].transpose(1, 2, 0, 3).reshape(-1, n, n)
        low = rows.low[:, columns + reach].transpose(1, 2, 0, 3).reshape(-1, n, n)
        parts = determinants(high, low)
        w[piece] = sum(part.reshape(shape).sum(axis=1) for part in parts)
        rounding = np.abs(parts[0]).reshape(shape).sum(axis=1)
        norms = np.linalg.norm(high, axis=1).prod(axis=1).reshape(shape).sum(axis=1)
        error[piece] = 4 * n**2 * PRECISION * norms + _EPS * (2 + shape[1] ** 0.5) * rounding
    return w, error


def _blocks(partitions: Partitions, margin: int) -> Iterator[tuple[slice, Partitions]]:
    """Columns λ_j − j + 1 + m for pieces of the list of irreps, shape (irreps, shifts, N)."""
    n = partitions.shape[1]
    heads = partitions - np.arange(n)
    shifts = np.arange(-int(partitions.max()) - margin + n - 1, margin + n)
    step = max(1, _CHUNK // (len(shifts) * n * n))
    for start in range(0, len(heads), step):
        piece = slice(start, start + step)
        yield piece, heads[piece, None, :] + shifts[None, :, None]


def toeplitz_complex(
    partitions: Partitions, coefficients: NDArray[np.complex128], margin: int
) -> tuple[NDArray[np.complex128], Floats]:
    """The same sums for complex φ at one point, without the gain of exact differences.

    Parameters
    ----------
    coefficients : ndarray, shape (2·reach + 2·N + 1,)
        φ_l for l = −reach − N … reach + N.
    """
    n = partitions.shape[1]
    zero = (len(coefficients) - 1) // 2
    w, error = np.zeros(len(partitions), dtype=np.complex128), np.zeros(len(partitions))
    for piece, columns in _blocks(partitions, margin):
        matrices = coefficients[zero + columns[:, :, None, :] + np.arange(n)[:, None]]
        w[piece] = np.linalg.det(matrices).sum(axis=1)
        norms = np.linalg.norm(matrices, axis=2).prod(axis=2).sum(axis=1)
        error[piece] = 2 * n**2 * _EPS * norms
    return w, error


def toeplitz_integers(
    rows: tuple[int, ...], coefficient: Sequence[int], zero: int, shifts: range
) -> tuple[int, list[int]]:
    """Σ_m det in exact integers, and for each shift a bound on the size of its term.

    Parameters
    ----------
    rows : tuple of int
        The Young diagram, N rows.
    coefficient : sequence of int
        φ_l at place zero + l.
    zero : int
        Place of φ_0.
    shifts : range
        The m to sum over.
    """
    n = len(rows)
    total, sizes = 0, []
    for shift in shifts:
        columns = [zero + row + 1 - j + shift for j, row in enumerate(rows, start=1)]
        matrix = [[coefficient[column + i] for column in columns] for i in range(n)]
        # a determinant and its change under rounding are bounded by products of column sums
        sizes.append(math.prod(sum(map(abs, column)) for column in zip(*matrix, strict=True)))
        total += _eliminated(matrix)
    return total, sizes


def _eliminated(matrix: list[list[int]]) -> int:
    """Determinant of an integer matrix by fraction-free elimination in place (E. H. Bareiss 1968)."""
    n, sign, previous = len(matrix), 1, 1
    for k in range(n - 1):
        pivot = next((i for i in range(k, n) if matrix[i][k]), None)
        if pivot is None:
            return 0
        if pivot != k:
            matrix[k], matrix[pivot], sign = matrix[pivot], matrix[k], -sign
        head = matrix[k]
        for row in matrix[k + 1 :]:
            row[k + 1 :] = [
                (a * head[k] - row[k] * b) // previous
                for a, b in zip(row[k + 1 :], head[k + 1 :], strict=True)
            ]
        previous = head[k]
    return sign * matrix[n - 1][n - 1]
