"""Link coefficients k_r as balls, and proven bounds of |k_r| beyond any cutoff.

Three sources: closed forms with a theorem about their tail (heat kernel, Wilson, finite tables), the exact
factors of the plaquette weight w(U) = Σ_r c_r χ_r(U), and products of both for stacked strips. From factors,

    k_r = (c_r/(d_r c_0))^{N_t},    |k_r| ≤ (Σ_{k > K} m_k / (d² |c_0|))^{N_t}  for Σ r > K,

m the majorant of w and d = (K+N choose N−1) the least dimension beyond K, that of the symmetric power.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import fields, replace
from functools import lru_cache, reduce
from itertools import product
from math import comb
from operator import mul
from typing import TYPE_CHECKING, Any, Protocol

import flint
import numpy as np
import sympy

from haarloom.actions.coefficient_table import CoefficientTable
from haarloom.actions.link_products import StackedLinks
from haarloom.algebra.labels import count_up_to
from haarloom.exceptions import ConvergenceError, ParameterError
from haarloom.numerics.ball_characters import GUARD, character_balls
from haarloom.numerics.balls import Interval, coefficient_balls, precision, upper_float
from haarloom.numerics.majorant import BallFactor, BosonBalls, Majorant, factor_balls

if TYPE_CHECKING:
    from haarloom.actions.character_factors import CharacterFactor
    from haarloom.actions.protocols import LinkWeight

__all__ = ["BallLink", "ball_link", "link_source"]

FAR = 64
"""Bits of working precision for link coefficients that are small against the first."""

MOST_SHELLS = {2: 400, 3: 80, 4: 24, 5: 14, 6: 10, 7: 8, 8: 7}
"""Σ r by N to which an expansion is followed for its tail's sake."""

SLACK = 1 + 1e-9
"""What rounding exact values to floats may do to a bound."""


class BallLink(Protocol):
    """A diagonal link weight at exact values."""

    def coefficients(self, cutoff: int) -> list[Any]:
        """Balls k_r for Σ r ≤ cutoff, in basis order."""

    def outside(self, cutoff: int) -> float:
        """A float not below |k_r| for every irrep with Σ r > cutoff."""

    @property
    def positive(self) -> bool:
        """Whether every k_r ≥ 0 is a theorem."""


def ball_link(link: LinkWeight, values: Mapping[str, Any], farthest: int) -> BallLink:
    """Balls for a link weight.

    Parameters
    ----------
    values
        What :func:`~haarloom.numerics.balls.as_exact` returns, for each parameter.
    farthest
        Largest cutoff at which coefficients will be asked for: an expansion is made once, so far.

    Raises
    ------
    ConvergenceError
        If it mixes irreps, or no proven bound of its tail exists.
    """
    source = link_source(link, values)
    if source == "stacked":
        return _Stacked([ball_link(part, values, farthest) for part in link.links])  # type: ignore[attr-defined]
    if source == "listed":
        return _Listed(link, values)  # type: ignore[arg-type]
    if source == "closed":
        return _Closed(link, {symbol.name: values[symbol.name] for symbol in link.parameters})
    return _Expanded(link, values, farthest)


def link_source(link: LinkWeight, values: Mapping[str, Any]) -> str:
    """Which way balls are found: "stacked", "listed", "closed" or "expanded".

    Raises
    ------
    ConvergenceError
        As :func:`ball_link`, before anything is computed.
    """
    if not link.diagonal:
        raise ConvergenceError(
            f"the link weight {link.kind} mixes irreps: certification is built in for links that are "
            "diagonal in them; spectrum(...) gives masses with an error."
        )
    if isinstance(link, StackedLinks):
        for part in link.links:
            link_source(part, values)
        return "stacked"
    if isinstance(link, CoefficientTable):
        return "listed"
    interval = any(isinstance(values[symbol.name], Interval) for symbol in link.parameters)
    if getattr(link, "bounds_proven", False) and (getattr(link, "monotone", False) or not interval):
        return "closed"
    if _factors(link) is None:
        raise ConvergenceError(
            f"no proven bound of |k_r| beyond the basis exists for the link weight {link.kind!r}"
            f"{' over an interval' if interval else ''}: there is one for the heat kernel, for tables, and "
            "for plaquette weights that are polynomials in characters times exponentials of such (Wilson, "
            "mixed Wilson, written ones); spectrum(...) gives masses with an error."
        )
    return "expanded"


def _factors(link: LinkWeight) -> tuple[CharacterFactor, ...] | None:
    # a class of the user's own need not know of plaquette factors
    known: tuple[CharacterFactor, ...] | None = getattr(link, "plaquette_factors", lambda: None)()
    return known


class _Closed:
    """k_r from exact expressions, with the weight's own proven bound of the rest."""

    def __init__(self, link: LinkWeight, values: Mapping[str, Any]) -> None:
        self._link, self._values = link, values
        self.positive: bool = getattr(link, "positive", False)

    def coefficients(self, cutoff: int) -> list[Any]:
        return coefficient_balls(_expressions(self._link, cutoff), self._values)

    def outside(self, cutoff: int) -> float:
        return max(float(np.max(link.largest_outside(cutoff, v))) for link, v in self._corners()) * SLACK

    def _corners(self) -> list[tuple[Any, dict[str, Any]]]:
        """The weight at its values, or with its fields at the ends of what they take on an interval."""
        if not any(isinstance(value, Interval) for value in self._values.values()):
            return [(self._link, {name: _number(value) for name, value in self._values.items()})]
        names = [f.name for f in fields(self._link) if isinstance(getattr(self._link, f.name), sympy.Expr)]  # type: ignore[arg-type]
        ends = [_ends(getattr(self._link, name), self._values) for name in names]
        return [(replace(self._link, **dict(zip(names, c, strict=True))), {}) for c in product(*ends)]  # type: ignore[type-var]


def _number(value: Any) -> float | complex:
    number = complex(value)
    return number.real if number.imag == 0 else number


def _ends(expression: sympy.Expr, values: Mapping[str, Any]) -> list[sympy.Expr]:
    """Ends of the range of a field, as exact numbers; an end below 0 by rounding alone becomes 0."""
    given = values.get(str(expression)) if expression.is_Symbol else None
    if isinstance(given, Interval):
        return [sympy.Rational(end.numerator, end.denominator) for end in (given.lower, given.upper)]
    [ball] = coefficient_balls([expression], values)
    if isinstance(ball, flint.acb):
        raise ParameterError(f"{expression} is complex on the interval given: give a single value.")
    lower, upper = (sympy.Rational(float(end)) for end in (ball.lower(), ball.upper()))
    return [sympy.S.Zero if abs(lower) < 1e-8 * abs(upper) else lower, upper]


@lru_cache(maxsize=8)
def _expressions(link: LinkWeight, cutoff: int) -> tuple[sympy.Expr, ...]:
    return tuple(link.coefficient(irrep) for irrep in link.group.irreps(cutoff))


class _Listed:
    """k_r of a table; what it lacks is zero."""

    def __init__(self, link: CoefficientTable, values: Mapping[str, Any]) -> None:
        self._link, self._values = link, values
        self.positive = False

    def coefficients(self, cutoff: int) -> list[Any]:
        return coefficient_balls(_expressions(self._link, cutoff), self._values)

    def outside(self, cutoff: int) -> float:
        beyond = [k for irrep, k in self._link.coefficients if sum(irrep.labels) > cutoff]
        if not beyond:
            return 0.0
        return max(upper_float(number) for number in coefficient_balls(beyond, self._values))


class _Stacked:
    """Strips one after the other: their k_r multiply."""

    def __init__(self, parts: list[BallLink]) -> None:
        self._parts = parts
        self.positive = all(part.positive for part in parts)

    def coefficients(self, cutoff: int) -> list[Any]:
        return [
            reduce(mul, k) for k in zip(*(part.coefficients(cutoff) for part in self._parts), strict=True)
        ]

    def outside(self, cutoff: int) -> float:
        return reduce(mul, (part.outside(cutoff) for part in self._parts)) * (1 + 1e-15 * len(self._parts))


class _Expanded:
    """k_r from the character expansion of the plaquette weight."""

    def __init__(self, link: LinkWeight, values: Mapping[str, Any], farthest: int) -> None:
        self._group, self._strips = link.group, link.plaquettes
        # far k_r are small against w(1), and it is their square roots that enter T
        bits = flint.ctx.prec + GUARD + FAR
        with precision(bits):
            balls = factor_balls(
                _factors(link) or (), lambda expressions: coefficient_balls(expressions, values)
            )
            self._majorant = Majorant(balls, bits)
            # products of characters have no negative multiplicities
            self.positive = all(_nonnegative(factor) for factor in balls)
            # farther than asked, since the majorant says little about the first shells
            half = self._majorant.order_below(self._majorant.total * flint.arb(2) ** (GUARD - bits)) // 2
            self._farthest = max(farthest, min(half, MOST_SHELLS[self._group.n]))
            w = character_balls(balls, self._majorant, link.group.rank, self._farthest).coefficients
            if not abs(w[0]).lower() > 0:
                raise ConvergenceError(
                    "∫dU w(U) cannot be told from 0 at this precision, so that k_r = w_r/w_0 is unknown: "
                    "narrow the interval or change the couplings."
                )
            self._mean = abs(w[0]).lower()
            irreps = self._group.irreps(self._farthest)
            ratios = [c / (w[0] * irrep.dimension) for c, irrep in zip(w, irreps, strict=True)]
            self._k = [ratio**self._strips for ratio in ratios]

    def coefficients(self, cutoff: int) -> list[Any]:
        return self._k[: count_up_to(self._group.rank, cutoff)]

    def outside(self, cutoff: int) -> float:
        inside = min(cutoff, self._farthest)
        seen = [upper_float(k) for k in self._k[count_up_to(self._group.rank, inside) :]]
        last = max(cutoff, self._farthest)
        least = comb(last + self._group.n, self._group.n - 1)
        rest = self._majorant.tail(last) / (least**2 * self._mean)
        return max([*seen, upper_float(rest**self._strips)])


def _nonnegative(factor: BallFactor) -> bool:
    numbers = [factor.fugacity] if isinstance(factor, BosonBalls) else factor.terms.values()
    return all(not isinstance(number, flint.acb) and bool(number >= 0) for number in numbers)
