"""The truncated basis of irreps, and how large it may become."""

from __future__ import annotations

from typing import TYPE_CHECKING

from haarloom.exceptions import ParameterError, SizeError

if TYPE_CHECKING:
    from haarloom.algebra.group import SU
    from haarloom.algebra.irrep import Irrep

__all__ = ["irrep_basis", "position_in"]

SYMBOLIC_LIMIT = 500
"""Most irreps in a symbolic matrix: 250,000 elements, of which each non-zero one is a SymPy tree."""

BYTES_PER_ELEMENT = 1500
"""Measured size of one non-zero symbolic element with its share of the containers."""


def irrep_basis(group: SU, cutoff: int) -> tuple[Irrep, ...]:
    """The irreps with Σ a_i ≤ cutoff for a symbolic matrix, in the order of ``group.irreps``.

    Raises
    ------
    SizeError
        Before anything is built, if the matrix would not fit; the message says the size.
    """
    size = group.count_irreps(cutoff)
    if size > SYMBOLIC_LIMIT:
        gigabytes = size * size * BYTES_PER_ELEMENT / 1e9
        raise SizeError(
            f"cutoff = {cutoff} on {group} means {size:,} irreps and {size * size:,} symbolic elements "
            f"(up to {gigabytes:,.1f} GB); a symbolic matrix is limited to {SYMBOLIC_LIMIT} irreps. "
            "Take a smaller cutoff, or ask model.spectrum(...) for numbers: it needs no symbolic matrix."
        )
    return group.irreps(cutoff)


def position_in(basis: tuple[Irrep, ...], irrep: Irrep) -> int:
    """Row of an irrep in the basis.

    Raises
    ------
    ParameterError
        If the cutoff left it out.
    """
    try:
        return basis.index(irrep)
    except ValueError:
        last = sum(basis[-1].labels)
        raise ParameterError(
            f"irrep {irrep.name} with labels {irrep.labels} lies outside the basis Σ a_i ≤ {last}: "
            f"take cutoff ≥ {sum(irrep.labels)}."
        ) from None
