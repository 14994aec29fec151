"""Rational functions of one symbol over the rationals, with FLINT's polynomials for their gcds."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import flint
import sympy

__all__ = ["Ratio", "RationalFunctions"]


@dataclass(frozen=True, eq=False)
class Ratio:
    """numerator / denominator in lowest terms, both flint.fmpq_poly; the denominator is monic."""

    numerator: Any
    denominator: Any

    @staticmethod
    def reduced(numerator: Any, denominator: Any) -> Ratio:
        """The quotient of two polynomials."""
        common = numerator.gcd(denominator)
        if common.degree() > 0:
            numerator, denominator = numerator // common, denominator // common
        lead = denominator[denominator.degree()]
        return Ratio(numerator / lead, denominator / lead)

    def __add__(self, other: Ratio) -> Ratio:
        if self.denominator == other.denominator:
            return Ratio.reduced(self.numerator + other.numerator, self.denominator)
        top = self.numerator * other.denominator + other.numerator * self.denominator
        return Ratio.reduced(top, self.denominator * other.denominator)

    def __neg__(self) -> Ratio:
        return Ratio(-self.numerator, self.denominator)

    def __sub__(self, other: Ratio) -> Ratio:
        return self + (-other)

    def __mul__(self, other: Ratio | int) -> Ratio:
        if isinstance(other, int):
            return Ratio(self.numerator * other, self.denominator)
        return Ratio.reduced(self.numerator * other.numerator, self.denominator * other.denominator)

    __rmul__ = __mul__

    def __truediv__(self, other: Ratio | int) -> Ratio:
        if isinstance(other, int):
            return Ratio(self.numerator / other, self.denominator)
        return Ratio.reduced(self.numerator * other.denominator, self.denominator * other.numerator)

    def __eq__(self, other: object) -> bool:
        if isinstance(other, int):
            return bool(self.denominator.degree() == 0 and self.numerator == other)
        if not isinstance(other, Ratio):
            return NotImplemented
        return bool(self.numerator == other.numerator and self.denominator == other.denominator)

    def __hash__(self) -> int:
        return hash((str(self.numerator), str(self.denominator)))

    def __bool__(self) -> bool:
        return bool(self.numerator != 0)


@dataclass(frozen=True, eq=False)
class RationalFunctions:
    """The field ℚ(u): the two crossings between SymPy expressions and :class:`Ratio`."""

    symbol: sympy.Symbol

    @property
    def zero(self) -> Ratio:
        """0."""
        return Ratio(flint.fmpq_poly([0]), flint.fmpq_poly([1]))

    def from_expr(self, expression: sympy.Expr) -> Ratio:
        """A rational expression as an element."""
        top, bottom = sympy.fraction(sympy.together(expression))
        return Ratio.reduced(self._polynomial(top), self._polynomial(bottom))

    def to_expr(self, element: Ratio) -> sympy.Expr:
        """An element as a SymPy expression."""
        top, bottom = (self._expression(part) for part in (element.numerator, element.denominator))
        return top / bottom

    def _polynomial(self, expression: sympy.Expr) -> Any:
        coefficients = sympy.Poly(expression, self.symbol).all_coeffs()[::-1]
        return flint.fmpq_poly([flint.fmpq(int(c.p), int(c.q)) for c in coefficients])

    def _expression(self, polynomial: Any) -> sympy.Expr:
        coefficients = [sympy.Rational(int(c.p), int(c.q)) for c in polynomial.coeffs()]
        return sympy.Poly(coefficients[::-1] or [0], self.symbol).as_expr()
