"""Haar moments of the loop against published integer sequences.

I. M. Gessel, *J. Comb. Theory A* 53 (1990) 257, and E. M. Rains, *Electron. J. Comb.* 5 (1998) R12: ∫ |tr
U|^{2n} on U(N), and on SU(N), counts the permutations of n letters without an increasing subsequence longer
than N. The numbers are typed from memory and computed again here by two other routes: the sum of squared
numbers of standard tableaux (Robinson and Schensted, hook lengths), and for small n the permutations
themselves.
"""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Iterator
from itertools import permutations
from math import factorial, prod

import pytest

from haarloom.algebra.group import SU

SEQUENCES = {
    2: (1, 1, 2, 5, 14, 42, 132, 429, 1430, 4862, 16796),
    3: (1, 1, 2, 6, 23, 103, 513, 2761, 15767, 94359, 586590),
    4: (1, 1, 2, 6, 24, 119, 694, 4582, 33324, 261808, 2190688),
    5: (1, 1, 2, 6, 24, 120, 719, 5003, 39429, 344837, 3291590),
}
CATALAN = {2: (1, 1, 2, 5, 14, 42), 3: (1, 1, 5, 42, 462, 6006), 4: (1, 1, 14, 462, 24024)}


@pytest.mark.parametrize("n", SEQUENCES)
def test_even_moments(n: int) -> None:
    loop = SU(n).loop
    squared = loop * loop.conjugate()
    moments = [(squared**k).haar() for k in range(11)]
    assert moments == list(SEQUENCES[n])


@pytest.mark.parametrize("n", SEQUENCES)
def test_the_sequences_by_hook_lengths(n: int) -> None:
    for k, count in enumerate(SEQUENCES[n]):
        assert count == sum(standard_tableaux(shape) ** 2 for shape in shapes(k, n))


@pytest.mark.parametrize("n", SEQUENCES)
def test_the_sequences_by_counting_permutations(n: int) -> None:
    for k in range(8):
        assert SEQUENCES[n][k] == sum(longest_increasing(order) <= n for order in permutations(range(k)))


@pytest.mark.parametrize("n", CATALAN)
def test_baryon_moments_are_higher_catalan_numbers(n: int) -> None:
    """∫ (tr U)^{Nk} on SU(N): standard tableaux of the N × k rectangle, the N-dimensional Catalan numbers."""
    loop = SU(n).loop
    for k, count in enumerate(CATALAN[n]):
        assert (loop ** (n * k)).haar() == count == standard_tableaux((k,) * n if k else ())


def test_moments_that_vanish_by_the_centre() -> None:
    loop, conjugate = SU(3).loop, SU(3).loop.conjugate()
    for a in range(5):
        for b in range(5):
            if (a - b) % 3:
                assert (loop**a * conjugate**b).haar() == 0


@pytest.mark.parametrize("n", [2, 3, 4])
def test_moments_of_the_adjoint_count_derangement_like_pairings(n: int) -> None:
    """χ_adj = |tr U|² − 1, so its moments are alternating sums of the sequences above."""
    adjoint = SU(n).adjoint.character()
    for k in range(7):
        signs = ((-1) ** (k - j) * factorial(k) // (factorial(j) * factorial(k - j)) for j in range(k + 1))
        assert (adjoint**k).haar() == sum(s * SEQUENCES[n][j] for j, s in enumerate(signs))


def shapes(boxes: int, rows: int, longest: int | None = None) -> Iterator[tuple[int, ...]]:
    """Partitions of ``boxes`` into at most ``rows`` parts."""
    if boxes == 0:
        yield ()
        return
    for first in range(min(boxes, longest or boxes), 0, -1):
        if rows:
            for rest in shapes(boxes - first, rows - 1, first):
                yield (first, *rest)


def standard_tableaux(shape: tuple[int, ...]) -> int:
    """Frame, Robinson and Thrall's hook-length formula."""
    hooks = (
        row - j + sum(1 for other in shape[i + 1 :] if other > j)
        for i, row in enumerate(shape)
        for j in range(row)
    )
    return factorial(sum(shape)) // prod(hooks)


def longest_increasing(order: tuple[int, ...]) -> int:
    piles: list[int] = []
    for card in order:
        place = bisect_left(piles, card)
        piles[place : place + 1] = [card]
    return len(piles)
