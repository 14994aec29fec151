"""Tensor products of irreps, on plain labels: the fast kernels.

SU(2) and SU(3) have closed forms; every other SU(N) uses weight reflection. :mod:`haarloom.algebra.tableaux` holds the
independent algorithm (counting tableaux) that referees these.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from itertools import pairwise
from math import prod

from haarloom.algebra.bounded_cache import cached_terms
from haarloom.algebra.invariants import dimension
from haarloom.algebra.labels import Labels, rows_from_labels
from haarloom.algebra.weights import contents, weight_count_bound
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

_MOST_STEPS = 10_000_000


def multiply(left: Labels, right: Labels) -> Mapping[Labels, int]:
    """Irreps in the product of two, with multiplicities; read-only, cached within a bound.

    >>> dict(multiply((1, 0), (0, 1))) == {(0, 0): 1, (1, 1): 1}
    True
    """
    return _multiply(left, right) if left <= right else _multiply(right, left)


@cached_terms(limit=200_000)
def _multiply(left: Labels, right: Labels) -> dict[Labels, int]:
    check_product_size(left, right)
    if len(left) == 1:
        return _multiply_su2(left[0], right[0])
    if len(left) == 2:
        return _multiply_su3(left, right)
    return multiply_by_reflection(left, right)


def check_product_size(left: Labels, right: Labels) -> None:
    """Refuse a product whose work would not end in reasonable time, naming the size.

    Raises
    ------
    SizeError
        Above about ten million elementary steps: for SU(2) the number of irreps, for SU(3) the number of terms of
        the closed form, for N ≥ 4 the number of weights of the smaller factor.
    """
    if len(left) == 1:
        work = min(left[0], right[0]) + 1
    elif len(left) == 2:
        turns = [min(left[0], right[1]), min(right[0], left[1]), min(left[0], right[0]) + min(left[1], right[1])]
        work = prod(turn + 1 for turn in turns)
    else:
        work = weight_count_bound(min(left, right, key=dimension))
    if work > _MOST_STEPS:
        raise SizeError(
            f"{left} ⊗ {right} takes about {work:,} steps, more than {_MOST_STEPS:,}: use smaller irreps "
            "(for SU(3), multiplicity() gives any single one by its closed form)."
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

    Each weight μ of the smaller factor sends λ + ρ to λ + μ + ρ. Reflected into the dominant chamber it counts with the
    sign of the reflection; on a wall it drops out (G. Racah and D. Speiser, *Fortschr. Phys.* 12 (1964) 1; A. U. Klimyk).
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


def _multiply_su2(left: int, right: int) -> dict[Labels, int]:
    return {(total,): 1 for total in range(abs(left - right), left + right + 1, 2)}


def _multiply_su3(left: Labels, right: Labels) -> dict[Labels, int]:
    """Closed form for SU(3): contract i upper with lower indices one way and j the other, then antisymmetrise k pairs.

    S. Coleman, *J. Math. Phys.* 5 (1964) 1343; see also his *Aspects of Symmetry* (1985), chapter 1.
    """
    (p, q), (r, s) = left, right
    found: dict[Labels, int] = {}
    for i in range(min(p, s) + 1):
        for j in range(min(r, q) + 1):
            upper, lower = p - i + r - j, q - j + s - i
            for k in range(min(p - i, r - j) + 1):
                labels = (upper - 2 * k, lower + k)
                found[labels] = found.get(labels, 0) + 1
            for k in range(1, min(q - j, s - i) + 1):
                labels = (upper + k, lower - 2 * k)
                found[labels] = found.get(labels, 0) + 1
    return found


def _multiplicity_su3(left: Labels, right: Labels, result: Labels) -> int:
    """Closed-form SU(3) multiplicity: singlets in left ⊗ right ⊗ result-bar, k_max − k_min + 1 when not negative.

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
