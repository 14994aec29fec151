"""Static fermions: det_R(1 + zP)^n det_R(1 + z̄P†)^n."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr, S

from haarloom.actions.base import Site, refuse_group
from haarloom.actions.fugacities import fugacities, known_inputs
from haarloom.actions.fugacity_table import Monomials, fundamental_monomials, power_table
from haarloom.actions.heat_kernel import positive_integer
from haarloom.actions.irrep_words import irrep_of
from haarloom.actions.multiplicative import Factor, multiplicative_coefficients
from haarloom.actions.parameters import Field, Parameter, Values, evaluate
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import SizeError
from haarloom.torus.angles import full_angles

__all__ = ["COPIES", "StaticFermions", "eigenphases_of", "static_fermions"]

_Z = Field("z", "complex", "z", "fugacity z = exp((μ − M)/T) of the particles")
_ZBAR = Field("zbar", "complex", "0", "fugacity z̄ = exp(−(μ + M)/T) of the antiparticles", True)
COPIES = Field("copies", "positive integer", "1", "copies n = spin states × flavours", True)
IRREP = Field("irrep", "irrep", "fundamental", "irrep R of the particles", True)

_MOST_IRREPS = 3000
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
    refuse_group("static_fermions", group)
    return StaticFermions(
        group,
        *fugacities(z, zbar, (_Z, _ZBAR), **known_inputs(physical)),
        positive_integer("copies", copies),
        irrep_of(group, irrep),
    )


@dataclass(frozen=True)
class StaticFermions(Site):
    """det_R(1 + zP)^n det_R(1 + z̄P†)^n; see `static_fermions`."""

    group: SU
    z: Expr
    zbar: Expr
    copies: int
    irrep: Irrep

    kind: ClassVar[str] = "static fermions"
    FIELDS: ClassVar[tuple[Field, ...]] = (_Z, _ZBAR, COPIES, IRREP)
    accuracy: ClassVar[str] = "Exact polynomials in the fugacities; floats with a bound on rounding."

    @property
    def factors(self) -> tuple[Factor, ...] | None:
        """Factors over the eigenvalues of P, if R is the fundamental or its conjugate."""
        if not self._simple:
            return None
        sense = 1 if self.irrep == self.group.fundamental else -1
        forward = Factor("fermion", self.z, self.copies, sense)
        backward = Factor("fermion", self.zbar, self.copies, -sense)
        return (forward, backward) if self.zbar != 0 else (forward,)

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
        """Exact w_c, a polynomial in z and z̄."""
        terms = [
            count * self.z**i * self.zbar**j for (i, j), count in self._monomials(irrep).items() if count
        ]
        return sympy.Add(*terms) if terms else S.Zero

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

    def density_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """∏ over the weights of R of (1 + z e^{iw·θ})^n (1 + z̄ e^{−iw·θ})^n."""
        z, zbar = evaluate([self.z, self.zbar], values)
        phases, multiplicities = eigenphases_of(self.irrep, angles)
        eigenvalues = np.exp(1j * phases)
        factors = (1 + z[..., None] * eigenvalues) * (1 + zbar[..., None] / eigenvalues)
        return np.asarray((factors ** (self.copies * multiplicities)).prod(axis=-1))

    def latex(self) -> str:
        """Both determinants."""
        return "W(P)=" + determinant_latex(self, "1+{}P", "1+{}P^\\dagger", self.copies)


def determinant_latex(weight: Any, particle: str, antiparticle: str, power: int) -> str:
    """det_R(…)^n det_R(…)^n with the fugacities in place; a fugacity of zero leaves its factor out."""
    irrep = "" if weight.irrep == weight.group.fundamental else f"_{{{weight.irrep.latex()}}}"
    exponent = "" if power == 1 else f"^{{{power}}}"
    text = ""
    for fugacity, inside in ((weight.z, particle), (weight.zbar, antiparticle)):
        if fugacity != 0:
            factor = sympy.latex(fugacity)
            factor = rf"\left({factor}\right)" if fugacity.is_Add else factor
            text += rf"\det{irrep}\left({inside.format(factor)}\right){exponent}"
    return text or "1"


def eigenphases_of(irrep: Irrep, angles: NDArray[Any]) -> tuple[NDArray[np.float64], NDArray[np.int_]]:
    """Eigenphases of P in the irrep, shape (..., number of weights), and their multiplicities."""
    phases = full_angles(irrep.group.n, angles)
    weights = irrep.weights()
    labels = np.array(list(weights), dtype=float)
    # w·θ = Σ_i labels_i (θ_1 + … + θ_i), because the fundamental weight i is e_1 + … + e_i
    partial = np.cumsum(phases[..., :-1], axis=-1)
    return partial @ labels.T, np.array(list(weights.values()))


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
