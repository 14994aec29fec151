"""A sum of irreps with multiplicities: what a tensor product or power falls apart into."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from haarloom.algebra.group import SU, same_group
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import Labels, order_key
from haarloom.algebra.products import multiply_many, multiply_sums

if TYPE_CHECKING:
    from haarloom.algebra.class_function import ClassFunction
    from haarloom.algebra.product_steps import ProductStory

__all__ = ["Decomposition", "product_of"]

_MOST_SHOWN = 60


class Decomposition(Mapping[Irrep, int]):
    """A finite sum of irreps of one group, a read-only mapping from irrep to multiplicity in basis order.

    Two decompositions are equal when they hold the same irreps with the same multiplicities, wherever they
    came from.
    """

    __slots__ = ("_terms", "factors", "group")
    group: SU
    factors: tuple[Irrep, ...]
    _terms: dict[Irrep, int]

    def __init__(self, group: SU, terms: Mapping[Labels, int], factors: Sequence[Irrep] = ()) -> None:
        object.__setattr__(self, "group", group)
        object.__setattr__(self, "factors", tuple(factors))
        ordered = sorted((labels for labels, count in terms.items() if count), key=order_key)
        object.__setattr__(self, "_terms", {Irrep(group, labels): terms[labels] for labels in ordered})

    def __setattr__(self, name: str, value: object) -> None:
        raise AttributeError("a Decomposition is a frozen value; build a new one.")

    def __getitem__(self, irrep: Irrep) -> int:
        return self._terms[irrep]

    def __iter__(self) -> Iterator[Irrep]:
        return iter(self._terms)

    def __len__(self) -> int:
        return len(self._terms)

    def __eq__(self, other: object) -> bool:
        if isinstance(other, Decomposition):
            return self.group is other.group and self._terms == other._terms
        return self._terms == dict(other) if isinstance(other, Mapping) else NotImplemented

    def __hash__(self) -> int:
        return hash((self.group.n, tuple(self._terms.items())))

    def __reduce__(self) -> tuple[Any, ...]:
        return Decomposition, (self.group, self.by_labels(), self.factors)

    def __repr__(self) -> str:
        shown = list(self._terms.items())[:4]
        body = ", ".join(f"{irrep.labels}: {count}" for irrep, count in shown)
        return f"Decomposition({self.group}, {{{body}{', …' if len(self) > 4 else ''}}})"

    def __str__(self) -> str:
        return (
            " + ".join((f"{count}·" if count > 1 else "") + irrep.name for irrep, count in self.items())
            or "0"
        )

    def by_labels(self) -> dict[Labels, int]:
        """The same mapping on plain label tuples."""
        return {irrep.labels: count for irrep, count in self._terms.items()}

    @property
    def dimension(self) -> int:
        """Sum of the dimensions, with multiplicities."""
        return sum(count * irrep.dimension for irrep, count in self._terms.items())

    def character(self) -> ClassFunction:
        """Sum of the characters, with multiplicities."""
        from haarloom.algebra.class_function import ClassFunction

        return ClassFunction(self.group, self._terms)

    def __mul__(self, other: Any) -> Decomposition:
        """Tensor product with an irrep or with another decomposition of the same group."""
        if isinstance(other, Irrep):
            other = Decomposition(other.group, {other.labels: 1}, (other,))
        if not isinstance(other, Decomposition):
            return NotImplemented
        for irrep in other:
            same_group(self.group, irrep)
        factors = (*self.factors, *other.factors) if self.factors and other.factors else ()
        return Decomposition(self.group, multiply_sums(self.by_labels(), other.by_labels()), factors)

    def __rmul__(self, other: Any) -> Decomposition:
        return self * other if isinstance(other, Irrep) else NotImplemented

    def __add__(self, other: Any) -> Decomposition:
        """Direct sum."""
        if not isinstance(other, Decomposition):
            return NotImplemented
        total = self.by_labels()
        for irrep, count in other.items():
            labels = same_group(self.group, irrep).labels
            total[labels] = total.get(labels, 0) + count
        return Decomposition(self.group, total)

    def steps(self, form: str = "weights") -> tuple[ProductStory, ...]:
        """How the product came about, one story for each pair of irreps that was multiplied.

        Parameters
        ----------
        form : "weights" or "tableaux"
            Weight reflection, or the fillings of Littlewood and Richardson.

        Raises
        ------
        ParameterError
            When this is no product of irreps (a power's symmetric part, a direct sum).
        """
        from haarloom.algebra.product_steps import stories

        return stories(self.factors, form)

    def latex(self) -> str:
        r"""The sum in LaTeX, ``\oplus`` between the irreps."""
        terms = [(f"{count}\\," if count > 1 else "") + irrep.latex() for irrep, count in self.items()]
        return r" \oplus ".join(terms) or "0"

    def _repr_latex_(self) -> str:
        """What a notebook shows: a long sum is cut short."""
        if len(self) <= _MOST_SHOWN:
            return f"${self.latex()}$"
        shown = {irrep.labels: count for irrep, count in list(self.items())[:_MOST_SHOWN]}
        return rf"${Decomposition(self.group, shown).latex()} \oplus \cdots$"


def product_of(group: SU, factors: Sequence[Irrep]) -> Decomposition:
    """Tensor product of any number of irreps of one group; of none, the trivial irrep."""
    labels = [same_group(group, factor).labels for factor in factors]
    return Decomposition(group, multiply_many(labels, group.rank), factors)
