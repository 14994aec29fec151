"""Weight systems: how often each weight occurs in an irrep, and how weights gather into irreps.

A weight is held here by its *content* (c_1, …, c_N): the exponents of the eigenvalues, x_1^{c_1} ⋯
x_N^{c_N}. Contents of one irrep add up to the number of boxes of its diagram; its Dynkin labels are the
differences c_i − c_{i+1}.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from itertools import pairwise, product
from math import factorial, prod
from types import MappingProxyType

from haarloom.algebra.bounded_cache import cached_terms
from haarloom.algebra.invariants import dimension
from haarloom.algebra.labels import Labels, Rows, labels_from_rows, rows_from_labels
from haarloom.exceptions import SizeError

__all__ = [
    "characters_in_contents",
    "check_weight_size",
    "contents",
    "dominant_weights",
    "orbit_size",
    "reflected",
    "weight_system",
    "weights",
]

_LARGEST = 3_000_000


def weights(labels: Labels) -> dict[Labels, int]:
    """Weights of an irrep in Dynkin labels (m_1, …, m_{N−1}), each with its multiplicity.

    >>> weights((1, 0))
    {(1, 0): 1, (-1, 1): 1, (0, -1): 1}
    """
    system = weight_system(labels)
    return {labels_from_rows(content): count for content, count in sorted(system.items(), reverse=True)}


def dominant_weights(labels: Labels) -> dict[Labels, int]:
    """The weights with no negative label: one for each Weyl orbit, with its multiplicity.

    >>> dominant_weights((1, 1))
    {(1, 1): 1, (0, 0): 2}
    """
    return {weight: count for weight, count in weights(labels).items() if min(weight) >= 0}


def orbit_size(weight: Labels) -> int:
    """Size of the Weyl orbit of a weight: N! over the permutations that leave its content fixed.

    >>> orbit_size((1, 1)), orbit_size((1, 0)), orbit_size((0, 0))
    (6, 3, 1)
    """
    content = rows_from_labels(weight)
    return factorial(len(content)) // prod(factorial(content.count(value)) for value in set(content))


def weight_system(labels: Labels) -> Mapping[Rows, int]:
    """Contents of an irrep of SU(N) with multiplicities, after a look at its size.

    Raises
    ------
    SizeError
        When the dimension, a bound on the steps this takes, exceeds three million.
    """
    check_weight_size(labels)
    return contents(rows_from_labels(labels))


def check_weight_size(labels: Labels) -> None:
    """Refuse an irrep whose weights would not be found in reasonable time, naming its dimension."""
    if dimension(labels) > _LARGEST:
        raise SizeError(
            f"the irrep {labels} has dimension {dimension(labels):,}; weights, and what rests on them, "
            "are worked out "
            f"up to {_LARGEST:,}: use a smaller irrep."
        )


@cached_terms(limit=100_000)
def contents(rows: Rows) -> Mapping[Rows, int]:
    """Contents of the GL(N) irrep with diagram ``rows``, with multiplicities (Kostka numbers).

    Gelfand and Tsetlin's branching: restricted to GL(N−1) the irrep falls apart into all diagrams μ that
    interlace λ_1 ≥ μ_1 ≥ λ_2 ≥ … ≥ λ_N, and the boxes that went missing are the exponent of x_N. No
    subtraction occurs.
    """
    if len(rows) == 1:
        return MappingProxyType({rows: 1})
    if len(rows) == 2:
        top, bottom = rows
        return MappingProxyType({(top - k, bottom + k): 1 for k in range(top - bottom + 1)})
    system: dict[Rows, int] = {}
    boxes = sum(rows)
    for below in interlacing(rows):
        last = boxes - sum(below)
        for content, count in contents(below).items():
            key = (*content, last)
            system[key] = system.get(key, 0) + count
    return MappingProxyType(system)


def interlacing(rows: Rows) -> Iterator[Rows]:
    """All diagrams μ with one row fewer and λ_i ≥ μ_i ≥ λ_{i+1}."""
    return product(*(range(upper, lower - 1, -1) for upper, lower in pairwise(rows)))


def reflected(shifted: Rows) -> tuple[int, Rows]:
    """Bring λ + ρ into the dominant chamber: the sign of the Weyl reflection and the strictly falling result.

    The sign is 0 when two entries coincide: the weight lies on a wall and drops out.

    >>> reflected((1, 3, 0)), reflected((2, 2, 0))
    ((-1, (3, 1, 0)), (0, (2, 2, 0)))
    """
    ordered = tuple(sorted(shifted, reverse=True))
    if ordered == shifted:
        return (1 if _strictly_falling(ordered) else 0), ordered
    if not _strictly_falling(ordered):
        return 0, ordered
    return _permutation_sign(shifted), ordered


def characters_in_contents(system: Mapping[Rows, int]) -> dict[Labels, int]:
    """Characters that add up to a Weyl-invariant combination of contents: Σ m_c x^c = Σ_r a_r χ_r.

    Every content c lands, shifted by ρ and reflected, on one irrep with a sign (the product with the
    trivial irrep in the rule of Racah and Speiser, *Fortschr. Phys.* 12 (1964) 1). The result may have
    negative coefficients.
    """
    found: dict[Labels, int] = {}
    for content, count in system.items():
        size = len(content)
        sign, ordered = reflected(tuple(c + size - 1 - i for i, c in enumerate(content)))
        if sign:
            labels = tuple(a - b - 1 for a, b in pairwise(ordered))
            found[labels] = found.get(labels, 0) + sign * count
    return {labels: count for labels, count in found.items() if count}


def _strictly_falling(values: Rows) -> bool:
    return all(a > b for a, b in pairwise(values))


def _permutation_sign(values: Rows) -> int:
    inversions = sum(values[i] < values[j] for i in range(len(values)) for j in range(i + 1, len(values)))
    return -1 if inversions % 2 else 1
