"""A link weight from a table of coefficients k_r; what the table lacks is zero."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray
from sympy import Expr, S

from haarloom.actions.base import Link, refuse_group
from haarloom.actions.coefficient_sources import coefficient_mapping
from haarloom.actions.irrep_words import irrep_of
from haarloom.actions.parameters import Field, Parameter, Values, as_parameter
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ParameterError

__all__ = ["CoefficientTable", "link_from_coefficients"]

_TABLE = Field("coefficients", "irrep table", "1: 1, 3: k, 3bar: k", "k_r by irrep; what is missing is zero")
_ENTRY = Field("k", "complex", "k", "coefficient of one irrep")


def link_from_coefficients(group: SU, coefficients: Any) -> CoefficientTable:
    """Link weight K = Σ_r k_r χ_r(P) χ_r(P′)* with the k_r of a table.

    Parameters
    ----------
    group : SU
    coefficients : mapping, str, Path or array
        A mapping from an irrep, its name or its labels to k_r; the path of a CSV file with the header
        ``irrep,k`` or ``a1,…,k``; an array in basis order, or of N − 1 dimensions by labels. Irreps that
        are not listed have k_r = 0; the result's `note` says so.

    Raises
    ------
    ParameterError
        If the table is empty or names an irrep twice.

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> link = link_from_coefficients(SU(3), {"1": 1, "3": "k", "3bar": "k"})
    >>> link.coefficient(SU(3).irrep(1, 1))
    0
    """
    refuse_group("link_from_coefficients", group)
    return CoefficientTable(group, irrep_table(group, coefficient_mapping(group, coefficients), _ENTRY))


def irrep_table(group: SU, table: Mapping[Any, Parameter], entry: Field) -> tuple[tuple[Irrep, Expr], ...]:
    """A user's mapping of irreps to values, checked, exact and in basis order."""
    if not isinstance(table, Mapping) or not table:
        raise ParameterError(
            f'A table of irreps is needed, for instance {{"3": "{entry.name}", "3bar": 0.5}}; got {table!r}.'
        )
    found: dict[Irrep, Expr] = {}
    for key, value in table.items():
        irrep = irrep_of(group, key)
        if irrep in found:
            raise ParameterError(f"The irrep {irrep.name} occurs twice in the table; keep one of the two.")
        found[irrep] = as_parameter(value, entry)
    return tuple(sorted(found.items(), key=lambda item: (sum(item[0].labels), [-a for a in item[0].labels])))


@dataclass(frozen=True)
class CoefficientTable(Link):
    """k_r from a table; see `link_from_coefficients`."""

    group: SU
    coefficients: tuple[tuple[Irrep, Expr], ...]

    kind: ClassVar[str] = "coefficient table"
    FIELDS: ClassVar[tuple[Field, ...]] = (_TABLE,)
    accuracy: ClassVar[str] = "As exact as the table; what it lacks is zero."
    bounds_proven: ClassVar[bool] = True

    @property
    def note(self) -> str:
        """What was listed, and that the rest is zero."""
        names = [irrep.name for irrep, _ in self.coefficients]
        shown = ", ".join(names[:12]) + (f" and {len(names) - 12} more" if len(names) > 12 else "")
        return f"k_r given for {shown}; every other k_r is set to zero."

    def coefficient(self, irrep: Irrep) -> Expr:
        """k_r as listed, else zero."""
        return dict(self.coefficients).get(irrep, S.Zero)

    def largest_outside(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Largest |k_r| listed beyond the cutoff, else 0: proven."""
        outside = [irrep for irrep, _ in self.coefficients if sum(irrep.labels) > cutoff]
        if not outside:
            return np.zeros(())
        k, error = self.coefficients_at(outside, values)
        return np.asarray((np.abs(k) + error).max(axis=-1))

    @property
    def kernel_reach(self) -> int:
        """Largest Σ a_i of the irreps listed."""
        return max(sum(irrep.labels) for irrep, _ in self.coefficients)

    def plaquette_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any] | None:
        """Σ_r d_r k_r χ_r(U), the finite class function of one plaquette."""
        from haarloom.torus.characters import characters

        irreps = [irrep for irrep, _ in self.coefficients]
        k, _ = self.coefficients_at(irreps, values)
        dimensions = np.array([float(irrep.dimension) for irrep in irreps])
        return np.asarray(characters(irreps, angles) @ (k * dimensions))

    def formula(self) -> str:
        """LaTeX of the listed k_r."""
        from sympy import latex

        parts = [rf"k_{{{r.latex()}}}={latex(k)}" for r, k in self.coefficients[:12]]
        listed = r",\ ".join(parts + [r"\dots"] * (len(self.coefficients) > 12))
        return rf"0\ \text{{except}}\ {listed}"
