"""Static bosons: det_R(1 − zP)^{−n} det_R(1 − z̄P†)^{−n}, |z| < 1."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, ClassVar, Literal

import numpy as np
from numpy.typing import NDArray
from sympy import Expr, S

from haarloom.actions.character_factors import BosonFactor, CharacterFactor
from haarloom.actions.fugacity_table import general_linear_dimension
from haarloom.actions.multiplicative import multiplicative_coefficients
from haarloom.actions.parameters import Field, Parameter, Values
from haarloom.actions.static_matter import COPIES, IRREP, StaticMatter, static_arguments
from haarloom.actions.torus_site import TorusSite, summed_tail
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep

__all__ = ["StaticBosons", "static_bosons"]

_Z = Field("z", "boson fugacity", "z", "fugacity z = exp((μ − M)/T) of the particles")
_ZBAR = Field("zbar", "boson fugacity", "0", "fugacity z̄ = exp(−(μ + M)/T) of the antiparticles", True)


def static_bosons(
    group: SU,
    z: Parameter | None = None,
    zbar: Parameter = 0,
    copies: int = 1,
    irrep: Irrep | str | tuple[int, ...] = "fundamental",
    **physical: Any,
) -> StaticBosons:
    """Site weight of heavy bosons that only move in time.

    Parameters
    ----------
    group, z, zbar, copies, irrep, **physical
        As for `static_fermions`, with fugacities of modulus below 1.

    Raises
    ------
    ParameterError
        If |z| ≥ 1 or |z̄| ≥ 1, where the sum over occupation numbers diverges.

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> static_bosons(SU(3), "z").coefficient(SU(3).irrep(2, 0))
    z**2
    """
    given = (z, zbar, copies, irrep)
    return StaticBosons(*static_arguments("static_bosons", group, (_Z, _ZBAR), given, physical))


@dataclass(frozen=True)
class StaticBosons(StaticMatter, TorusSite):
    """det_R(1 − zP)^{−n} det_R(1 − z̄P†)^{−n}; see `static_bosons`."""

    sign: ClassVar[Literal[1, -1]] = -1
    statistics: ClassVar[Literal["fermion", "boson"]] = "boson"
    kind: ClassVar[str] = "static bosons"
    FIELDS: ClassVar[tuple[Field, ...]] = (_Z, _ZBAR, COPIES, IRREP)
    accuracy: ClassVar[str] = (
        "Rational functions or Toeplitz determinants in the fundamental, else a transform with measured "
        "error."
    )
    bounds_proven: ClassVar[bool] = True

    def character_factors(self) -> tuple[CharacterFactor, ...]:
        """The determinants of particles in R and of antiparticles in its conjugate."""
        particles = BosonFactor(self.irrep, self.z, self.copies)
        if self.zbar == 0:
            return (particles,)
        return (particles, BosonFactor(self.irrep.conjugate, self.zbar, self.copies))

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact w_c: rational in z for particles alone in the fundamental, else a named coefficient."""
        if self.factors is None or self.zbar != 0:
            return super().coefficient(irrep)
        rows = irrep.partition if self.irrep == self.group.fundamental else irrep.conjugate.partition
        return rational_coefficient(rows, self.copies, self.z)

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """w_c by Toeplitz determinants in the fundamental, by transform on the torus in other irreps."""
        for name in ("z", "zbar"):
            self._value(name, values)
        if irreps and self.factors:
            return multiplicative_coefficients(self.factors, irreps, values)
        return super().coefficients_at(irreps, values)

    def norm_bound(self, values: Values) -> NDArray[Any]:
        """(1 − |z|)^{−nd} (1 − |z̄|)^{−nd}: every eigenvalue has modulus one."""
        z, zbar = (np.abs(self._value(name, values)) for name in ("z", "zbar"))
        power = self.copies * self.irrep.dimension
        return np.asarray(((1 - z) * (1 - zbar)) ** (-power) * (1 + 1e-12))

    def tail_bound(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Σ |w_c| d_c beyond the cutoff: proven, moderate shells summed and the rest by Cauchy's estimate."""
        return summed_tail(self, cutoff, values, self._cauchy_tail)

    def _cauchy_tail(self, cutoff: int, values: Values) -> NDArray[np.float64]:
        """Σ |w_c| d_c beyond the cutoff by Cauchy's estimate.

        An occupation by k particles and l antiparticles reaches labels that sum to at most (k + l) s, s
        that of R, and Σ |w_c| d_c over k + l = m is at most the coefficient of y^m in (1 − y|z|)^{−nd} (1 −
        y|z̄|)^{−nd}; summed from m_0 on this is at most F(y)/y^{m_0} · 1/(1 − 1/y) for every y between 1
        and 1/max(|z|, |z̄|).
        """
        z, zbar = np.broadcast_arrays(*(np.abs(self._value(name, values)) for name in ("z", "zbar")))
        power = self.copies * self.irrep.dimension
        start = cutoff // max(1, sum(self.irrep.labels)) + 1
        edge = 1 / np.maximum(np.maximum(z, zbar), 1e-12)
        y = 1 + (edge - 1)[..., None] * (np.arange(1, 64) / 64)
        log = -power * (np.log1p(-y * z[..., None]) + np.log1p(-y * zbar[..., None]))
        return np.asarray(np.exp((log - start * np.log(y) - np.log1p(-1 / y)).min(axis=-1)))


def rational_coefficient(rows: tuple[int, ...], copies: int, z: Expr) -> Expr:
    """Coefficient of one irrep in det(1 − zP)^{−n}: Σ_m z^{|λ| + Nm} dim GL(n)(λ + m^N).

    Cauchy's identity (Macdonald §I.4). Fewer copies than N leave at most n rows, so only m = 0; otherwise the
    dimension is a polynomial in m of degree D = N(n − N), and the sum is a rational function with
    denominator (1 − z^N)^{D+1}.
    """
    n, boxes = len(rows), sum(rows)
    if copies < n:
        return general_linear_dimension(rows, copies) * z**boxes
    degree = n * (copies - n)
    values = [general_linear_dimension(tuple(r + m for r in rows), copies) for m in range(degree + 1)]
    numerator = S.Zero
    for m in range(degree + 1):
        difference = sum((-1) ** k * math.comb(degree + 1, k) * values[m - k] for k in range(m + 1))
        numerator += difference * z ** (n * m)
    return z**boxes * numerator / (1 - z**n) ** (degree + 1)
