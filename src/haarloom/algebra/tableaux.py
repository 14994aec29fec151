"""Tensor products by counting tableaux: the rule of Littlewood and Richardson.

Independent of the weight reflection in :mod:`haarloom.algebra.products`, which it referees; also the second
form in which a product tells its steps. The boxes of the right factor's row k carry the letter k and are
added to the left factor's diagram, letter by letter, so that no two equal letters share a column, and
reading rows from the right, top to bottom, letter k never outnumbers letter k − 1 (I. G. Macdonald,
*Symmetric Functions and Hall Polynomials*, I.9).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from haarloom.algebra.labels import Labels, Rows, labels_from_rows, rows_from_labels

__all__ = ["Filling", "count_by_tableaux", "fillings"]


@dataclass(frozen=True)
class Filling:
    """One admissible filling.

    Attributes
    ----------
    start : rows of the left factor's diagram, N of them
    letters : for each row, how many boxes with letter 1, 2, … were added to it
    """

    start: Rows
    letters: tuple[tuple[int, ...], ...]

    @property
    def rows(self) -> Rows:
        """Rows of the diagram that results."""
        return tuple(row + sum(added) for row, added in zip(self.start, self.letters, strict=True))

    @property
    def labels(self) -> Labels:
        """Dynkin labels of the irrep that results; full columns dropped."""
        return labels_from_rows(self.rows)

    def text(self) -> str:
        """The tableau as text, one line a row: a dot for an old box, the letter for a new one."""
        lines = [
            "." * row + "".join(str(letter) * count for letter, count in enumerate(added, start=1))
            for row, added in zip(self.start, self.letters, strict=True)
        ]
        return "\n".join(line for line in lines if line)


def fillings(left: Labels, right: Labels) -> Iterator[Filling]:
    """All admissible fillings for left ⊗ right; each is one irrep of the product."""
    start, word = rows_from_labels(left), [row for row in rows_from_labels(right) if row]
    for columns in _letters(start, word, None):
        letters = tuple(tuple(column[row] for column in columns) for row in range(len(start)))
        yield Filling(start, letters)


def count_by_tableaux(left: Labels, right: Labels) -> dict[Labels, int]:
    """Irreps in a product with multiplicities, by counting fillings.

    >>> count_by_tableaux((1, 1), (1, 1)) == {(2, 2): 1, (3, 0): 1, (0, 3): 1, (1, 1): 2, (0, 0): 1}
    True
    """
    found: dict[Labels, int] = {}
    for filling in fillings(left, right):
        found[filling.labels] = found.get(filling.labels, 0) + 1
    return found


def _letters(shape: Rows, word: list[int], above: Rows | None) -> Iterator[tuple[Rows, ...]]:
    """For every letter the boxes it adds to each row; ``above`` is where the letter before it went."""
    if not word:
        yield ()
        return
    for added in _strips(shape, word[0], above):
        grown = tuple(a + b for a, b in zip(shape, added, strict=True))
        for rest in _letters(grown, word[1:], added):
            yield (added, *rest)


def _strips(shape: Rows, boxes: int, above: Rows | None) -> Iterator[Rows]:
    """Ways to add ``boxes`` equal letters to a diagram as a horizontal strip under the lattice rule."""

    def grow(row: int, left: int, placed: int, before: int) -> Iterator[Rows]:
        if row == len(shape):
            if left == 0:
                yield ()
            return
        room = left if row == 0 else min(left, shape[row - 1] - shape[row])
        if above is not None:  # up to this row no more than letter − 1 in the rows above it
            room = min(room, before - placed)
        for count in range(room, -1, -1):
            after = before + (above[row] if above is not None else 0)
            for rest in grow(row + 1, left - count, placed + count, after):
                yield (count, *rest)

    yield from grow(0, boxes, 0, 0)
