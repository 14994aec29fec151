"""Young diagrams for SU(N) with N left open: dimension and Casimir as functions of N."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

from sympy import Expr, Integer, Rational, Symbol, factor

from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import Rows, labels_from_rows, transposed, validated_rows
from haarloom.exceptions import LabelError

__all__ = ["YoungDiagram"]


@dataclass(frozen=True)
class YoungDiagram:
    """A Young diagram; with it an irrep of every SU(N) that has at least as many rows.

    Build it with ``YoungDiagram.of(2, 1)``, which checks the rows.

    Examples
    --------
    >>> YoungDiagram.of(2, 1).dimension()
    N*(N - 1)*(N + 1)/3
    >>> YoungDiagram.of(1).casimir()
    (N - 1)*(N + 1)/(2*N)
    """

    rows: Rows

    @classmethod
    def of(cls, *rows: int) -> YoungDiagram:
        """A diagram by its row lengths, which never grow downwards; no row at all is the trivial irrep."""
        return cls(validated_rows(rows))

    @property
    def boxes(self) -> int:
        """Number of boxes."""
        return sum(self.rows)

    @property
    def transposed(self) -> YoungDiagram:
        """Rows and columns exchanged."""
        return YoungDiagram(transposed(self.rows))

    def hooks(self) -> tuple[tuple[int, ...], ...]:
        """Hook lengths, row by row: boxes to the right and below, and the box itself."""
        columns = transposed(self.rows)
        return tuple(
            tuple(row - j + columns[j] - i - 1 for j in range(row)) for i, row in enumerate(self.rows)
        )

    def dimension(self, n: Any = None) -> Expr:
        """Dimension by the hook-content formula ∏ (N + j − i)/h(i, j), factored.

        I. G. Macdonald, *Symmetric Functions and Hall Polynomials*, §I.3, example 4. ``n`` may be a number or an
        expression in place of the symbol N.
        """
        size = _open(n)
        result: Expr = Integer(1)
        for (i, j), hook in zip(self._places(), (h for row in self.hooks() for h in row), strict=True):
            result *= (size + j - i) / Integer(hook)
        return factor(result)

    def casimir(self, n: Any = None) -> Expr:
        """C₂ = ½[k(N − k/N) + Σ λ_i(λ_i − 2i + 1)] with k boxes, generators normalised with T_F = 1/2."""
        size, k = _open(n), self.boxes
        contents = sum(row * (row - 2 * i + 1) for i, row in enumerate(self.rows, start=1))
        return factor(Rational(1, 2) * (k * (size - k / size) + contents))

    def index(self, n: Any = None) -> Expr:
        """Index d·C₂/(N² − 1) as a function of N."""
        return factor(self.dimension(n) * self.casimir(n) / (_open(n) ** 2 - 1))


    def irrep(self, group: SU) -> Irrep:
        """The irrep of a given SU(N).

        Raises
        ------
        LabelError
            When the diagram has more than N rows.
        """
        if len(self.rows) > group.n:
            raise LabelError(
                f"a diagram of {len(self.rows)} rows given; {group} has none with more than {group.n} rows."
            )
        padded = (*self.rows, *(0,) * (group.n - len(self.rows)))
        return Irrep(group, labels_from_rows(padded))

    def _places(self) -> Iterator[tuple[int, int]]:
        return ((i, j) for i, row in enumerate(self.rows) for j in range(row))


def _open(n: Any) -> Expr:
    return Symbol("N") if n is None else (n if isinstance(n, Expr) else Integer(n))
