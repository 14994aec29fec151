"""The Wilson action exp[(β/N) Re tr U]: exact coefficients and fast numbers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any, ClassVar

import mpmath
import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr, S
from sympy.core.function import ArgumentIndexError

from haarloom.actions.base import Link, refuse_group
from haarloom.actions.parameters import Field, Parameter, Values, as_parameter
from haarloom.actions.plaquette_count import PLAQUETTES, plaquette_count
from haarloom.actions.wilson_kernel import wilson_floats, wilson_fraction, wilson_shell_bound
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.products import multiply
from haarloom.torus.angles import full_angles
from haarloom.torus.determinant_forms import EigenvalueProduct

__all__ = ["Wilson", "WilsonCoefficient", "power_of", "wilson"]

_BETA = Field("beta", "nonnegative real", "beta", "Wilson coupling β of exp[(β/N) Re tr U]")
_MOST_SCANNED = 1500


def wilson(group: SU, beta: Parameter, plaquettes: int = 1) -> Wilson:
    """Link weight of N_t plaquettes of the Wilson action.

    Parameters
    ----------
    group : SU
    beta : number, expression or name
        β ≥ 0 in w(U) = exp[(β/N) Re tr U]; in two dimensions β = 2N/g² (common practice).
    plaquettes : int
        N_t; k_r = (w_r/w_0)^{N_t}.

    Raises
    ------
    ParameterError
        If β is a negative or complex number, or N_t no positive integer.

    References
    ----------
    J.-M. Drouffe, J.-B. Zuber, Phys. Rep. 102 (1983) 1: the sum of determinants of I_ν.

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> wilson(SU(2), "beta").coefficient(SU(2).fundamental)
    besseli(2, beta)/besseli(1, beta)
    """
    refuse_group("wilson", group)
    return Wilson(group, as_parameter(beta, _BETA), plaquette_count(plaquettes))


class WilsonCoefficient(sympy.Function):
    """k_r of one plaquette: arguments N, β and the Dynkin labels of r.

    The coefficient is real, so r and its conjugate share one symbol, that with the larger labels. ``evalf``
    works at any number of digits, ``doit`` writes the Bessel determinants, derivatives in β are
    again coefficients.
    """

    @classmethod
    def eval(cls, n: Expr, beta: Expr, *labels: Expr) -> Expr | None:
        if all(label == 0 for label in labels):
            return S.One
        if beta == 0:
            return S.Zero
        if n == 2:
            return sympy.besseli(labels[0] + 1, beta) / sympy.besseli(1, beta)
        if labels < labels[::-1]:
            return cls(n, beta, *labels[::-1])
        return None

    @property
    def irrep(self) -> Irrep:
        """The irrep r."""
        return SU(int(self.args[0])).irrep(*map(int, self.args[2:]))

    def _eval_is_real(self) -> bool | None:
        return self.args[1].is_real

    def _eval_conjugate(self) -> Expr:
        return self.func(self.args[0], sympy.conjugate(self.args[1]), *self.args[2:])

    def _eval_evalf(self, prec: int) -> Expr | None:
        beta = self.args[1].evalf(mpmath.libmp.prec_to_dps(prec) + 5)
        if not beta.is_Float and not beta.is_Rational:
            return None
        exact = sympy.Rational(beta) / self.args[0]
        value = wilson_fraction(self.irrep, Fraction(int(exact.p), int(exact.q)), prec + 8)
        return sympy.Rational(value.numerator, value.denominator)._eval_evalf(prec)

    def fdiff(self, argindex: int = 1) -> Expr:
        """Derivative in β: k_r' = Σ_{s ∈ r⊗(F + F̄)} (d_s/d_r) k_s / 2N − k_F k_r."""
        if argindex != 2:
            raise ArgumentIndexError(self, argindex)
        n, irrep = self.args[0], self.irrep
        group = irrep.group
        neighbours = S.Zero
        for step in (group.fundamental, group.antifundamental):
            for labels, count in multiply(irrep.labels, step.labels).items():
                ratio = sympy.Rational(count * group.irrep(*labels).dimension, irrep.dimension)
                neighbours += ratio * self.func(n, self.args[1], *labels)
        return neighbours / (2 * n) - self.func(n, self.args[1], *group.fundamental.labels) * self

    def doit(self, **hints: Any) -> Expr:
        """The quotient of sums of determinants of modified Bessel functions."""
        irrep = self.irrep
        rows, trivial = irrep.partition, (0,) * irrep.group.n
        top, bottom = (_determinant_sum(r, self.args[1] / irrep.group.n) for r in (rows, trivial))
        return top / (irrep.dimension * bottom)

    def _latex(self, printer: Any, exp: str | None = None) -> str:
        power = "" if exp is None else f"^{{{exp}}}"
        return rf"k_{{{self.irrep.latex()}}}{power}\left({printer._print(self.args[1])}\right)"

    def _sympystr(self, printer: Any) -> str:
        labels = ", ".join(map(str, self.args[2:]))
        return f"k[{labels}]({printer._print(self.args[1])})"


def _determinant_sum(rows: tuple[int, ...], x: Expr) -> Expr:
    n, shift = len(rows), sympy.Symbol("n", integer=True)
    matrix = sympy.Matrix(n, n, lambda i, j: sympy.besseli(rows[j] - j + i + shift, x))
    return sympy.Sum(sympy.Determinant(matrix), (shift, -sympy.oo, sympy.oo))


@dataclass(frozen=True)
class Wilson(Link):
    """k_r = (w_r/w_0)^{N_t} of exp[(β/N) Re tr U]; see `wilson`."""

    group: SU
    beta: Expr
    plaquettes: int = 1

    kind: ClassVar[str] = "Wilson"
    FIELDS: ClassVar[tuple[Field, ...]] = (_BETA, PLAQUETTES)
    accuracy: ClassVar[str] = (
        "Exact Bessel determinants: floats with a proven error, any number of digits on request."
    )
    bounds_proven: ClassVar[bool] = True
    positive: ClassVar[bool] = True

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact k_r, a power of a `WilsonCoefficient` (for SU(2), of a quotient of Bessel functions)."""
        return WilsonCoefficient(self.group.n, self.beta, *irrep.labels) ** self.plaquettes

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """k_r from determinants of differences of Bessel functions; the error bounds rounding."""
        beta = self._value("beta", values)
        shape = (*beta.shape, len(irreps))
        if not irreps:
            return np.zeros(shape), np.zeros(shape)
        distinct, place = np.unique(beta, return_inverse=True)
        k, error = wilson_floats(irreps, distinct / self.group.n)
        k, error = k[place.ravel()].reshape(shape), error[place.ravel()].reshape(shape)
        return power_of(k, error, self.plaquettes)

    def largest_outside(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Proven: k_r itself on the next shells, and beyond them a bound from walks in the Weyl chamber."""
        beta = self._value("beta", values)
        distinct, place = np.unique(beta, return_inverse=True)
        bound = self._largest_of_one(cutoff, distinct / self.group.n)
        return np.asarray(bound[place.ravel()].reshape(beta.shape) ** self.plaquettes)

    def _largest_of_one(self, cutoff: int, x: NDArray[np.float64]) -> NDArray[np.float64]:
        bound = wilson_shell_bound(self.group.n, cutoff + 1, x)
        seen = np.zeros_like(bound)
        shell = cutoff + 1
        while np.any(bound > seen) and self.group.count_irreps(shell) <= _MOST_SCANNED:
            ring = [r for r in self.group.irreps(shell) if sum(r.labels) == shell]
            k, error = wilson_floats(ring, x)
            seen = np.maximum(seen, (k + error).max(axis=-1))
            shell += 1
            bound = np.minimum(bound, wilson_shell_bound(self.group.n, shell, x))
        return np.minimum(np.maximum(seen, bound), 1.0)

    def plaquette_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any] | None:
        """exp[(β/N) Re tr U]."""
        beta = self._value("beta", values)
        phases = full_angles(self.group.n, angles)
        return np.asarray(np.exp(beta / self.group.n * np.cos(phases).sum(axis=-1)))

    def determinant_form(self, values: Values) -> EigenvalueProduct:
        """∏_j exp[(β/N) cos θ_j]."""
        x = float(self._value("beta", values)) / self.group.n
        return EigenvalueProduct(self.group, lambda phases: np.exp(x * np.cos(phases)))

    def exponent(self) -> ClassFunction:
        """(β/2N)(χ_F + χ_F̄)."""
        half = self.beta / (2 * self.group.n)
        ends = (self.group.fundamental, self.group.antifundamental)
        return ClassFunction(self.group, {ends[0]: half}) + ClassFunction(self.group, {ends[1]: half})

    def inverse_width(self) -> tuple[Expr, Expr, Expr]:
        """1/τ = β/N; cos θ = 1 − θ²/2 + θ⁴/24."""
        return self.beta / self.group.n, self.beta / (24 * self.group.n), S.Zero

    def formula(self) -> str:
        """LaTeX of the quotient of Bessel determinants."""
        n, beta = self.group.n, sympy.latex(self.beta)
        power = "" if self.plaquettes == 1 else f"^{{{self.plaquettes}}}"
        if n == 2:
            return rf"\left[\frac{{I_{{2j+1}}({beta})}}{{I_1({beta})}}\right]{power}"
        entry = rf"I_{{\lambda_j-j+i+n}}\!\left(\tfrac{{{beta}}}{{{n}}}\right)"
        trivial = rf"I_{{i-j+n}}\!\left(\tfrac{{{beta}}}{{{n}}}\right)"
        return rf"\left[\frac{{\sum_n\det {entry}}}{{d_r\sum_n\det {trivial}}}\right]{power}"


def power_of(k: NDArray[Any], error: NDArray[Any], n: int) -> tuple[NDArray[Any], NDArray[Any]]:
    """k^n with the error carried along: |(k+δ)^n − k^n| ≤ n |δ| (|k| + |δ|)^{n−1}."""
    if n == 1:
        return k, error
    slack = n * error * (np.abs(k) + error) ** (n - 1)
    return k**n, slack + 2 * np.finfo(float).eps * np.abs(k) ** n
