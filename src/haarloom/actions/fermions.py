"""Static fermions: det_R(1 + zP)^n det_R(1 + z̄P†)^n."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, ClassVar, Literal

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr

from haarloom.actions.fugacity_table import Monomials, fundamental_monomials, power_table
from haarloom.actions.multiplicative import multiplicative_coefficients
from haarloom.actions.parameters import Field, Parameter, Values, evaluate
from haarloom.actions.static_matter import COPIES, IRREP, StaticMatter, static_arguments
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import SizeError

__all__ = ["StaticFermions", "static_fermions"]

_Z = Field("z", "complex", "z", "fugacity z = exp((μ − M)/T) of the particles")
_ZBAR = Field("zbar", "complex", "0", "fugacity z̄ = exp(−(μ + M)/T) of the antiparticles", True)

_MOST_IRREPS = 3000
_MOST_TERMS = 10_000
_FEW_COPIES = 6
_EPS = float(np.finfo(float).eps)


def static_fermions(
    group: SU,
    z: Parameter | None = None,
    zbar: Parameter = 0,
    copies: int = 1,
    irrep: Irrep | str | tuple[int, ...] = "fundamental",
    **physical: Any,
) -> StaticFermions:
    """Site weight of heavy fermions that only move in time.

    Parameters
    ----------
    group : SU
    z, zbar : number, expression or name
        Fugacities of particles and antiparticles; they may be complex.
    copies : int
        n = spin states × flavours, the same for both.
    irrep : Irrep, name or labels
        R, the fundamental unless said otherwise; the antiparticles are in its conjugate.
    **physical
        Instead of z and z̄: ``mass``, ``mu``, ``temperature``; or ``kappa``, ``n_t``, ``mu`` for heavy
        Wilson quarks at leading order in κ (see `haarloom.actions.fugacities`).

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> static_fermions(SU(3), "z").class_function().in_loops()
    L*z + L^**z**2 + z**3 + 1
    >>> static_fermions(SU(3), mass="m", mu="mu", temperature="T").z
    exp((-m + mu)/T)
    """
    given = (z, zbar, copies, irrep)
    return StaticFermions(*static_arguments("static_fermions", group, (_Z, _ZBAR), given, physical))


@dataclass(frozen=True)
class StaticFermions(StaticMatter):
    """det_R(1 + zP)^n det_R(1 + z̄P†)^n; see `static_fermions`."""

    sign: ClassVar[Literal[1, -1]] = 1
    statistics: ClassVar[Literal["fermion", "boson"]] = "fermion"
    kind: ClassVar[str] = "static fermions"
    FIELDS: ClassVar[tuple[Field, ...]] = (_Z, _ZBAR, COPIES, IRREP)
    accuracy: ClassVar[str] = "Exact polynomials in the fugacities; floats with a bound on rounding."

    @property
    def _simple(self) -> bool:
        return self.irrep in (self.group.fundamental, self.group.antifundamental)

    @property
    def _copies_of_antiparticles(self) -> int:
        return self.copies if self.zbar != 0 else 0

    def _monomials(self, irrep: Irrep) -> Monomials:
        if self._simple:
            mirrored = irrep if self.irrep == self.group.fundamental else irrep.conjugate
            return fundamental_monomials(mirrored.partition, self.copies, self._copies_of_antiparticles)
        table = power_table(self.irrep, self.copies, self._copies_of_antiparticles)
        return table.get(irrep.labels, {})

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact w_c, a polynomial in z and z̄.

        Raises
        ------
        SizeError
            If it would have more than ten thousand terms.
        """
        monomials = {powers: count for powers, count in self._monomials(irrep).items() if count}
        if len(monomials) > _MOST_TERMS:
            raise SizeError(
                f"The coefficient of {irrep.name} for {self.copies} copies with antiparticles has "
                f"{len(monomials):,} terms, more than {_MOST_TERMS:,}: take fewer copies, or ask for numbers "
                "(coefficients_at, model.spectrum), which need no polynomial."
            )
        z = {i: self.z**i for i in {i for i, _ in monomials}}
        zbar = {j: self.zbar**j for j in {j for _, j in monomials}}
        return sympy.Add(*(sympy.Mul(count, z[i], zbar[j]) for (i, j), count in monomials.items()))

    def support(self) -> tuple[Irrep, ...]:
        """Every irrep that occurs, in basis order."""
        if not self._simple:
            table = power_table(self.irrep, self.copies, self._copies_of_antiparticles)
            return tuple(sorted(self.group.irrep(*labels) for labels in table))
        reach = self.copies + self._copies_of_antiparticles
        count = self.group.count_irreps(reach)
        if count > 50 * _MOST_IRREPS:
            raise SizeError(
                f"{self.copies} copies reach {count:,} irreps of {self.group}; ask for the coefficients of "
                f"the "
                "irreps you need instead of for all."
            )
        return self.group.irreps(reach)

    def class_function(self) -> ClassFunction:
        """The exact class function in characters."""
        support = self.support()
        if len(support) > _MOST_IRREPS:
            raise SizeError(
                f"The class function has {len(support):,} characters, more than {_MOST_IRREPS:,}; ask for "
                f"single "
                "coefficients, or for numbers."
            )
        return ClassFunction(self.group, {irrep: self.coefficient(irrep) for irrep in support})

    def reach(self, values: Values) -> int | None:
        """Largest sum of labels that occurs."""
        if self._simple:
            return self.copies + self._copies_of_antiparticles
        return super().reach(values)

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """w_c from its polynomial for few copies, from Toeplitz determinants for many."""
        if irreps and self.factors and self._copies_of_antiparticles and self.copies > _FEW_COPIES:
            return multiplicative_coefficients(self.factors, irreps, values)
        z, zbar = np.broadcast_arrays(*evaluate([self.z, self.zbar], values))
        return polynomial_values([self._monomials(irrep) for irrep in irreps], z, zbar)

    def norm_bound(self, values: Values) -> NDArray[Any]:
        """(1 + |z|)^{nd} (1 + |z̄|)^{nd}: every eigenvalue has modulus one."""
        z, zbar = (np.abs(value) for value in evaluate([self.z, self.zbar], values))
        power = self.copies * self.irrep.dimension
        return np.asarray((1 + z) ** power * (1 + zbar) ** power * (1 + 8 * power * _EPS))


def polynomial_values(
    polynomials: Sequence[Monomials], z: NDArray[Any], zbar: NDArray[Any]
) -> tuple[NDArray[Any], NDArray[Any]]:
    """Values of integer polynomials at arrays of fugacities, and a bound on the rounding error."""
    keys = sorted({key for polynomial in polynomials for key in polynomial})
    place = {key: row for row, key in enumerate(keys)}
    counts = np.zeros((len(keys), len(polynomials)))
    for column, polynomial in enumerate(polynomials):
        for key, count in polynomial.items():
            counts[place[key], column] = float(count)
    i, j = (np.array([key[axis] for key in keys]) for axis in (0, 1))
    monomials = z[..., None] ** i * zbar[..., None] ** j
    degree = max((a + b for a, b in keys), default=0)
    return monomials @ counts, (4 + degree + len(keys)) * _EPS * (np.abs(monomials) @ counts)
