"""The symbolic transfer matrix on a truncated basis."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import sympy

from haarloom.exceptions import LabelError
from haarloom.ring.basis import position_in
from haarloom.ring.roots import positive_root
from haarloom.ring.site_elements import site_elements

if TYPE_CHECKING:
    import numpy as np

    from haarloom.algebra.irrep import Irrep
    from haarloom.ring.derivation import Derivation
    from haarloom.ring.model import RingModel

Elements = dict[tuple[int, int], sympy.Expr]

__all__ = ["TransferMatrix", "build_transfer_matrix"]


@dataclass(frozen=True)
class TransferMatrix:
    """T_rs = √k_r ⟨r|W|s⟩ √k_s, exact, on the irreps of ``basis``.

    Index it with two irreps, names or label tuples: ``T["3", "3bar"]``, ``T[(1, 0), (0, 1)]``.

    A link that mixes irreps has no square root in closed form. Its matrix is K W, (K W)_rs = Σ_q k_rq ⟨q|W|s⟩
    with q in the basis: similar to K^{1/2} W K^{1/2} on the same basis, so with the same eigenvalues.
    """

    model: RingModel
    basis: tuple[Irrep, ...]
    elements: Mapping[tuple[int, int], sympy.Expr] = field(repr=False, hash=False, compare=False)

    @property
    def cutoff(self) -> int:
        """Largest Σ a_i in the basis."""
        return sum(self.basis[-1].labels)

    @cached_property
    def matrix(self) -> sympy.ImmutableDenseMatrix:
        """The whole matrix, shape (n, n), rows and columns in the order of ``basis``."""
        size = len(self.basis)
        entries = [sympy.S.Zero] * (size * size)
        for (row, column), element in self.elements.items():
            entries[row * size + column] = element
        return sympy.ImmutableDenseMatrix(size, size, entries)

    def __getitem__(self, pair: tuple[Any, Any]) -> sympy.Expr:
        row, column = (position_in(self.basis, irrep) for irrep in self._irreps(pair))
        return self.elements.get((row, column), sympy.S.Zero)

    def derivation(self, bra: Any, ket: Any) -> Derivation:
        """How the element ⟨bra|T|ket⟩ comes about, step by step."""
        from haarloom.ring.derivation import derive

        row, column = self._irreps((bra, ket))
        position_in(self.basis, row)
        position_in(self.basis, column)
        return derive(self.model, self.basis, row, column)

    def numeric(self, **values: Any) -> np.ndarray:
        """``matrix`` as numbers, shape broadcast(values) + (n, n); float64 where all values are real.

        See :func:`haarloom.numerics.compile.compile_transfer`, which is compiled once and kept.
        """
        from haarloom.numerics.compile import compile_transfer

        compiled = compile_transfer(self.model, self.cutoff)
        return compiled(**values) if self.model.link.diagonal else compiled.unsymmetric(**values)

    def pattern(self) -> tuple[tuple[bool, ...], ...]:
        """True where an element is not identically zero."""
        size = range(len(self.basis))
        return tuple(tuple((row, column) in self.elements for column in size) for row in size)

    def nality_blocks(self) -> Mapping[tuple[int, int], tuple[tuple[int, int], ...]]:
        """The places of the non-zero elements, grouped by (N-ality of row, N-ality of column)."""
        blocks: dict[tuple[int, int], list[tuple[int, int]]] = {}
        for row, column in sorted(self.elements):
            key = (self.basis[row].nality, self.basis[column].nality)
            blocks.setdefault(key, []).append((row, column))
        return MappingProxyType({key: tuple(places) for key, places in sorted(blocks.items())})

    def _irreps(self, pair: Any) -> tuple[Irrep, Irrep]:
        if not isinstance(pair, tuple) or len(pair) != 2:
            raise LabelError(
                f"T[{pair!r}] names no element: give a row and a column, "
                "each an irrep, a name or a tuple of labels, e.g. T['3', '3bar'] or T[(1, 0), (0, 1)]."
            )
        row, column = (self.model.group.irrep(irrep) for irrep in pair)
        return row, column

    def __repr__(self) -> str:
        size = len(self.basis)
        shape = f"cutoff {self.cutoff}, {size} × {size}, {len(self.elements)} non-zero"
        return f"TransferMatrix({self.model.group}, {shape})"

    def _repr_latex_(self) -> str:
        from haarloom.ring.faces import matrix_latex

        return matrix_latex(self)


def build_transfer_matrix(model: RingModel, basis: tuple[Irrep, ...]) -> TransferMatrix:
    """Join the site elements with the link: between roots, or below its rows if it mixes irreps."""
    join = _between_roots if model.link.diagonal else _below_rows
    elements = join(model, basis, site_elements(model.site, basis))
    kept = {place: element for place, element in elements.items() if element != 0}
    return TransferMatrix(model, basis, MappingProxyType(kept))


def _between_roots(model: RingModel, basis: tuple[Irrep, ...], site: Elements) -> Elements:
    """√k_r ⟨r|W|s⟩ √k_s."""
    roots = [positive_root(model.link.coefficient(irrep)) for irrep in basis]
    return {(row, column): roots[row] * element * roots[column] for (row, column), element in site.items()}


def _below_rows(model: RingModel, basis: tuple[Irrep, ...], site: Elements) -> Elements:
    """Σ_q k_rq ⟨q|W|s⟩."""
    rows: dict[int, list[tuple[int, sympy.Expr]]] = defaultdict(list)
    for (row, middle), k in model.link.kernel(basis).todok().items():
        rows[int(middle)].append((int(row), k))
    terms: dict[tuple[int, int], list[sympy.Expr]] = defaultdict(list)
    for (middle, column), element in site.items():
        for row, k in rows[middle]:
            terms[row, column].append(k * element)
    return {place: sympy.Add(*summands) for place, summands in terms.items()}
