"""Trade names of irreps, both ways.

Rules
-----
* A name is the dimension. Irreps of one dimension that are not conjugates of each other are told apart by
  primes, in order of rising index, then of the basis order (R. Slansky, *Phys. Rep.* 79 (1981) 1, primes the
  same way).
* Of a conjugate pair one carries ``bar``. SU(3): the one with p < q. SU(N ≥ 4): the one with the larger
  N-ality; when both have the same, the one whose labels come later in lexicographic descent. So for SU(5)
  10 = (0,1,0,0) and 45 = (0,1,0,1).
* The prime stands before ``bar``: ``15'bar``.
* SU(2) names are spins, ``j=1/2``; ``1/2`` and the dimension (``"2"``) are understood as well.
* Above dimension 100,000 an irrep is called by its labels, ``(40,40)``. Labels are understood everywhere.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from difflib import get_close_matches
from functools import lru_cache

from haarloom.algebra.invariants import dimension, dynkin_index, nality
from haarloom.algebra.labels import Labels, labels_up_to, order_key, validated_labels
from haarloom.exceptions import UnknownNameError

__all__ = ["labels_from_name", "name_from_labels"]

_LARGEST_NAMED = 100_000


@lru_cache(maxsize=8192)
def name_from_labels(labels: Labels) -> str:
    """Trade name of an irrep.

    >>> name_from_labels((0, 1)), name_from_labels((4, 0)), name_from_labels((1,))
    ('3bar', "15'", 'j=1/2')
    """
    if len(labels) == 1:
        return f"j={labels[0] // 2}" if labels[0] % 2 == 0 else f"j={labels[0]}/2"
    if dimension(labels) > _LARGEST_NAMED:
        return _label_name(labels)
    plain = _plain_of_pair(labels)
    family = _families(len(labels), dimension(labels))
    return f"{dimension(labels)}{chr(39) * family.index(plain)}{'' if labels == plain else 'bar'}"


def labels_from_name(n: int, name: str) -> Labels:
    """Dynkin labels of the irrep of SU(n) that carries a name.

    >>> labels_from_name(3, "15'"), labels_from_name(3, "(2,1)"), labels_from_name(2, "j=1/2")
    ((4, 0), (2, 1), (1,))

    Raises
    ------
    UnknownNameError
        When no irrep carries the name; near names are suggested.
    """
    labels = _parsed(n, name.strip())
    if labels is None:
        raise UnknownNameError(_no_such(n, name))
    return labels


def _parsed(n: int, name: str) -> Labels | None:
    if match := re.fullmatch(r"\(\s*([0-9]+(?:\s*,\s*[0-9]+)*)\s*,?\s*\)", name):
        return validated_labels(n - 1, [int(label) for label in match[1].split(",")])
    if n == 2 and (match := re.fullmatch(r"(?:j=)?([0-9]{1,6})/2", name)):
        return (int(match[1]),) if int(match[1]) % 2 else None
    if n == 2 and (match := re.fullmatch(r"j=([0-9]{1,6})", name)):
        return (2 * int(match[1]),)
    if match := re.fullmatch(r"([0-9]{1,6})('*)(bar)?", name):
        return _by_dimension(n - 1, int(match[1]), len(match[2]), bool(match[3]))
    return None


def _by_dimension(rank: int, size: int, primes: int, barred: bool) -> Labels | None:
    if not 0 < size <= _LARGEST_NAMED:
        return None
    family = _families(rank, size)
    if primes >= len(family):
        return None
    plain = family[primes]
    if barred and plain == plain[::-1]:
        return None
    return plain[::-1] if barred else plain


def _plain_of_pair(labels: Labels) -> Labels:
    """The member of a conjugate pair that goes without ``bar``."""
    other = labels[::-1]
    if len(labels) > 2 and nality(labels) != nality(other):
        return labels if nality(labels) < nality(other) else other
    return max(labels, other)


@lru_cache(maxsize=2048)
def _families(rank: int, size: int) -> tuple[Labels, ...]:
    """Un-barred irreps of one dimension in the order of their primes."""
    plain = {_plain_of_pair(labels) for labels in _of_dimension(rank, size)}
    return tuple(sorted(plain, key=lambda labels: (dynkin_index(labels), order_key(labels))))


def _of_dimension(rank: int, size: int) -> Iterator[Labels]:
    """All labels of one dimension: it grows with every label, so the search is finite."""
    if rank == 2:
        yield from _of_dimension_su3(size)
        return
    stack: list[Labels] = [()]
    while stack:
        head = stack.pop()
        for label in range(size):
            grown = (*head, label)
            found = dimension((*grown, *(0,) * (rank - len(grown))))
            if found > size:
                break
            if len(grown) < rank:
                stack.append(grown)
            elif found == size:
                yield grown


def _of_dimension_su3(size: int) -> Iterator[Labels]:
    """Solutions of a·b·(a + b) = 2·size with a = p + 1, b = q + 1."""
    for a in range(1, 2 * size + 1):
        if a * (a + 1) > 2 * size:
            return
        b = 1
        low, high = 1, 2 * size
        while low < high:
            b = (low + high) // 2
            if a * b * (a + b) < 2 * size:
                low = b + 1
            else:
                high = b
        if a * low * (a + low) == 2 * size:
            yield (a - 1, low - 1)


def _label_name(labels: Labels) -> str:
    return f"({','.join(map(str, labels))})"


def _no_such(n: int, name: str) -> str:
    known = _small_names(n)
    near = get_close_matches(name, known, n=4, cutoff=0.4) or list(known[:6])
    return (
        f"irrep name {name!r} given; SU({n}) has no irrep called so. Near names: {', '.join(near)}. "
        f'Labels always work: "({",".join(["1"] + ["0"] * (n - 2))})".'
    )


@lru_cache(maxsize=8)
def _small_names(n: int) -> tuple[str, ...]:
    cutoff = {2: 12, 3: 8, 4: 4}.get(n, 3)
    names = [name_from_labels(labels) for labels in labels_up_to(n - 1, cutoff)]
    return (*names, *map(str, range(1, 13))) if n == 2 else tuple(names)
