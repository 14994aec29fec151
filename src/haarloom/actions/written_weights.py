"""Weights from a class function that the user writes: a plaquette weight, or matter on a site."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

import sympy
from numpy.typing import NDArray
from sympy import Expr, Symbol

from haarloom.actions.base import Site, refuse_group
from haarloom.actions.character_factors import CharacterFactor, written_factors
from haarloom.actions.class_expression import ClassExpression, class_expression
from haarloom.actions.parameters import Field, Values
from haarloom.actions.plaquette_count import PLAQUETTES, plaquette_count
from haarloom.actions.plaquette_link import PlaquetteLink
from haarloom.actions.singularities import refuse_singularities
from haarloom.actions.torus_site import TorusSite, each_point
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ClassFunctionError

__all__ = ["WrittenPlaquette", "WrittenSite", "link_from_plaquette", "site_from"]

_PLAQUETTE = Field(
    "weight",
    "class function",
    "exp(beta*(L + conj(L))/2)",
    "plaquette weight w(U) in L, conj(L), tr(P, n), chi(...), theta_j",
)
_SITE = Field(
    "expression", "class function", "exp(h*(L + conj(L)))", "W(P) in L, conj(L), tr(P, n), chi(...), theta_j"
)


def link_from_plaquette(
    group: SU, weight: str | Expr | ClassFunction, plaquettes: int = 1
) -> WrittenPlaquette:
    """Link weight of N_t plaquettes with a weight w(U) of your own.

    Parameters
    ----------
    group : SU
    weight : str, Expr or ClassFunction
        w(U), for example ``"exp(beta*(L + conj(L))/6 + gamma*chi(1,1)/8)"`` or a function of the
        eigenphases such as ``"exp(b*(cos(theta_1) + cos(theta_2) + cos(theta_3)))"``.
    plaquettes : int
        N_t.

    Raises
    ------
    ClassFunctionError
        If it is no class function, or if ∫dU w(U) vanishes identically.
    """
    refuse_group("link_from_plaquette", group)
    written = WrittenPlaquette(group, class_expression(group, weight), plaquette_count(plaquettes))
    finite = written.weight.finite
    if finite is not None and finite.haar() == 0:
        raise ClassFunctionError(
            "∫dU w(U) = 0, so that k_r = w_r/w_0 has no meaning; add a constant to the weight."
        )
    return written


def site_from(group: SU, expression: str | Expr | ClassFunction) -> WrittenSite:
    """Site weight W(P) from a class function of your own.

    Parameters
    ----------
    group : SU
    expression : str, Expr or ClassFunction
        Polynomials in L, conj(L), tr(P, n) and chi(labels) stay exact; everything else is transformed on
        the torus of eigenphases with a stated error.

    Raises
    ------
    ClassFunctionError
        If it is no class function.

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> site_from(SU(3), "1 + z*L + z^2*conj(L) + z^3").coefficient(SU(3).irrep(0, 1))
    z**2
    """
    refuse_group("site_from", group)
    return WrittenSite(group, class_expression(group, expression))


@dataclass(frozen=True)
class WrittenPlaquette(PlaquetteLink):
    """k_r of a plaquette weight that the user wrote; see `link_from_plaquette`."""

    group: SU
    weight: ClassExpression
    plaquettes: int = 1

    kind: ClassVar[str] = "plaquette function"
    FIELDS: ClassVar[tuple[Field, ...]] = (_PLAQUETTE, PLAQUETTES)

    @property
    def parameters(self) -> tuple[Symbol, ...]:
        """Symbols of the expression that do not speak of P."""
        return self.weight.parameters

    def describe(self) -> dict[str, Any]:
        """Kind, expression as text, and N_t."""
        return {"kind": self.kind, "weight": written_text(self.weight), "plaquettes": self.plaquettes}

    def exponent(self) -> ClassFunction | None:
        """The argument of the exponential, if the weight is one with a finite class function inside."""
        inside = self.weight.expression
        return self.weight.part(inside.args[0]).finite if isinstance(inside, sympy.exp) else None

    def plaquette_factors(self) -> tuple[CharacterFactor, ...] | None:
        """Polynomials and exponentials of polynomials whose product is w(U), if it is one."""
        return written_factors(self.weight)

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact (w_r/w_0)^{N_t} of a finite class function, else a named coefficient."""
        finite = self.weight.finite
        if finite is None:
            return super().coefficient(irrep)
        return (finite[irrep] / (irrep.dimension * finite.haar())) ** self.plaquettes

    def plaquette_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any] | None:
        """w(U) as written."""
        return self.weight.at(angles, values)

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """k_r by transform on the torus, after a search for poles and branch cuts."""
        for point in each_point(self, values)[1]:
            refuse_singularities(self.weight, point)
        return super().coefficients_at(irreps, values)

    def formula(self) -> str:
        """LaTeX of the integral that defines k_r."""
        power = "" if self.plaquettes == 1 else f"^{{{self.plaquettes}}}"
        weight = sympy.latex(self.weight.expression)
        return (
            rf"\left[\frac{{\int dU\,\chi_r(U)^*\,w(U)}}{{d_r\int dU\,w(U)}}\right]{power},\quad w={weight}"
        )


@dataclass(frozen=True)
class WrittenSite(TorusSite):
    """W(P) that the user wrote; see `site_from`."""

    group: SU
    expression: ClassExpression

    kind: ClassVar[str] = "written site"
    FIELDS: ClassVar[tuple[Field, ...]] = (_SITE,)

    @property
    def parameters(self) -> tuple[Symbol, ...]:
        """Symbols of the expression that do not speak of P."""
        return self.expression.parameters

    def describe(self) -> dict[str, Any]:
        """Kind and expression as text."""
        return {"kind": self.kind, "expression": written_text(self.expression)}

    @property
    def finite(self) -> bool:  # type: ignore[override]
        """True if the expression is a polynomial in characters."""
        return self.expression.finite is not None

    @property
    def bounds_proven(self) -> bool:  # type: ignore[override]
        """True for a finite combination of characters."""
        return self.finite

    def class_function(self) -> ClassFunction:
        """The exact class function, if finite."""
        return self.expression.finite or super().class_function()

    def character_factors(self) -> tuple[CharacterFactor, ...]:
        """Polynomials and exponentials of polynomials whose product is W, if it is one."""
        return written_factors(self.expression) or super().character_factors()

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact w_c of a finite class function, else a named coefficient."""
        finite = self.expression.finite
        return super().coefficient(irrep) if finite is None else finite[irrep]

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """w_c from the exact coefficients, or by transform after a search for poles and branch cuts."""
        if self.finite:
            return Site.coefficients_at(self, irreps, values)
        self._refuse_singularities(values)
        return super().coefficients_at(irreps, values)

    def norm_bound(self, values: Values) -> NDArray[Any]:
        """Σ|w_c|d_c if finite; else the largest |W| on a grid with a margin, an *estimate*."""
        if self.finite:
            return Site.norm_bound(self, values)
        self._refuse_singularities(values)
        return super().norm_bound(values)

    def tail_bound(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Σ|w_c|d_c beyond the cutoff, exact for a finite class function, else an *estimate*."""
        return Site.tail_bound(self, cutoff, values) if self.finite else super().tail_bound(cutoff, values)

    def _refuse_singularities(self, values: Values) -> None:
        for point in each_point(self, values)[1]:
            refuse_singularities(self.expression, point)

    def density_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """W as written."""
        return self.expression.at(angles, values)

    def latex(self) -> str:
        """The expression."""
        return rf"W(P)={sympy.latex(self.expression.expression)}"


def written_text(function: ClassExpression) -> str:
    """Text that the grammar of class functions reads back."""
    star, loop = Symbol("L^*"), Symbol("L")
    text = str(function.expression.xreplace({star: sympy.Function("conj")(loop)}))
    return text.replace("conjugate(", "conj(")
