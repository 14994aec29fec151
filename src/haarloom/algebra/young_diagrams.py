"""Young diagrams for SU(N) with N left open: dimension, Casimir and index as functions of N."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

from sympy import Expr, Integer, Rational, Symbol, factor, interpolate

from haarloom.algebra import invariants
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import Labels, Rows, transposed, validated_rows
from haarloom.exceptions import LabelError

__all__ = ["YoungDiagram"]


@dataclass(frozen=True)
class YoungDiagram:
    """A Young diagram, and with it an irrep of every SU(N) that is large enough.

    Build it with ``YoungDiagram.of(2, 1)``, which checks the rows. ``mirrored`` rows stand for the
    conjugate of a diagram, joined at the bottom: ``YoungDiagram.of(1, mirrored=(1,))`` is the adjoint of
    every SU(N).

    Attributes
    ----------
    rows, mirrored : tuple of int

    Examples
    --------
    >>> YoungDiagram.of(2, 1).dimension()
    N*(N - 1)*(N + 1)/3
    >>> YoungDiagram.of(1, mirrored=(1,)).dimension(), YoungDiagram.of(1, mirrored=(1,)).casimir()
    ((N - 1)*(N + 1), N)
    """

    rows: Rows
    mirrored: Rows = ()

    @classmethod
    def of(cls, *rows: int, mirrored: Sequence[int] = ()) -> YoungDiagram:
        """A diagram by its row lengths, which never grow downwards; no row at all is the trivial irrep.

        Raises
        ------
        LabelError
            For rows that grow downwards, or are no integers ≥ 0.
        """
        return cls(validated_rows(rows), validated_rows(mirrored))

    @property
    def boxes(self) -> int:
        """Number of boxes, mirrored ones counted negative; modulo N it is the N-ality."""
        return sum(self.rows) - sum(self.mirrored)

    @property
    def conjugate(self) -> YoungDiagram:
        """The diagram of the conjugate irreps."""
        return YoungDiagram(self.mirrored, self.rows)

    def hooks(self) -> tuple[tuple[int, ...], ...]:
        """Hook lengths of the rows: boxes to the right and below, and the box itself."""
        columns = transposed(self.rows)
        return tuple(
            tuple(row - j + columns[j] - i - 1 for j in range(row)) for i, row in enumerate(self.rows)
        )

    def dimension(self, n: Any = None) -> Expr:
        """Dimension, factored; ``n`` may be a number or an expression in place of the symbol N.

        Without mirrored rows the hook-content formula ∏ (N + j − i)/h(i, j) (I. G. Macdonald, *Symmetric
        Functions and Hall Polynomials*, §I.3, example 4). With them a polynomial of degree |rows| +
        |mirrored|, fixed by Weyl's formula at that many N and one more.
        """
        size = _open(n)
        if self.mirrored:
            return factor(self._interpolated(size))
        places = [(i, j) for i, row in enumerate(self.rows) for j in range(row)]
        result: Expr = Integer(1)
        for (i, j), hook in zip(places, (hook for row in self.hooks() for hook in row), strict=True):
            result *= (size + j - i) / Integer(hook)
        return factor(result)

    def casimir(self, n: Any = None) -> Expr:
        """C₂ = ½[k(N − k/N) + Σ λ_i(λ_i − 2i + 1)] with k boxes, generators normalised with T_F = 1/2.

        Mirrored rows ν_i are rows −ν_i at the bottom and add Σ ν_i(ν_i − 2i + 1) + 2N Σ ν_i to the sum.
        """
        size, k = _open(n), self.boxes
        parts = (self.rows, self.mirrored)
        sums = [sum(row * (row - 2 * i + 1) for i, row in enumerate(rows, start=1)) for rows in parts]
        return factor(Rational(1, 2) * (k * (size - k / size) + sum(sums) + 2 * size * sum(self.mirrored)))

    def index(self, n: Any = None) -> Expr:
        """Index d·C₂/(N² − 1) as a function of N, factored."""
        return factor(self.dimension(n) * self.casimir(n) / (_open(n) ** 2 - 1))

    def irrep(self, group: SU) -> Irrep:
        """The irrep of a given SU(N).

        Raises
        ------
        LabelError
            When the diagram has more than N rows.
        """
        needed = len(self.rows) + len(self.mirrored)
        if needed > group.n:
            raise LabelError(
                f"a diagram of {needed} rows given; {group} has irreps of at most {group.n} rows: take "
                "a larger N."
            )
        return Irrep(group, self._labels(group.n))

    def _labels(self, n: int) -> Labels:
        gap = (0,) * (n - len(self.rows) - len(self.mirrored))
        rows = (*self.rows, *gap, *(-row for row in reversed(self.mirrored)))
        return tuple(upper - lower for upper, lower in pairwise(rows))

    def _interpolated(self, size: Expr) -> Expr:
        first = max(2, len(self.rows) + len(self.mirrored))
        points = range(first, first + sum(self.rows) + sum(self.mirrored) + 1)
        values = [(n, invariants.dimension(self._labels(n))) for n in points]
        return interpolate(values, Symbol("N")).subs(Symbol("N"), size)


def _open(n: Any) -> Expr:
    return Symbol("N") if n is None else (n if isinstance(n, Expr) else Integer(n))
