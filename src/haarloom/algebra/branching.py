"""Restriction of irreps: to SU(N−1) × U(1), and to the centre of SU(N)."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import labels_from_rows
from haarloom.algebra.weights import interlacing
from haarloom.exceptions import GroupError

__all__ = ["Branch", "branches", "centre_content"]


@dataclass(frozen=True)
class Branch:
    """One irrep of SU(N−1) × U(1).

    Attributes
    ----------
    irrep : Irrep of SU(N−1)
    charge : int
        Under the generator diag(1, …, 1, −(N−1)), not normalised.
    """

    irrep: Irrep
    charge: int

    def latex(self) -> str:
        r"""The branch in LaTeX, the charge as a subscript: ``\mathbf{2}_{1}``."""
        return f"{self.irrep.latex()}_{{{self.charge}}}"


def branches(irrep: Irrep) -> tuple[Branch, ...]:
    """Restriction SU(N) → SU(N−1) × U(1); every branch occurs once.

    The diagrams μ of GL(N−1) that occur interlace the rows, λ_1 ≥ μ_1 ≥ λ_2 ≥ …, each of them once (H.
    Weyl, *The Classical Groups*, chapter V). With |μ| boxes the charge is N|μ| − (N−1)|λ|.

    Examples
    --------
    >>> [(b.irrep.dimension, b.charge) for b in branches(SU(3).fundamental)]
    [(2, 1), (1, -2)]

    Raises
    ------
    GroupError
        For SU(2), whose subgroup of this kind is U(1) alone: see its weights.
    """
    n = irrep.group.n
    if n == 2:
        raise GroupError("SU(2) given; it branches to U(1) alone: its weights are the charges.")
    below, boxes = SU(n - 1), sum(irrep.partition)
    found = [
        Branch(Irrep(below, labels_from_rows(rows)), n * sum(rows) - (n - 1) * boxes)
        for rows in interlacing(irrep.partition)
    ]
    return tuple(sorted(found, key=lambda branch: (-branch.charge, branch.irrep)))


def centre_content(irreps: Mapping[Irrep, int] | Irrep) -> dict[int, int]:
    """How many states carry each charge under the centre, of an irrep or of a sum of irreps.

    Examples
    --------
    >>> G = SU(3)
    >>> centre_content(G.fundamental * G.fundamental)
    {2: 9}
    """
    terms = {irreps: 1} if isinstance(irreps, Irrep) else irreps
    found: dict[int, int] = {}
    for irrep, count in terms.items():
        found[irrep.nality] = found.get(irrep.nality, 0) + count * irrep.dimension
    return dict(sorted(found.items()))
