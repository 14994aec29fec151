"""Static bosons: det_R(1 − zP)^{−n} det_R(1 − z̄P†)^{−n}, |z| < 1."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray
from sympy import Expr, S

from haarloom.actions.base import refuse_group
from haarloom.actions.fermions import COPIES, IRREP, determinant_latex, eigenphases_of
from haarloom.actions.fugacities import fugacities, known_inputs
from haarloom.actions.fugacity_table import general_linear_dimension
from haarloom.actions.heat_kernel import positive_integer
from haarloom.actions.irrep_words import irrep_of
from haarloom.actions.multiplicative import Factor, multiplicative_coefficients
from haarloom.actions.parameters import Field, Parameter, Values
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
    group : SU
    z, zbar : number, expression or name
        Fugacities of particles and antiparticles, of modulus below 1.
    copies : int
        n = spin states × flavours, the same for both.
    irrep : Irrep, name or labels
        R, the fundamental unless said otherwise; the antiparticles are in its conjugate.
    **physical
        Instead of z and z̄: ``mass``, ``mu``, ``temperature``; or ``kappa``, ``n_t``, ``mu`` for heavy
        Wilson quarks at leading order in κ (see `haarloom.actions.fugacities`).

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
    refuse_group("static_bosons", group)
    return StaticBosons(
        group,
        *fugacities(z, zbar, (_Z, _ZBAR), **known_inputs(physical)),
        positive_integer("copies", copies),
        irrep_of(group, irrep),
    )


@dataclass(frozen=True)
class StaticBosons(TorusSite):
    """det_R(1 − zP)^{−n} det_R(1 − z̄P†)^{−n}; see `static_bosons`."""

    group: SU
    z: Expr
    zbar: Expr
    copies: int
    irrep: Irrep

    kind: ClassVar[str] = "static bosons"
    FIELDS: ClassVar[tuple[Field, ...]] = (_Z, _ZBAR, COPIES, IRREP)
    accuracy: ClassVar[str] = (
        "Rational functions or Toeplitz determinants in the fundamental, else a transform with measured "
        "error."
    )
    bounds_proven: ClassVar[bool] = True

    @property
    def factors(self) -> tuple[Factor, ...] | None:
        """Factors over the eigenvalues of P, if R is the fundamental or its conjugate."""
        if self.irrep not in (self.group.fundamental, self.group.antifundamental):
            return None
        sense = 1 if self.irrep == self.group.fundamental else -1
        forward = Factor("boson", self.z, self.copies, sense)
        backward = Factor("boson", self.zbar, self.copies, -sense)
        return (forward, backward) if self.zbar != 0 else (forward,)

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

    def density_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """∏ over the weights of R of (1 − z e^{iw·θ})^{−n} (1 − z̄ e^{−iw·θ})^{−n}."""
        z, zbar = (self._value(name, values) for name in ("z", "zbar"))
        phases, multiplicities = eigenphases_of(self.irrep, angles)
        eigenvalues = np.exp(1j * phases)
        factors = (1 - z[..., None] * eigenvalues) * (1 - zbar[..., None] / eigenvalues)
        return np.asarray((factors ** (-self.copies * multiplicities)).prod(axis=-1))

    def latex(self) -> str:
        """Both determinants."""
        return "W(P)=" + determinant_latex(self, "1-{}P", "1-{}P^\\dagger", -self.copies)


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
