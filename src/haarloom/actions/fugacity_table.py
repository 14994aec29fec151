"""Integer polynomials in the fugacities: the coefficients of det_R(1 + zP)^n det_R(1 + z̄P†)^n̄.

Polynomials are mappings {(i, j): count} for Σ count z^i z̄^j. In the fundamental irrep every coefficient
has a closed form of its own; in other irreps the antisymmetric powers are multiplied out.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from functools import lru_cache
from itertools import combinations

from haarloom.algebra.irrep import Irrep
from haarloom.algebra.products import multiply
from haarloom.exceptions import SizeError

__all__ = ["Monomials", "fundamental_monomials", "general_linear_dimension", "power_table"]

Labels = tuple[int, ...]
Monomials = Mapping[tuple[int, int], int]
Series = dict[Labels, dict[tuple[int, int], int]]

_MOST_TERMS = 400_000


def general_linear_dimension(rows: tuple[int, ...], n: int) -> int:
    """Dimension of the irrep of GL(n) with the given Young diagram, zero if there are more rows than n.

    ∏ (n + c)/h over the boxes, c the content and h the hook length (I. G. Macdonald, Symmetric Functions and
    Hall Polynomials, §I.3 example 4), one row at a time: in row i the n + c are λ_i consecutive numbers, and
    ∏ h = ∏_i l_i! / ∏_{i<j} (l_i − l_j) with l_i = λ_i + N − i.
    """
    if any(rows[n:]):
        return 0
    return _by_hooks(rows, [math.perm(n - 1 - i + row, row) for i, row in enumerate(rows) if row])


def transposed_dimension(rows: tuple[int, ...], n: int) -> int:
    """Dimension of the irrep of GL(n) with the transposed Young diagram, zero if a row is longer than n.

    The same formula with −c for c.
    """
    return _by_hooks(rows, [math.perm(n + i, row) for i, row in enumerate(rows)])


def _by_hooks(rows: tuple[int, ...], contents: list[int]) -> int:
    ends = [row + len(rows) - 1 - i for i, row in enumerate(rows)]
    gaps = math.prod(one - other for one, other in combinations(ends, 2))
    return math.prod(contents) * gaps // math.prod(map(math.factorial, ends))


def fundamental_monomials(rows: tuple[int, ...], n: int, nbar: int) -> dict[tuple[int, int], int]:
    """Coefficient of one irrep in det(1 + zP)^n det(1 + z̄P†)^n̄, P in the fundamental.

    det(1 + z̄P†) = z̄^N det(1 + P/z̄) turns both factors into one product over eigenvalues, whose
    coefficients are Σ_m det[e_{λ_i − i + j + m}], e_k the elementary symmetric function of n times z and n̄
    times 1/z̄ (dual Jacobi–Trudi and dual Cauchy identities, Macdonald §I.3–4). In u = z z̄ it has one
    variable.

    Parameters
    ----------
    rows : tuple of int
        Young diagram, N rows with the last zero.
    n, nbar : int
        Copies of the fermion and of its antiparticle.
    """
    size, boxes = len(rows), sum(rows)
    found: dict[tuple[int, int], int] = {}
    for m in range(n + nbar - rows[0] + 1):
        shifted = tuple(row + m for row in rows)
        minors = [transposed_dimension(shifted, n)] if nbar == 0 else _minor(shifted, n, nbar)
        rest = size * nbar - boxes - size * m
        for power, count in enumerate(minors):
            if count:
                key = (boxes + size * m, 0) if nbar == 0 else (power, rest + power)
                found[key] = found.get(key, 0) + count
    return found


def _minor(rows: tuple[int, ...], n: int, nbar: int) -> list[int]:
    """det[e_{λ_i − i + j}](u) as a list of coefficients, by expansion over sets of columns."""
    size = len(rows)
    e = {k: _elementary(k, n, nbar) for i, row in enumerate(rows) for k in range(row - i, row - i + size)}
    partial: dict[tuple[int, ...], list[int]] = {(): [1]}
    for i, row in enumerate(rows):
        step: dict[tuple[int, ...], list[int]] = {}
        for columns in combinations(range(size), i + 1):
            step[columns] = _row_expansion(columns, [e[row - i + j] for j in columns], partial)
        partial = step
    return partial[tuple(range(size))]


def _row_expansion(
    columns: tuple[int, ...], entries: list[list[int]], partial: Mapping[tuple[int, ...], list[int]]
) -> list[int]:
    total: list[int] = []
    for place, entry in enumerate(entries):
        sign = -1 if (len(columns) - 1 - place) % 2 else 1
        total = _added(total, _convolved(entry, partial[columns[:place] + columns[place + 1 :]]), sign)
    return total


@lru_cache(maxsize=1024)
def _elementary(k: int, n: int, nbar: int) -> list[int]:
    """e_k of n times u and n̄ times 1, coefficients in u."""
    if k < 0 or k > n + nbar:
        return []
    return [math.comb(n, a) * math.comb(nbar, k - a) for a in range(min(n, k) + 1)]


def _convolved(a: list[int], b: list[int]) -> list[int]:
    if not a or not b:
        return []
    result = [0] * (len(a) + len(b) - 1)
    for i, value in enumerate(a):
        if value:
            for j, other in enumerate(b):
                result[i + j] += value * other
    return result


def _added(a: list[int], b: list[int], sign: int) -> list[int]:
    length = max(len(a), len(b))
    padded = [*a, *[0] * (length - len(a))], [*b, *[0] * (length - len(b))]
    return [x + sign * y for x, y in zip(*padded, strict=True)]


@lru_cache(maxsize=16)
def power_table(irrep: Irrep, n: int, nbar: int) -> Series:
    """All coefficients of det_R(1 + zP)^n det_R(1 + z̄P†)^n̄ for any irrep R, by repeated squaring.

    Raises
    ------
    SizeError
        If the result would hold more than some 400,000 monomials.
    """
    ladder = {k: irrep.antisymmetric_power(k).by_labels() for k in range(irrep.dimension + 1)}
    particles: Series = {}
    for k, terms in ladder.items():
        for labels, count in terms.items():
            particles.setdefault(labels, {})[(k, 0)] = count
    antiparticles: Series = {
        labels[::-1]: {(0, i): count for (i, _), count in terms.items()}
        for labels, terms in particles.items()
    }
    rank = irrep.group.rank
    return _multiplied(_raised(particles, n, rank), _raised(antiparticles, nbar, rank))


def _raised(series: Series, n: int, rank: int) -> Series:
    result: Series = {(0,) * rank: {(0, 0): 1}}
    while n:
        if n & 1:
            result = _multiplied(result, series)
        n >>= 1
        series = _multiplied(series, series) if n else series
    return result


def _multiplied(a: Series, b: Series) -> Series:
    result: Series = {}
    for left, first in a.items():
        for right, second in b.items():
            product = _monomial_product(first, second)
            for labels, count in multiply(left, right).items():
                slot = result.setdefault(labels, {})
                for key, value in product.items():
                    slot[key] = slot.get(key, 0) + count * value
        if sum(map(len, result.values())) > _MOST_TERMS:
            raise SizeError(
                f"The exact class function of so many copies has {sum(map(len, result.values())):,} terms "
                f"and more to come, {_MOST_TERMS:,} are allowed; use fewer copies, an irrep of "
                "lower dimension, or fermions in the fundamental irrep, "
                "which have closed-form coefficients."
            )
    return result


def _monomial_product(a: Monomials, b: Monomials) -> dict[tuple[int, int], int]:
    result: dict[tuple[int, int], int] = {}
    for (i, j), x in a.items():
        for (k, m), y in b.items():
            key = (i + k, j + m)
            result[key] = result.get(key, 0) + x * y
    return result
