"""Dynkin labels and Young diagrams: two spellings of one irrep of SU(N), as plain tuples of integers.

Labels are (a_1, …, a_{N−1}); the diagram has rows λ_i = a_i + … + a_{N−1} for i = 1 … N, so its last row is
0.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from itertools import accumulate, pairwise
from math import comb
from operator import index
from typing import Any

from haarloom.algebra.bounded_cache import cached_terms
from haarloom.algebra.whole_numbers import whole_number
from haarloom.exceptions import LabelError, SizeError

__all__ = [
    "Labels",
    "Rows",
    "count_up_to",
    "labels_from_rows",
    "labels_up_to",
    "order_key",
    "rows_from_labels",
    "transposed",
    "validated_cutoff",
    "validated_labels",
    "validated_rows",
]

Labels = tuple[int, ...]
Rows = tuple[int, ...]

_MOST_IRREPS = 2_000_000


def rows_from_labels(labels: Labels) -> Rows:
    """Rows of the Young diagram, N of them, the last one 0.

    >>> rows_from_labels((2, 1))
    (3, 1, 0)
    """
    return (*tuple(accumulate(reversed(labels)))[::-1], 0)


def labels_from_rows(rows: Rows) -> Labels:
    """Dynkin labels of a diagram with N rows; full columns of N boxes drop out.

    >>> labels_from_rows((4, 2, 1))
    (2, 1)
    """
    return tuple(upper - lower for upper, lower in pairwise(rows))


def transposed(rows: Sequence[int]) -> Rows:
    """Column lengths of a Young diagram.

    >>> transposed((3, 1, 0))
    (2, 1, 1)
    """
    return tuple(sum(1 for row in rows if row > column) for column in range(rows[0] if rows else 0))


def order_key(labels: Labels) -> tuple[int, ...]:
    """Sorting key of the basis order: by the sum of the labels, then labels descending lexicographically."""
    return (sum(labels), *(-label for label in labels))


def validated_labels(rank: int, raw: Sequence[Any]) -> Labels:
    """Check Dynkin labels once, at the door; everything behind it trusts the tuple.

    Raises
    ------
    LabelError
        When the length is not N − 1, or a label is not an integer ≥ 0 (``True`` is no label either).
    """
    if len(raw) != rank:
        raise LabelError(
            f"{len(raw)} Dynkin label(s) {tuple(raw)!r} given; SU({rank + 1}) takes {rank} of them: "
            f"write for example G.irrep({', '.join(['1'] + ['0'] * (rank - 1))})."
        )
    return tuple(_natural(label, f"Dynkin label a_{position}") for position, label in enumerate(raw, start=1))


def validated_rows(raw: Sequence[Any]) -> Rows:
    """Check the rows of a Young diagram: integers ≥ 0 that never grow downwards. Empty rows drop out."""
    rows = tuple(_natural(row, f"row {position}") for position, row in enumerate(raw, start=1))
    if any(lower > upper for upper, lower in pairwise(rows)):
        raise LabelError(f"rows {rows} given; a Young diagram has rows that never grow downwards: sort them.")
    return tuple(row for row in rows if row)


def validated_cutoff(raw: Any) -> int:
    """Check a cutoff K on the sum of the labels: an integer ≥ 0."""
    return whole_number("cutoff", raw, 0, "0 keeps the trivial irrep alone, 1 the fundamental as well")


def count_up_to(rank: int, cutoff: int) -> int:
    """Number of irreps with Σ a_i ≤ cutoff: the binomial coefficient (cutoff + rank over rank)."""
    return comb(cutoff + rank, rank)


@cached_terms(limit=200_000)
def labels_up_to(rank: int, cutoff: int) -> tuple[Labels, ...]:
    """All labels with Σ a_i ≤ cutoff in the basis order of :func:`order_key`.

    >>> labels_up_to(2, 1)
    ((0, 0), (1, 0), (0, 1))

    Raises
    ------
    SizeError
        When there are more than two million of them; the message says how many.
    """
    count = count_up_to(rank, cutoff)
    if count > _MOST_IRREPS:
        raise SizeError(
            f"cutoff {cutoff} given; SU({rank + 1}) has {count:,} irreps up to it, more than "
            f"{_MOST_IRREPS:,}: "
            "choose a smaller cutoff."
        )
    return tuple(labels for total in range(cutoff + 1) for labels in _compositions(total, rank))


def _compositions(total: int, parts: int) -> Iterator[Labels]:
    """Tuples of ``parts`` non-negative integers that add up to ``total``, descending lexicographically."""
    if parts == 1:
        yield (total,)
        return
    for first in range(total, -1, -1):
        for rest in _compositions(total - first, parts - 1):
            yield (first, *rest)


def _natural(raw: Any, what: str) -> int:
    try:
        if isinstance(raw, bool):
            raise TypeError
        value = index(raw)
    except TypeError:
        raise LabelError(
            f"{what} is {raw!r}; it must be an integer ≥ 0, such as 0, 1 or 2 (not a bool, float or string)."
        ) from None
    if value < 0:
        raise LabelError(f"{what} is {value}; it must be ≥ 0: the irrep's highest weight is dominant.")
    return value
