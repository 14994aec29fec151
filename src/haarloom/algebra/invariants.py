"""Numbers that belong to an irrep: dimension, Casimirs, index, N-ality, from its Dynkin labels.

Generators are normalised with T_F = 1/2, so C₂(fundamental) = (N² − 1)/2N and C₂(adjoint) = N.
"""

from __future__ import annotations

from functools import lru_cache
from math import prod

from sympy import Rational

from haarloom.algebra.labels import Labels, rows_from_labels

__all__ = ["cubic_casimir", "dimension", "dynkin_index", "nality", "quadratic_casimir"]


@lru_cache(maxsize=16384)
def dimension(labels: Labels) -> int:
    """Dimension by Weyl's formula, ∏_{i<j} (λ_i − λ_j + j − i)/(j − i).

    >>> dimension((1, 1)), dimension((10, 10))
    (8, 1331)
    """
    shifted = _shifted_rows(labels)
    n = len(shifted)
    pairs = [(i, j) for i in range(n) for j in range(i + 1, n)]
    return prod(shifted[i] - shifted[j] for i, j in pairs) // prod(j - i for i, j in pairs)


@lru_cache(maxsize=16384)
def quadratic_casimir(labels: Labels) -> Rational:
    """C₂ = ½[n(N − n/N) + Σ λ_i(λ_i − 2i + 1)] for a diagram with n boxes.

    >>> quadratic_casimir((1, 0)), quadratic_casimir((1, 1))
    (4/3, 3)
    """
    rows = rows_from_labels(labels)
    n, boxes = len(rows), sum(rows)
    contents = sum(row * (row - 2 * i + 1) for i, row in enumerate(rows, start=1))
    return Rational(n * (n * boxes + contents) - boxes**2, 2 * n)


@lru_cache(maxsize=16384)
def cubic_casimir(labels: Labels) -> Rational:
    """C₃, the eigenvalue of d_abc T_a T_b T_c: ½ Σ l_i³ with l_i = λ_i − n/N + (N + 1)/2 − i.

    It changes sign under conjugation, so of the Weyl-invariant polynomials of degree three in the traceless
    l only the power sum can occur; the highest powers fix the factor ½. For SU(3) it is
    (p−q)(p+2q+3)(q+2p+3)/18.

    >>> cubic_casimir((1, 0)), cubic_casimir((1, 1))
    (10/9, 0)
    """
    shifted = _shifted_rows(labels)
    n, total = len(shifted), sum(shifted)
    return Rational(sum((n * value - total) ** 3 for value in shifted), 2 * n**3)


def dynkin_index(labels: Labels) -> Rational:
    """Index T(r) = d·C₂/(N² − 1): ½ for the fundamental, N for the adjoint."""
    n = len(labels) + 1
    return Rational(dimension(labels) * quadratic_casimir(labels), n**2 - 1)


def nality(labels: Labels) -> int:
    """N-ality k = Σ i·a_i mod N, the charge under the centre of SU(N)."""
    return sum(i * label for i, label in enumerate(labels, start=1)) % (len(labels) + 1)


def _shifted_rows(labels: Labels) -> tuple[int, ...]:
    """λ_i + N − i: strictly falling, the numbers Weyl's formulas are made of."""
    rows = rows_from_labels(labels)
    return tuple(row + len(rows) - i for i, row in enumerate(rows, start=1))
