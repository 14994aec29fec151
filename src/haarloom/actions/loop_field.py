"""A field that couples to loops: exp[Σ_r h_r χ_r(P)]."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from math import gcd
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray
from sympy import Expr, S

from haarloom.actions.base import refuse_group
from haarloom.actions.character_factors import CharacterFactor, ExponentialFactor
from haarloom.actions.coefficient_table import irrep_table
from haarloom.actions.multiplicative import Factor, multiplicative_coefficients
from haarloom.actions.parameters import Field, Parameter, Values, evaluate
from haarloom.actions.torus_site import TorusSite, summed_tail
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.torus.characters import characters

__all__ = ["LoopField", "loop_field"]

_FIELDS = Field("fields", "irrep table", "3: h, 3bar: h", "field h_r by irrep, exp[Σ h_r χ_r]")
_ENTRY = Field("h", "complex", "h", "field of one irrep")


def loop_field(group: SU, fields: Mapping[Irrep | str | tuple[int, ...], Parameter]) -> LoopField:
    """Site weight exp[Σ_r h_r χ_r(P)].

    Parameters
    ----------
    group : SU
    fields : mapping
        From an irrep, its name or its labels to h_r. An irrep and its conjugate have fields of their own:
        ``{"3": h, "3bar": h}`` gives exp[h(L + L*)].

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> field = loop_field(SU(2), {"2": 0.5})
    >>> float(field.coefficient(SU(2).trivial).evalf())  # 2 I_1(1)
    1.13031820798497...
    """
    refuse_group("loop_field", group)
    return LoopField(group, irrep_table(group, fields, _ENTRY))


@dataclass(frozen=True)
class LoopField(TorusSite):
    """exp[Σ_r h_r χ_r(P)]; see `loop_field`."""

    group: SU
    fields: tuple[tuple[Irrep, Expr], ...]

    kind: ClassVar[str] = "loop field"
    FIELDS: ClassVar[tuple[Field, ...]] = (_FIELDS,)
    accuracy: ClassVar[str] = (
        "Toeplitz determinants for fields on F and its conjugate, else a transform with measured error."
    )
    bounds_proven: ClassVar[bool] = True

    @property
    def exponent(self) -> ClassFunction:
        """Σ_r h_r χ_r as a class function."""
        return ClassFunction(self.group, dict(self.fields))

    def character_factors(self) -> tuple[CharacterFactor, ...]:
        """The exponential of a finite class function."""
        return (ExponentialFactor(self.exponent),)

    def coefficient(self, irrep: Irrep) -> Expr:
        """A named coefficient; zero where no product of the fields' irreps has the N-ality of the irrep."""
        step = gcd(self.group.n, *(field.nality for field, _ in self.fields))
        return S.Zero if irrep.nality % step else super().coefficient(irrep)

    @property
    def factors(self) -> tuple[Factor, ...] | None:
        """Factors over the eigenvalues of P, if only the fundamental and its conjugate occur."""
        sense = {self.group.antifundamental: -1, self.group.fundamental: 1}
        if not all(irrep in sense for irrep, _ in self.fields):
            return None
        return tuple(Factor("field", value, 1, sense[irrep]) for irrep, value in self.fields)

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """w_c by Toeplitz determinants where the weight factorises, else by transform on the torus."""
        if irreps and self.factors:
            return multiplicative_coefficients(self.factors, irreps, values)
        return super().coefficients_at(irreps, values)

    def norm_bound(self, values: Values) -> NDArray[Any]:
        """exp of a bound on Re Σ h_r χ_r: Σ |h_r| d_r."""
        numbers = evaluate([value for _, value in self.fields], values)
        total = sum(np.abs(h) * irrep.dimension for (irrep, _), h in zip(self.fields, numbers, strict=True))
        return np.asarray(np.exp(total) * (1 + 1e-12))

    def tail_bound(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Σ |w_c| d_c beyond the cutoff: proven, moderate shells summed and the rest by the series."""
        return summed_tail(self, cutoff, values, self._series_tail)

    def _series_tail(self, cutoff: int, values: Values) -> NDArray[np.float64]:
        """Σ |w_c| d_c beyond the cutoff from the exponential series.

        With s the largest sum of labels among the fields, m factors reach at most m·s, and all of them
        together have Σ |w_c| d_c ≤ x^m/m!, x = Σ |h_r| d_r; the rest of that series is below its first term
        times 1/(1 − x/(m + 1)) once m + 1 > x, and below e^x always.
        """
        numbers = evaluate([value for _, value in self.fields], values)
        x = np.asarray(sum(np.abs(h) * r.dimension for (r, _), h in zip(self.fields, numbers, strict=True)))
        longest = max(1, max(sum(irrep.labels) for irrep, _ in self.fields))
        return exponential_tail(x, cutoff // longest + 1)

    def density_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """exp[Σ h_r χ_r(θ)]."""
        numbers = evaluate([value for _, value in self.fields], values)
        table = characters([irrep for irrep, _ in self.fields], angles)
        return np.asarray(np.exp(sum(h * table[..., place] for place, h in enumerate(numbers))))

    def latex(self) -> str:
        """exp of the sum of characters."""
        return rf"W(P)=\exp\left[{self.exponent.latex()}\right]"


def exponential_tail(x: NDArray[np.float64], start: int) -> NDArray[np.float64]:
    """Upper bound of Σ_{m ≥ start} x^m/m!, x ≥ 0."""
    from scipy.special import gammaln

    with np.errstate(divide="ignore"):
        first = np.exp(start * np.log(x) - gammaln(start + 1))
    ratio = x / (start + 1)
    return np.asarray(
        np.where(ratio < 1, np.minimum(first / np.maximum(1 - ratio, 1e-300), np.exp(x)), np.exp(x))
    )
