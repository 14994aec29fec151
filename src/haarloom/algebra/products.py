"""Tensor products of irreps, on plain labels: the fast kernels.

SU(2) and SU(3) have closed forms; every other SU(N) uses weight reflection.
:mod:`haarloom.algebra.tableaux` holds the independent algorithm (counting tableaux) that referees these.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from itertools import pairwise
from types import MappingProxyType

from haarloom.algebra.bounded_cache import cached_terms
from haarloom.algebra.invariants import dimension
from haarloom.algebra.labels import Labels, rows_from_labels
from haarloom.algebra.weights import check_weight_size, contents
from haarloom.exceptions import SizeError

__all__ = [
    "act_on",
    "check_product_size",
    "fusion_tensor",
    "multiplicity",
    "multiply",
    "multiply_by_reflection",
    "multiply_many",
    "multiply_sums",
]

_MOST_IRREPS = 1_000_000


def multiply(left: Labels, right: Labels) -> Mapping[Labels, int]:
    """Irreps in the product of two, with multiplicities; read-only, cached within a bound.

    >>> dict(multiply((1, 0), (0, 1))) == {(0, 0): 1, (1, 1): 1}
    True
    """
    return _multiply(left, right) if left <= right else _multiply(right, left)


@cached_terms(limit=200_000)
def _multiply(left: Labels, right: Labels) -> Mapping[Labels, int]:
    check_product_size(left, right)
    kernel = {1: _multiply_su2, 2: _multiply_su3}.get(len(left), multiply_by_reflection)
    return MappingProxyType(kernel(left, right))


def check_product_size(left: Labels, right: Labels) -> None:
    """Refuse a product whose work would not end in reasonable time, naming the size.

    Raises
    ------
    SizeError
        For SU(2) and SU(3) when a bound on the number of irreps that occur exceeds a million, for N ≥ 4
        when the weights of the smaller factor are out of reach
        (:func:`haarloom.algebra.weights.check_weight_size`).
    """
    if len(left) > 2:
        check_weight_size(min(left, right, key=dimension))
        return
    (p, q), (r, s) = (*left, 0)[:2], (*right, 0)[:2]
    most = (min(p, s) + min(q, r) + 1) * (min(p, r) + min(q, s) + 1)
    if most > _MOST_IRREPS:
        raise SizeError(
            f"{left} ⊗ {right} holds up to {most:,} irreps, more than {_MOST_IRREPS:,}: use smaller ones "
            "(products.multiplicity gives any single multiplicity of SU(3) by its closed form)."
        )


def multiply_many(factors: Iterable[Labels], rank: int) -> Mapping[Labels, int]:
    """Product of any number of irreps, factor by factor; no factor at all gives the trivial irrep."""
    total: Mapping[Labels, int] = {(0,) * rank: 1}
    for factor in factors:
        total = multiply_sums(total, {factor: 1})
    return total


def multiply_sums(left: Mapping[Labels, int], right: Mapping[Labels, int]) -> dict[Labels, int]:
    """Product of two combinations of characters with integer coefficients."""
    total: dict[Labels, int] = {}
    for a, count_a in left.items():
        for b, count_b in right.items():
            weight = count_a * count_b
            for labels, count in multiply(a, b).items():
                total[labels] = total.get(labels, 0) + weight * count
    return {labels: count for labels, count in total.items() if count}


def multiply_by_reflection(left: Labels, right: Labels) -> dict[Labels, int]:
    """Product by weight reflection, any N: shift the larger factor by each weight of the smaller.

    Each weight μ of the smaller factor sends λ + ρ to λ + μ + ρ. Reflected into the dominant chamber it
    counts with the sign of the reflection; on a wall it drops out (G. Racah and D. Speiser, *Fortschr.
    Phys.* 12 (1964) 1; A. U. Klimyk).
    """
    small, large = sorted((left, right), key=dimension)
    return act_on(contents(rows_from_labels(small)), {large: 1})


def act_on(system: Mapping[tuple[int, ...], int], sums: Mapping[Labels, int]) -> dict[Labels, int]:
    """Product of a Weyl-invariant weight system (by contents) with a combination of characters."""
    found: dict[tuple[int, ...], int] = {}
    for labels, weight in sums.items():
        start = tuple(row + len(labels) - i for i, row in enumerate(rows_from_labels(labels)))
        _scatter(found, start, system, weight)
    return _collected(found)


def _scatter(
    found: dict[tuple[int, ...], int],
    start: tuple[int, ...],
    system: Mapping[tuple[int, ...], int],
    weight: int,
) -> None:
    size = len(start)
    for content, count in system.items():
        point = [a + b for a, b in zip(start, content, strict=True)]
        sign = weight
        for i in range(1, size):  # insertion sort: every swap is one simple reflection
            j, value = i, point[i]
            while j and point[j - 1] < value:
                point[j] = point[j - 1]
                j -= 1
                sign = -sign
            if j and point[j - 1] == value:
                sign = 0
                break
            point[j] = value
        if sign:
            key = tuple(point)
            found[key] = found.get(key, 0) + sign * count


def _collected(found: Mapping[tuple[int, ...], int]) -> dict[Labels, int]:
    """Strictly falling λ + ρ back to labels; combinations with different box numbers meet here."""
    total: dict[Labels, int] = {}
    for point, count in found.items():
        labels = tuple([a - b - 1 for a, b in pairwise(point)])
        total[labels] = total.get(labels, 0) + count
    return {labels: count for labels, count in total.items() if count}


def multiplicity(left: Labels, right: Labels, result: Labels) -> int:
    """How often ``result`` occurs in ``left`` ⊗ ``right``; for SU(3) by the closed form alone.

    >>> multiplicity((1, 1), (1, 1), (1, 1))
    2
    """
    if len(left) == 2:
        return _multiplicity_su3(left, right, result)
    return multiply(left, right).get(result, 0)


def fusion_tensor(basis: Sequence[Labels], factor: Labels) -> list[tuple[int, int, int]]:
    """Non-zero ⟨r|χ_c|s⟩ = N_{cs}^r on a basis as (row, column, multiplicity), column by column.

    Parameters
    ----------
    basis : sequence of labels
        The irreps of the rows and columns, in order.
    factor : labels
        The irrep c whose character multiplies.
    """
    place = {labels: row for row, labels in enumerate(basis)}
    return [
        (place[labels], column, count)
        for column, source in enumerate(basis)
        for labels, count in multiply(factor, source).items()
        if labels in place
    ]


def _multiply_su2(left: Labels, right: Labels) -> dict[Labels, int]:
    (a,), (b,) = left, right
    return {(total,): 1 for total in range(abs(a - b), a + b + 1, 2)}


def _multiply_su3(left: Labels, right: Labels) -> dict[Labels, int]:
    """Closed form for SU(3), a constant number of operations for each irrep that occurs.

    Contracting i upper with lower indices one way and m − i the other leaves (p+r−m, q+s−m) upper and lower
    ones; antisymmetrising k pairs of upper ones gives (p+r−m−2k, q+s−m+k), of lower ones the mirror image
    (S. Coleman, *J. Math. Phys.* 5 (1964) 1343). Different m and k give different irreps, so the
    multiplicity is the number of i that leave k pairs: the length of an interval.
    """
    (p, q), (r, s) = left, right
    found: dict[Labels, int] = {}
    most, other = min(p, s), min(r, q)
    for m in range(most + other + 1):
        low, high = max(0, m - other), min(most, m)
        upper, lower, count = p + r - m, q + s - m, high - low + 1
        _ladder(found, (upper, lower), (-2, 1), count, (p - high, r - m + low))
        _ladder(found, (upper, lower), (1, -2), count, (s - high, q - m + low))
    return found


def _ladder(
    found: dict[Labels, int], start: Labels, step: Labels, count: int, slack: tuple[int, int]
) -> None:
    """Labels start + k·step for k = 0, 1, …; beyond each slack every further pair costs one copy."""
    (upper, lower), (up, down), (first, second) = start, step, slack
    k = 0
    while count > 0:
        found[upper, lower] = count
        upper += up
        lower += down
        k += 1
        count -= (k > first) + (k > second)


def _multiplicity_su3(left: Labels, right: Labels, result: Labels) -> int:
    """Closed-form SU(3) multiplicity: the singlets in left ⊗ right ⊗ result-bar, k_max − k_min + 1 or 0.

    L. Bégin, P. Mathieu, M. A. Walton, *Mod. Phys. Lett. A* 7 (1992) 3255 (the tensor-product limit there).
    """
    firsts = (left[0], right[0], result[1])
    seconds = (left[1], right[1], result[0])
    a, remainder_a = divmod(2 * sum(firsts) + sum(seconds), 3)
    b, remainder_b = divmod(sum(firsts) + 2 * sum(seconds), 3)
    if remainder_a or remainder_b:
        return 0
    longest = max(first + second for first, second in zip(firsts, seconds, strict=True))
    lowest = max(longest, a - min(firsts), b - min(seconds))
    return max(0, min(a, b) - lowest + 1)
