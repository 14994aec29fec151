"""Products of a symbolic family of irreps with a concrete one, each term with its conditions.

For labels a and a weight μ of the concrete irrep c, (a + μ) occurs in (a) ⊗ c as often as c has vectors of
weight μ that are killed by e_i^{a_i + 1} for every i (K. R. Parthasarathy, R. Ranga Rao, V. S. Varadarajan,
*Ann. Math.* 85 (1967) 383). So a multiplicity depends on each a_i only up to the longest string of c, never
falls when an a_i grows, and finitely many concrete products settle every boundary case.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import product
from math import prod

from sympy import And, Expr, Integer, Or, S, latex
from sympy.logic.boolalg import Boolean

from haarloom.algebra.decomposition import Decomposition
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import Labels
from haarloom.algebra.products import multiply
from haarloom.algebra.symbolic_irrep import SymbolicIrrep
from haarloom.algebra.weights import weights
from haarloom.exceptions import SizeError

__all__ = ["SymbolicProduct", "SymbolicTerm", "symbolic_product"]

_MOST_CASES = 20_000


@dataclass(frozen=True)
class SymbolicTerm:
    """One irrep of the product.

    Attributes
    ----------
    labels : tuple of SymPy expressions, a + weight
    weight : Dynkin labels of the weight of the concrete factor
    thresholds : for each copy the minimal label vectors from which on it occurs
        A copy occurs when a_i ≥ t_i for all i, for at least one of its vectors t.
    conditions : the same as SymPy relations, one for each copy; ``true`` where it always occurs
    """

    labels: tuple[Expr, ...]
    weight: Labels
    thresholds: tuple[tuple[Labels, ...], ...]
    conditions: tuple[Boolean, ...]

    @property
    def multiplicity(self) -> int:
        """Copies in the generic case, all labels large."""
        return len(self.conditions)

    def latex(self) -> str:
        """The term in LaTeX, each copy with its condition in brackets."""
        name = f"({','.join(latex(label) for label in self.labels)})"
        shown = [
            name if condition == S.true else rf"{name}\,[{latex(condition)}]" for condition in self.conditions
        ]
        return r" \oplus ".join(shown)

    def text(self) -> str:
        """The term as plain text."""
        name = f"({', '.join(map(str, self.labels))})"
        shown = [
            name if condition == S.true else f"{name} [{_spoken(condition)}]" for condition in self.conditions
        ]
        return " + ".join(shown)


@dataclass(frozen=True)
class SymbolicProduct:
    """(a) ⊗ c for symbolic a: terms from the highest weight of c down.

    Examples
    --------
    >>> from sympy.abc import p, q
    >>> from haarloom.algebra.group import SU
    >>> print(SU(3).irrep(p, q) * SU(3).irrep("3"))
    (p + 1, q) + (p - 1, q + 1) [p ≥ 1] + (p, q - 1) [q ≥ 1]
    """

    family: SymbolicIrrep
    factor: Irrep
    terms: tuple[SymbolicTerm, ...]

    def at(self, **values: int) -> Decomposition:
        """The product for whole numbers in place of the symbols, from the formula."""
        start = self.family.at(**values).labels
        found: dict[Labels, int] = {}
        for term in self.terms:
            copies = sum(any(_reached(start, t) for t in copy) for copy in term.thresholds)
            if copies:
                found[tuple(a + m for a, m in zip(start, term.weight, strict=True))] = copies
        return Decomposition(self.family.group, found)

    def __str__(self) -> str:
        return " + ".join(term.text() for term in self.terms)

    def latex(self) -> str:
        """The formula in LaTeX."""
        terms = r" \oplus ".join(term.latex() for term in self.terms)
        return rf"{self.family.latex()} \otimes {self.factor.latex()} = {terms}"

    def _repr_latex_(self) -> str:
        return f"${self.latex()}$"


def symbolic_product(family: SymbolicIrrep, factor: Irrep) -> SymbolicProduct:
    """Derive the formula from the concrete products at every corner of the box of label vectors that matter.

    Raises
    ------
    SizeError
        When more than 20,000 concrete products would be needed.
    """
    system = weights(factor.labels)
    axes = [_axis(label, max(abs(weight[i]) for weight in system)) for i, label in enumerate(family.labels)]
    cases = prod(map(len, axes))
    if cases > _MOST_CASES:
        raise SizeError(
            f"the formula for {family} ⊗ {factor!r} takes {cases:,} concrete products, more than "
            f"{_MOST_CASES:,}: "
            "use a smaller irrep, or numbers for some labels."
        )
    table = {corner: multiply(corner, factor.labels) for corner in product(*axes)}
    terms = (_term(family, weight, table) for weight in system)
    return SymbolicProduct(family, factor, tuple(term for term in terms if term.conditions))


def _axis(label: Expr, longest: int) -> range:
    """Values of one label that can make a difference; a number is only itself."""
    return range(int(label), int(label) + 1) if label.is_Integer else range(longest + 1)


def _term(
    family: SymbolicIrrep, weight: Labels, table: Mapping[Labels, Mapping[Labels, int]]
) -> SymbolicTerm:
    counts = {
        corner: found.get(tuple(a + m for a, m in zip(corner, weight, strict=True)), 0)
        for corner, found in table.items()
    }
    thresholds = tuple(_minimal(counts, copy) for copy in range(1, max(counts.values()) + 1))
    labels = tuple(label + Integer(m) for label, m in zip(family.labels, weight, strict=True))
    conditions = tuple(_condition(family, corners) for corners in thresholds)
    return SymbolicTerm(labels, weight, thresholds, conditions)


def _minimal(counts: Mapping[Labels, int], copy: int) -> tuple[Labels, ...]:
    """The minimal corners at which at least ``copy`` copies occur."""
    reached = [corner for corner, count in counts.items() if count >= copy]
    return tuple(c for c in reached if not any(other != c and _reached(c, other) for other in reached))


def _reached(labels: Labels, threshold: Labels) -> bool:
    return all(a >= t for a, t in zip(labels, threshold, strict=True))


def _condition(family: SymbolicIrrep, corners: tuple[Labels, ...]) -> Boolean:
    return Or(*(And(*_relations(family, corner)) for corner in corners))


def _relations(family: SymbolicIrrep, corner: Labels) -> Iterator[Boolean]:
    for label, threshold in zip(family.labels, corner, strict=True):
        if threshold > 0 and not label.is_Integer:
            yield label >= threshold


def _spoken(condition: Boolean) -> str:
    if isinstance(condition, Or):
        return " or ".join(sorted(_spoken(part) for part in condition.args))
    if isinstance(condition, And):
        return ", ".join(sorted(_spoken(part) for part in condition.args))
    return f"{condition.lhs} ≥ {condition.rhs}"
