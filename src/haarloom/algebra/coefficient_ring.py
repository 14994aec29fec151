"""Fast arithmetic with many symbolic coefficients at once, in a polynomial ring instead of expression trees.

Every factor that is no sum, product or whole power (a symbol, exp(−4t/3), √2, …) becomes a generator.
Relations between generators, such as exp(a)·exp(−a) = 1 or I² = −1, are restored when the result turns back
into expressions, so the ring only ever postpones a simplification.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from functools import lru_cache
from typing import Any

from sympy import QQ, Add, Expr, Float, Mul, Pow, Rational, Symbol
from sympy.polys.rings import PolyRing

from haarloom.algebra.coefficients import normal_form
from haarloom.algebra.labels import Labels

__all__ = ["polynomial_of_terms", "power_of_terms", "product_of_terms"]

Product = Callable[[Labels, Labels], Mapping[Labels, int]]
Terms = Mapping[tuple[int, ...], Any]


def product_of_terms(left: Terms, right: Terms, multiply: Product) -> dict[Labels, Expr]:
    """Σ_{rs} a_r b_s Σ_u N_{rs}^u χ_u with coefficients in normal form."""
    ring = CoefficientRing([*left.values(), *right.values()])
    return ring.leave(_product(ring.enter(left), ring.enter(right), multiply))


def power_of_terms(terms: Terms, count: int, unit: Labels, multiply: Product) -> dict[Labels, Expr]:
    """The power ``count`` ≥ 0 of Σ a_r χ_r, by repeated squaring inside the ring."""
    ring = CoefficientRing(terms.values())
    result: Terms = {unit: ring.one}
    square = ring.enter(terms)
    while count:
        if count & 1:
            result = _product(result, square, multiply)
        count >>= 1
        square = _product(square, square, multiply) if count else square
    return ring.leave(result)


def polynomial_of_terms(
    monomials: Mapping[tuple[int, ...], Expr],
    values: Sequence[Mapping[Labels, int]],
    unit: Labels,
    multiply: Product,
) -> dict[Labels, Expr]:
    """The polynomial with coefficients ``monomials`` at class functions ``values``, by Horner schemes."""
    normal = {exponents: normal_form(value) for exponents, value in monomials.items()}
    ring = CoefficientRing(normal.values())
    entered = ring.enter(normal)
    return ring.leave(_horner(entered, [dict(value) for value in values], unit, multiply))


def _horner(monomials: Terms, values: Sequence[Terms], unit: Labels, multiply: Product) -> Terms:
    if not values:
        return {unit: monomials[()]} if monomials else {}
    by_power: dict[int, dict[tuple[int, ...], Any]] = {}
    for exponents, value in monomials.items():
        by_power.setdefault(exponents[0], {})[exponents[1:]] = value
    result: Terms = {}
    for power in range(max(by_power, default=-1), -1, -1):
        result = dict(_product(result, values[0], multiply))
        if power in by_power:
            for labels, value in _horner(by_power[power], values[1:], unit, multiply).items():
                result[labels] = result[labels] + value if labels in result else value
    return result


def _product(left: Terms, right: Terms, multiply: Product) -> Terms:
    found: dict[Labels, Any] = {}
    for a, value_a in left.items():
        for b, value_b in right.items():
            value = value_a * value_b
            for labels, count in multiply(a, b).items():
                term = value if count == 1 else value * count
                found[labels] = found[labels] + term if labels in found else term
    return found


class CoefficientRing:
    """ℚ[generators] with the ways in and out; for floating-point coefficients, plain expressions."""

    def __init__(self, values: Iterable[Expr]) -> None:
        kept = tuple(values)
        self.exact = not any(value.has(Float) for value in kept if not value.is_Rational)
        self.place: dict[Expr, int] = {}
        if self.exact:
            for value in kept:
                self._collect(value)
        self.ring = _ring(max(1, len(self.place)))
        self.settled = not any(generator.has(Add) for generator in self.place)

    @property
    def one(self) -> Any:
        return self.ring.one if self.exact else Rational(1)

    def enter(self, terms: Terms) -> Terms:
        return {labels: self._polynomial(value) for labels, value in terms.items()} if self.exact else terms

    def leave(self, terms: Terms) -> dict[tuple[int, ...], Expr]:
        if not self.exact:
            return {labels: normal_form(value) for labels, value in terms.items()}
        generators = tuple(self.place)
        found = {labels: _expression(value, generators) for labels, value in terms.items()}
        return found if self.settled else {labels: normal_form(value) for labels, value in found.items()}

    def _collect(self, value: Expr) -> None:
        for term in Add.make_args(value):
            for factor in term.as_coeff_mul()[1]:
                self.place.setdefault(_generator(factor)[0], len(self.place))

    def _polynomial(self, value: Expr) -> Any:
        terms: dict[tuple[int, ...], Any] = {}
        for term in Add.make_args(value):
            number, factors = term.as_coeff_mul()
            exponents = [0] * self.ring.ngens
            for factor in factors:
                generator, power = _generator(factor)
                exponents[self.place[generator]] += power
            key = tuple(exponents)
            terms[key] = terms.get(key, 0) + QQ.from_sympy(number)
        return self.ring.from_dict(terms)


def _generator(factor: Expr) -> tuple[Expr, int]:
    """Split a factor into a generator and a positive whole power of it."""
    if isinstance(factor, Pow) and factor.exp.is_Integer and factor.exp.is_positive:
        return factor.base, int(factor.exp)
    return factor, 1


def _expression(value: Any, generators: tuple[Expr, ...]) -> Expr:
    return Add(
        *(
            Mul(
                QQ.to_sympy(number),
                *(
                    Pow(generator, power)
                    for generator, power in zip(generators, exponents, strict=False)
                    if power
                ),
            )
            for exponents, number in value.items()
        )
    )


@lru_cache(maxsize=32)
def _ring(size: int) -> Any:
    return PolyRing([Symbol(f"g{place}") for place in range(size)], QQ)
