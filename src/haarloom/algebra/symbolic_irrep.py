"""Irreps whose Dynkin labels are symbols: invariants as polynomials, products as formulas."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations
from typing import TYPE_CHECKING, Any

from sympy import Expr, Integer, Mul, Rational, Symbol, expand, factor, latex, sympify

from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import validated_labels
from haarloom.exceptions import GroupError, LabelError, ParameterError

if TYPE_CHECKING:
    from haarloom.algebra.group import SU
    from haarloom.algebra.symbolic_product import SymbolicProduct

__all__ = ["SymbolicIrrep"]


@dataclass(frozen=True, repr=False)
class SymbolicIrrep:
    """A family of irreps of SU(N); the symbols in its labels stand for integers ≥ 0.

    Build it with ``SU(N).irrep(p, q)`` and SymPy symbols.

    Attributes
    ----------
    group : SU
    labels : tuple of N − 1 SymPy expressions

    Examples
    --------
    >>> from sympy.abc import p, q
    >>> from haarloom.algebra.group import SU
    >>> SU(3).irrep(p, q).dimension
    (p + 1)*(q + 1)*(p + q + 2)/2
    """

    group: SU
    labels: tuple[Expr, ...]

    @classmethod
    def from_labels(cls, group: SU, labels: Sequence[Any]) -> SymbolicIrrep:
        """Check the labels: N − 1 whole numbers ≥ 0, or polynomials in symbols with whole coefficients.

        Raises
        ------
        LabelError
            For a wrong number of labels or one that can be no integer.
        """
        if len(labels) != group.rank:
            raise LabelError(
                f"{len(labels)} labels {tuple(labels)} given; {group} takes {group.rank} of them."
            )
        return cls(group, tuple(_symbolic_label(label, place) for place, label in enumerate(labels, start=1)))

    def __repr__(self) -> str:
        return f"{self.group}.irrep({', '.join(map(str, self.labels))})"

    @property
    def free_symbols(self) -> set[Symbol]:
        """Symbols in the labels."""
        return {symbol for label in self.labels for symbol in label.free_symbols}

    @property
    def conjugate(self) -> SymbolicIrrep:
        """The complex conjugate family: labels reversed."""
        return SymbolicIrrep(self.group, self.labels[::-1])

    @property
    def dimension(self) -> Expr:
        """Weyl's formula: over i < j, the product of (a_i + … + a_{j−1} + j − i)/(j − i); factored."""
        number, factors = Rational(1), []
        for i, j in combinations(range(self.group.n), 2):
            content, polynomial = expand(sum(self.labels[i:j]) + (j - i)).primitive()
            number *= Rational(content, j - i)
            factors.append(polynomial)
        return Mul(number, *factors)

    @property
    def nality(self) -> Expr:
        """Σ i·a_i, to be taken mod N."""
        return expand(sum(i * label for i, label in enumerate(self.labels, start=1)))

    def casimir(self, degree: int = 2) -> Expr:
        """Casimir of degree 2 or 3, generators normalised with T_F = 1/2; expanded, C₃ of SU(3) factored.

        Raises
        ------
        ParameterError
            For any other degree.
        """
        if degree not in (2, 3):
            raise ParameterError(f"Casimir of degree {degree!r} asked for; the degrees built in are 2 and 3.")
        n, shifted = self.group.n, self._traceless_rows()
        if degree == 3:
            cubic = expand(sum(row**3 for row in shifted) / 2)
            return factor(cubic) if n == 3 else cubic
        return expand((sum(row**2 for row in shifted) - Rational(n * (n**2 - 1), 12)) / 2)

    @property
    def index(self) -> Expr:
        """Index d·C₂/(N² − 1), factored."""
        return self.dimension * factor(self.casimir(2)) / (self.group.n**2 - 1)

    def at(self, **values: int) -> Irrep:
        """The irrep of the family with whole numbers for the symbols, by name.

        Raises
        ------
        LabelError
            When a label stays symbolic or becomes negative.
        """
        numbers = {
            symbol: sympify(values[symbol.name]) for symbol in self.free_symbols if symbol.name in values
        }
        return Irrep(
            self.group, validated_labels(self.group.rank, [_number(v.subs(numbers)) for v in self.labels])
        )

    def __mul__(self, other: Any) -> SymbolicProduct:
        """Product with a concrete irrep as a formula with its conditions.

        Raises
        ------
        ParameterError
            For two families: the multiplicities of their product are not bounded.
        GroupError
            For an irrep of another group.
        """
        if isinstance(other, SymbolicIrrep):
            raise ParameterError(
                f"{self} ⊗ {other} given; with symbols in both factors the multiplicities are not "
                "bounded and no "
                "finite formula exists: give one factor numbers for labels."
            )
        if not isinstance(other, Irrep):
            return NotImplemented
        if other.group is not self.group:
            raise GroupError(f"irreps of {self.group} and {other.group} given: they do not multiply.")
        from haarloom.algebra.symbolic_product import symbolic_product

        return symbolic_product(self, other)

    __rmul__ = __mul__

    def latex(self) -> str:
        r"""The labels in LaTeX: ``(p,q)``."""
        return f"({','.join(latex(label) for label in self.labels)})"

    def _repr_latex_(self) -> str:
        return f"${self.latex()}$"

    def _traceless_rows(self) -> list[Expr]:
        """λ_i − n/N + (N + 1)/2 − i."""
        n = self.group.n
        rows = [sum(self.labels[i:], Integer(0)) for i in range(n)]
        mean = sum(rows) / n
        return [row - mean + Rational(n + 1, 2) - i for i, row in enumerate(rows, start=1)]


def _symbolic_label(raw: Any, place: int) -> Expr:
    label = raw if isinstance(raw, Expr) else Integer(validated_labels(1, [raw])[0])
    whole = (
        label.is_polynomial(*label.free_symbols)
        and all(number.is_Integer for number in label.as_poly(*label.free_symbols).coeffs())
        if label.free_symbols
        else label.is_Integer and label >= 0
    )
    if not whole or any(symbol.is_integer is False for symbol in label.free_symbols):
        raise LabelError(
            f"Dynkin label a_{place} is {label}; it must be an integer ≥ 0, or a polynomial with whole "
            "coefficients "
            "in symbols that stand for integers."
        )
    return label


def _number(value: Expr) -> Any:
    if not value.is_Integer:
        raise LabelError(f"label {value} left; give every symbol a whole number: .at(p=1, q=0).")
    return int(value)
