"""Power series with non-negative coefficients that bound a class function order by order.

Give χ_c the order Σ c (its Dynkin labels). A weight of χ_c shifts Σ a_i of any irrep by at most that. For
W = F · exp[Σ h_r χ_r] · ∏ det_R(1 − zP)^{−n} the series

    m(y) = Σ_c |F_c| d_c y^{Σc} · exp[Σ_r |h_r| d_r y^{Σr}] · ∏ (1 − |z| y^{ΣR})^{−n d_R} = Σ_k m_k y^k

bounds what arises at each order, whichever way the factors are multiplied out: products of characters and
symmetric powers have non-negative multiplicities whose dimensions multiply. Hence sup |W| ≤ m(1) and
Σ_{Σc > L} |w_c| d_c ≤ Σ_{k > L} m_k = m(1) − Σ_{k ≤ L} m_k.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import reduce
from math import comb
from operator import mul
from typing import Any, TypeAlias

import flint
from sympy import Expr

from haarloom.actions.character_factors import BosonFactor, CharacterFactor, ExponentialFactor, FiniteFactor
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ConvergenceError, ParameterError
from haarloom.numerics.balls import precision

__all__ = ["BallFactor", "BosonBalls", "ExponentialBalls", "FiniteBalls", "Majorant", "factor_balls"]

MOST_ORDERS = 4096
"""Most orders to which a majorant is expanded."""


WIDE = 1e-12
"""Radius from which a parameter counts as an interval rather than a rounded number."""


@dataclass(frozen=True, eq=False)
class FiniteBalls:
    """Σ_c w_c χ_c with balls w_c."""

    terms: Mapping[Irrep, Any]

    @property
    def polynomial(self) -> bool:
        """Whether the majorant ends."""
        return True

    @property
    def total(self) -> Any:
        """Σ |w_c| d_c."""
        return sum(self.orders().values(), flint.arb(0))

    def orders(self) -> dict[int, Any]:
        """Σ |w_c| d_c by order."""
        return _sizes(self.terms)

    def series(self, length: int) -> list[Any]:
        """Coefficients of the majorant below an order."""
        orders = self.orders()
        return [orders.get(k, flint.arb(0)) for k in range(length)]


@dataclass(frozen=True, eq=False)
class ExponentialBalls:
    """exp[Σ_r h_r χ_r], r not trivial, with balls h_r."""

    terms: Mapping[Irrep, Any]

    @property
    def polynomial(self) -> bool:
        """Whether the majorant ends."""
        return not self.terms

    @property
    def strength(self) -> Any:
        """x = Σ |h_r| d_r."""
        return sum(_sizes(self.terms).values(), flint.arb(0))

    @property
    def total(self) -> Any:
        """e^x."""
        return self.strength.exp()

    def series(self, length: int) -> list[Any]:
        """Coefficients of the majorant below an order, from k e_k = Σ_j j x_j e_{k−j}."""
        orders = _sizes(self.terms)
        found = [flint.arb(1)]
        for k in range(1, length):
            terms = (j * x * found[k - j] for j, x in orders.items() if j <= k)
            found.append(sum(terms, flint.arb(0)) / k)
        return found


@dataclass(frozen=True, eq=False)
class BosonBalls:
    """det_R(1 − zP)^{−n} with a ball z, |z| < 1."""

    irrep: Irrep
    fugacity: Any
    copies: int

    @property
    def polynomial(self) -> bool:
        """Whether the majorant ends."""
        return bool(self.fugacity == 0)

    @property
    def size(self) -> Any:
        """Upper end of |z|."""
        return abs(self.fugacity).upper()

    @property
    def power(self) -> int:
        """n d_R."""
        return self.copies * self.irrep.dimension

    @property
    def total(self) -> Any:
        """(1 − |z|)^{−n d_R}."""
        return (1 - self.size) ** -self.power

    def series(self, length: int) -> list[Any]:
        """Coefficients of the majorant below an order."""
        step = sum(self.irrep.labels)
        found = [flint.arb(0)] * length
        for k in range(0, length, step):
            number = k // step
            found[k] = comb(self.power - 1 + number, number) * self.size**number
        return found


BallFactor: TypeAlias = FiniteBalls | ExponentialBalls | BosonBalls


def _sizes(terms: Mapping[Irrep, Any]) -> dict[int, Any]:
    orders: dict[int, Any] = {}
    for irrep, value in terms.items():
        order = sum(irrep.labels)
        orders[order] = orders.get(order, flint.arb(0)) + abs(value).upper() * irrep.dimension
    return orders


def factor_balls(
    factors: Sequence[CharacterFactor], evaluate: Callable[[Sequence[Expr]], list[Any]]
) -> tuple[BallFactor, ...]:
    """Factors with balls for their exact parameters, one finite factor first.

    Parameters
    ----------
    evaluate
        From exact expressions to balls.

    Raises
    ------
    ParameterError
        If a boson fugacity is not shown to lie inside the unit circle.
    """
    group = _group(factors)
    finite: dict[Irrep, Any] = {group.trivial: flint.arb(1)}
    constant = flint.arb(1)
    found: list[BallFactor] = []
    for factor in factors:
        if isinstance(factor, FiniteFactor):
            finite = _evaluated(factor.function.coefficients, evaluate)
        elif isinstance(factor, ExponentialFactor):
            terms = _evaluated(factor.exponent.coefficients, evaluate)
            constant *= terms.pop(group.trivial, flint.arb(0)).exp()
            found += _narrow_and_wide(terms)
        elif factor.irrep == group.trivial:
            constant *= (1 - _fugacity(factor, evaluate)) ** -factor.copies
        else:
            found.append(BosonBalls(factor.irrep, _fugacity(factor, evaluate), factor.copies))
    return (FiniteBalls({irrep: value * constant for irrep, value in finite.items()}), *found)


def _narrow_and_wide(terms: Mapping[Irrep, Any]) -> list[ExponentialBalls]:
    """exp[Σ h_r χ_r] as it is, or with intervals h_r split into mid-points and deviations about 0.

    Taylor's series in the deviations then starts from coefficients without width: what intervals do to them
    is right to first order.
    """
    if all(value.rad() < WIDE for value in terms.values()):
        return [ExponentialBalls(terms)]
    middles = {irrep: value.mid() for irrep, value in terms.items()}
    deviations = {irrep: value - middles[irrep] for irrep, value in terms.items()}
    return [ExponentialBalls(middles), ExponentialBalls(deviations)]


def _evaluated(
    terms: Mapping[Irrep, Expr], evaluate: Callable[[Sequence[Expr]], list[Any]]
) -> dict[Irrep, Any]:
    return dict(zip(terms, evaluate(list(terms.values())), strict=True))


def _fugacity(factor: BosonFactor, evaluate: Callable[[Sequence[Expr]], list[Any]]) -> Any:
    [fugacity] = evaluate([factor.fugacity])
    if not abs(fugacity) < 1:
        raise ParameterError(
            f"boson fugacity {factor.fugacity} = {fugacity.str(6)} is not allowed: it must be a number with "
            "|z| < 1 throughout; narrow the interval or move it inwards."
        )
    return fugacity


class Majorant:
    """m(y) of a product of factors, expanded as far as asked.

    Parameters
    ----------
    factors
        As from :func:`factor_balls`.
    bits
        Working precision: a tail is right up to about m(1) 2^−bits.

    Attributes
    ----------
    total
        m(1), an upper bound of sup |W|: an arb without radius, as every bound here.
    """

    def __init__(self, factors: Sequence[BallFactor], bits: int) -> None:
        self._factors = factors
        self._polynomial = all(factor.polynomial for factor in factors)
        self._coefficients: list[Any] = []
        self.bits = bits
        with precision(bits):
            self._total = reduce(mul, (factor.total for factor in factors), flint.arb(1))
            self.total = self._total.upper()

    def tail(self, order: int) -> Any:
        """Upper bound of Σ_{k > order} m_k."""
        if order < 0:
            return self.total
        with precision(self.bits):
            known = self._expanded(order + 1)
            if self._polynomial:
                return sum(known[order + 1 :], flint.arb(0)).upper()
            return (self._total - sum(known[: order + 1], flint.arb(0))).upper().max(flint.arb(0))

    def order_below(self, tolerance: Any) -> int:
        """First order whose tail is at most the tolerance.

        Raises
        ------
        ConvergenceError
            If thousands of orders do not suffice.
        """
        high = 8
        while self.tail(high) > tolerance:
            high *= 2
            if high > MOST_ORDERS:
                raise ConvergenceError(
                    f"the characters of the weight do not die out in {MOST_ORDERS} orders: its parameters "
                    "are too close to the edge of their domain (a boson fugacity near 1, or very large "
                    "fields); move them inwards."
                )
        low = -1
        while high - low > 1:
            middle = (low + high) // 2
            low, high = (low, middle) if self.tail(middle) <= tolerance else (middle, high)
        return high

    def _expanded(self, length: int) -> list[Any]:
        if len(self._coefficients) < length:
            length = max(length, 2 * len(self._coefficients), 64)
            if self._polynomial:
                length = max(length, 1 + _degree(self._factors))
            product = flint.arb_poly([1])
            for factor in self._factors:
                product = (product * flint.arb_poly(factor.series(length))).truncate(length)
            coefficients = product.coeffs()
            self._coefficients = coefficients + [flint.arb(0)] * (length - len(coefficients))
        return self._coefficients


def _degree(factors: Sequence[BallFactor]) -> int:
    finite = (factor.terms for factor in factors if isinstance(factor, FiniteBalls))
    return sum(max((sum(irrep.labels) for irrep in terms), default=0) for terms in finite)


def _group(factors: Sequence[CharacterFactor]) -> Any:
    first = factors[0]
    if isinstance(first, BosonFactor):
        return first.irrep.group
    return (first.function if isinstance(first, FiniteFactor) else first.exponent).group
