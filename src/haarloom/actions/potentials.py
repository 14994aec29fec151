"""Published Polyakov-loop potentials as site weights, exp(−v U/T⁴) with the user's coefficients."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr

from haarloom.actions.base import refuse_group
from haarloom.actions.character_factors import CharacterFactor, ExponentialFactor, FiniteFactor
from haarloom.actions.parameters import Field, Parameter, Values, as_parameter
from haarloom.actions.reduced_measure import haar_power, reduced_measure_at
from haarloom.actions.torus_site import TorusSite
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.exceptions import ParameterError
from haarloom.torus.angles import full_angles

__all__ = ["LogarithmicPotential", "PolynomialPotential", "logarithmic_potential", "polynomial_potential"]

_V = Field("volume", "nonnegative real", "1", "volume v = V T³ of a site in units of the temperature", True)
_B2 = Field("b2", "real", "b2", "coefficient b₂ of −ℓℓ*/2")
_B3 = Field("b3", "real", "b3", "coefficient b₃ of −(ℓ^N + ℓ*^N)/6")
_B4 = Field("b4", "real", "b4", "coefficient b₄ of (ℓℓ*)²/4")
_A = Field("a", "real", "a", "coefficient a of −ℓℓ*/2")
_B = Field("b", "real", "-1", "coefficient b of ln H; b ≤ 0, else the weight has poles")


def polynomial_potential(
    group: SU, b2: Parameter, b3: Parameter, b4: Parameter, volume: Parameter = 1
) -> PolynomialPotential:
    """Site weight exp(−v U/T⁴), U/T⁴ = −(b₂/2) ℓℓ* − (b₃/6)(ℓ^N + ℓ*^N) + (b₄/4)(ℓℓ*)², ℓ = L/N.

    Parameters
    ----------
    group : SU
    b2, b3, b4 : number, expression or name
        Coefficients; any may depend on a temperature by way of an expression such as
        ``"a0 + a1*T0/T + a2*(T0/T)^2 + a3*(T0/T)^3"``.
    volume : number, expression or name
        v = V T³ ≥ 0.

    Notes
    -----
    For SU(3) the form of C. Ratti, M. A. Thaler, W. Weise, Phys. Rev. D 73 (2006) 014019. For other N the
    cubic term is replaced by the N-th power, which has the same symmetry under the centre.
    """
    refuse_group("polynomial_potential", group)
    coefficients = (
        as_parameter(value, field) for value, field in ((b2, _B2), (b3, _B3), (b4, _B4), (volume, _V))
    )
    return PolynomialPotential(group, *coefficients)


def logarithmic_potential(
    group: SU, a: Parameter, b: Parameter, volume: Parameter = 1
) -> LogarithmicPotential:
    """Site weight exp(−v U/T⁴), U/T⁴ = −(a/2) ℓℓ* + b ln H, ℓ = L/N, H the reduced Haar measure.

    Parameters
    ----------
    group : SU
    a, b : number, expression or name
        Coefficients; b ≤ 0, as fitted in the literature.
    volume : number, expression or name
        v = V T³ ≥ 0.

    Raises
    ------
    ParameterError
        If b > 0: H^{−vb} is infinite where eigenvalues coincide.

    Notes
    -----
    For SU(3) the form of S. Rößner, C. Ratti, W. Weise, Phys. Rev. D 75 (2007) 034007, where H = 1 − 6ℓℓ* +
    4(ℓ³ + ℓ*³) − 3(ℓℓ*)².
    """
    refuse_group("logarithmic_potential", group)
    return LogarithmicPotential(
        group, as_parameter(a, _A), _not_positive(as_parameter(b, _B)), as_parameter(volume, _V)
    )


def _not_positive(b: Expr) -> Expr:
    if b.is_number and b > 0:
        _refuse_pole(float(b))
    return b


def _refuse_pole(b: float) -> None:
    raise ParameterError(
        f"b = {b:.6g} is not allowed: H^(-v b) is infinite where two eigenvalues coincide, θ_i = θ_j. Give "
        f"b ≤ 0."
    )


def _modulus_squared(group: SU) -> ClassFunction:
    """|ℓ|² = (1 + χ_adjoint)/N²."""
    return group.loop * group.loop.conjugate(real=True) / group.n**2


@dataclass(frozen=True)
class PolynomialPotential(TorusSite):
    """exp(−v U/T⁴) with a polynomial U; see `polynomial_potential`."""

    group: SU
    b2: Expr
    b3: Expr
    b4: Expr
    volume: Expr

    kind: ClassVar[str] = "polynomial potential"
    FIELDS: ClassVar[tuple[Field, ...]] = (_B2, _B3, _B4, _V)

    def density_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """exp(−v U/T⁴) from the eigenphases."""
        n = self.group.n
        loop = np.exp(1j * full_angles(n, angles)).sum(axis=-1) / n
        size = np.abs(loop) ** 2
        b2, b3, b4, volume = (self._value(name, values) for name in ("b2", "b3", "b4", "volume"))
        potential = -b2 / 2 * size - b3 / 3 * (loop**n).real + b4 / 4 * size**2
        return np.asarray(np.exp(-volume * potential))

    def character_factors(self) -> tuple[CharacterFactor, ...]:
        """The exponential of a polynomial in loops."""
        size, n = _modulus_squared(self.group), self.group.n
        loop = self.group.loop / n
        powers = loop**n + loop.conjugate(real=True) ** n
        exponent = size * (self.b2 / 2) + powers * (self.b3 / 6) - size * size * (self.b4 / 4)
        return (ExponentialFactor(exponent * self.volume),)

    def norm_bound(self, values: Values) -> NDArray[Any]:
        """exp of v(|b₂|/2 + |b₃|/3 + |b₄|/4): proven, since |ℓ| ≤ 1."""
        b2, b3, b4, volume = (np.abs(self._value(name, values)) for name in ("b2", "b3", "b4", "volume"))
        return np.asarray(np.exp(volume * (b2 / 2 + b3 / 3 + b4 / 4)) * (1 + 1e-12))

    def latex(self) -> str:
        """The exponential of the potential."""
        n = self.group.n
        b2, b3, b4, v = (sympy.latex(value) for value in (self.b2, self.b3, self.b4, self.volume))
        body = rf"\frac{{{b2}}}{{2}}|\ell|^2+\frac{{{b3}}}{{6}}(\ell^{n}+\ell^{{*{n}}})"
        body += rf"-\frac{{{b4}}}{{4}}|\ell|^4"
        return rf"W(P)=\exp\left[{v}\left({body}\right)\right],\quad\ell=L/{n}"


@dataclass(frozen=True)
class LogarithmicPotential(TorusSite):
    """exp(v a |ℓ|²/2) H^{−vb}; see `logarithmic_potential`."""

    group: SU
    a: Expr
    b: Expr
    volume: Expr

    kind: ClassVar[str] = "logarithmic potential"
    unproven: ClassVar[str] = (
        "H^(−v b) is creased where eigenphases meet, its characters fall by a power only, unless −v b is a "
        "whole number up to 8 and N ≤ 5;"
    )
    FIELDS: ClassVar[tuple[Field, ...]] = (_A, _B, _V)

    def density_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """exp(v a |ℓ|²/2) H^{−vb} from the eigenphases."""
        n = self.group.n
        a, b, volume = (self._value(name, values) for name in ("a", "b", "volume"))
        if np.any(b > 0):
            _refuse_pole(float(np.max(b)))
        loop = np.exp(1j * full_angles(n, angles)).sum(axis=-1) / n
        return np.asarray(
            np.exp(volume * a / 2 * np.abs(loop) ** 2) * reduced_measure_at(n, angles) ** (-volume * b)
        )

    def character_factors(self) -> tuple[CharacterFactor, ...]:
        """An exponential and a power of H, where that is a small whole number."""
        power = haar_power(self.group, -self.volume * self.b)
        if not power.finite:
            return super().character_factors()
        exponent = _modulus_squared(self.group) * (self.volume * self.a / 2)
        return (FiniteFactor(power.class_function()), ExponentialFactor(exponent))

    def norm_bound(self, values: Values) -> NDArray[Any]:
        """exp(v |a|/2): proven, since |ℓ| ≤ 1 and H ≤ 1."""
        a, volume = (np.abs(self._value(name, values)) for name in ("a", "volume"))
        return np.asarray(np.exp(volume * a / 2) * (1 + 1e-12))

    def latex(self) -> str:
        """The exponential and the power of the measure."""
        a = sympy.latex(self.volume * self.a)
        power = sympy.latex(-self.volume * self.b)
        return rf"W(P)=\exp\left[\frac{{{a}}}{{2}}|\ell|^2\right]H^{{{power}}},\quad\ell=L/{self.group.n}"
