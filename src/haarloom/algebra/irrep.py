"""An irreducible representation of SU(N): a frozen value made of its group and its Dynkin labels."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from sympy import Rational

from haarloom.algebra import faces, invariants
from haarloom.algebra.drawings import Drawing, draw_weights, draw_young
from haarloom.algebra.labels import Labels, Rows, order_key, rows_from_labels
from haarloom.algebra.names import name_from_labels
from haarloom.algebra.weights import dominant_weights, weights
from haarloom.exceptions import ParameterError

if TYPE_CHECKING:
    from haarloom.algebra.branching import Branch
    from haarloom.algebra.class_function import ClassFunction
    from haarloom.algebra.decomposition import Decomposition
    from haarloom.algebra.group import SU

__all__ = ["Irrep"]


@dataclass(frozen=True, slots=True, repr=False, eq=False)
class Irrep:
    """An irrep of SU(N). Build it with ``SU(N).irrep(…)``, which checks the labels.

    Attributes
    ----------
    group : SU
    labels : tuple of N − 1 int
        Dynkin labels a_1 … a_{N−1}; for SU(3) (p, q).
    """

    group: SU
    labels: Labels

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Irrep):
            return NotImplemented
        return self.labels == other.labels and self.group is other.group

    def __hash__(self) -> int:
        return hash(self.labels)

    def __lt__(self, other: Irrep) -> bool:
        """The basis order: by the sum of the labels, then by labels descending lexicographically."""
        if not isinstance(other, Irrep):
            return NotImplemented
        return (self.group.n, order_key(self.labels)) < (other.group.n, order_key(other.labels))

    def __repr__(self) -> str:
        return f"{self.group}.irrep({', '.join(map(str, self.labels))})"

    def __str__(self) -> str:
        return self.name

    @property
    def dimension(self) -> int:
        """Dimension, by Weyl's formula."""
        return invariants.dimension(self.labels)

    @property
    def partition(self) -> Rows:
        """Rows of the Young diagram, N of them, the last one 0."""
        return rows_from_labels(self.labels)

    @property
    def nality(self) -> int:
        """N-ality Σ i·a_i mod N: the charge under the centre."""
        return invariants.nality(self.labels)

    @property
    def index(self) -> Rational:
        """Index T = d·C₂/(N² − 1); ½ for the fundamental."""
        return invariants.dynkin_index(self.labels)

    @property
    def conjugate(self) -> Irrep:
        """The complex conjugate irrep: labels reversed."""
        return Irrep(self.group, self.labels[::-1])

    @property
    def is_real(self) -> bool:
        """Whether the irrep equals its conjugate (the character is real; pseudoreal counts as well)."""
        return self.labels == self.labels[::-1]

    def casimir(self, degree: int = 2) -> Rational:
        """Casimir of degree 2 or 3, generators normalised with T_F = 1/2.

        >>> from haarloom.algebra.group import SU
        >>> SU(3).fundamental.casimir(2), SU(3).fundamental.casimir(3)
        (4/3, 10/9)

        Raises
        ------
        ParameterError
            For any other degree.
        """
        if degree == 2:
            return invariants.quadratic_casimir(self.labels)
        if degree == 3:
            return invariants.cubic_casimir(self.labels)
        raise ParameterError(f"Casimir of degree {degree!r} asked for; the degrees built in are 2 and 3.")

    @property
    def name(self) -> str:
        """Trade name: ``"3bar"``, ``"15'"``, ``"j=1/2"``; the rules are in :mod:`haarloom.algebra.names`."""
        return name_from_labels(self.labels)

    def latex(self) -> str:
        r"""Trade name in LaTeX, without dollar signs: ``\overline{\mathbf{3}}``."""
        return faces.latex_name(self.name)

    def html(self) -> str:
        """Trade name in HTML, the bar drawn as an overline."""
        return faces.html_name(self.name)

    def _repr_latex_(self) -> str:
        return f"${self.latex()}$"

    def weights(self) -> dict[Labels, int]:
        """Weights in Dynkin labels with their multiplicities; they add up to the dimension."""
        return weights(self.labels)

    def dominant_weights(self) -> dict[Labels, int]:
        """The weights without negative labels, one for each Weyl orbit, with multiplicities."""
        return dominant_weights(self.labels)

    def young_diagram(self) -> Drawing:
        """The Young diagram as a picture that shows itself in a notebook; its SVG text is ``.svg``."""
        return draw_young(self.partition, self.name)

    def weight_diagram(self) -> Drawing:
        """The weights as a picture that shows itself in a notebook; its SVG text is ``.svg``."""
        return draw_weights(self.labels, self.name)

    def branches(self) -> tuple[Branch, ...]:
        """Restriction to SU(N−1) × U(1); see :func:`haarloom.algebra.branching.branches`."""
        from haarloom.algebra.branching import branches

        return branches(self)

    def character(self) -> ClassFunction:
        """The character tr_r P as a class function."""
        from haarloom.algebra.class_function import ClassFunction

        return ClassFunction(self.group, {self: 1})

    def __mul__(self, other: Any) -> Decomposition:
        """Tensor product with another irrep of the same group."""
        if not isinstance(other, Irrep):
            return NotImplemented
        from haarloom.algebra.decomposition import product_of

        return product_of(self.group, (self, other))

    def power(self, n: int) -> Decomposition:
        """The n-fold tensor product of the irrep with itself; n = 0 gives the trivial irrep."""
        from haarloom.algebra.powers import tensor_power

        return tensor_power(self, n)

    def symmetric_power(self, n: int) -> Decomposition:
        """The totally symmetric part of the n-fold tensor product."""
        from haarloom.algebra.powers import symmetric_power

        return symmetric_power(self, n)

    def antisymmetric_power(self, n: int) -> Decomposition:
        """The totally antisymmetric part of the n-fold tensor product; empty for n above the dimension."""
        from haarloom.algebra.powers import antisymmetric_power

        return antisymmetric_power(self, n)

    def schur_power(self, *rows: int) -> Decomposition:
        """The part of the tensor product with the symmetry of a Young diagram, given by its rows."""
        from haarloom.algebra.powers import schur_power

        return schur_power(self, rows)
