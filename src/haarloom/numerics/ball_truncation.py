"""T on a truncated basis in ball arithmetic: the block inside, both couplings outwards, proven norms."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from itertools import product
from typing import TYPE_CHECKING, Any

import flint
import numpy as np
import sympy

from haarloom.algebra.labels import count_up_to
from haarloom.exceptions import ConvergenceError
from haarloom.numerics.balls import Interval, ball, expression_ball
from haarloom.numerics.labels import conjugation
from haarloom.numerics.site_components import site_components

if TYPE_CHECKING:
    from haarloom.actions.protocols import LinkWeight
    from haarloom.algebra.irrep import Irrep
    from haarloom.ring.model import RingModel

__all__ = ["BallTruncation", "ball_truncation", "upper_float"]


@dataclass(frozen=True, eq=False)
class BallTruncation:
    """S W S Φ of :mod:`haarloom.numerics.truncation`, every element a ball.

    Attributes
    ----------
    matrix
        T inside, acb_mat (n, n).
    upwards, downwards
        C, (m, n), and B, (n, m), to the m irreps of the shell that W reaches.
    outer_norm
        Upper bound of ‖W‖ max |k_r| beyond the basis, a float rounded up.
    real
        Whether every element is real.
    hermitian
        Whether T is exactly Hermitian, shown with exact numbers.
    """

    matrix: Any
    upwards: Any
    downwards: Any
    outer_norm: float
    real: bool
    hermitian: bool


def ball_truncation(model: RingModel, cutoff: int, values: Mapping[str, Any]) -> BallTruncation:
    """T at exact values in the current precision of Arb.

    Parameters
    ----------
    values
        What :func:`~haarloom.numerics.balls.as_exact` returns, for each parameter.

    Raises
    ------
    ConvergenceError
        If the site weight has infinitely many characters, a coefficient has no ball arithmetic, or
        the link weight has no proven bound on its tail.
    """
    site, rank = model.site, model.group.rank
    if not model.link.diagonal:
        raise ConvergenceError(
            f"the link weight {model.link.kind} mixes irreps: certification is built in for links that are "
            "diagonal in them; spectrum(...) gives masses with an error."
        )
    if not site.finite:
        raise ConvergenceError(
            f"the site weight {site.kind} has infinitely many characters, for whose tail no proven bound is "
            "built in: certification needs a finite site weight; spectrum(...) gives masses with an error."
        )
    support = tuple(site.support())
    weights = coefficient_balls([site.coefficient(irrep) for irrep in support], values)
    reach = int(site.reach(values) or 0)
    outer = cutoff + reach
    k = coefficient_balls(_link_expressions(model.link, outer), values)
    root, phase = _roots(k)
    components = site_components(site, cutoff, outer).pattern
    elements = _elements(components.components, weights)
    size = count_up_to(rank, cutoff)
    shell = count_up_to(rank, outer) - size
    matrix, upwards, downwards = (
        flint.acb_mat(size, size),
        flint.acb_mat(shell, size),
        flint.acb_mat(size, shell),
    )
    mirror = conjugation(rank, outer).tolist()
    for row, column, element in zip(
        components.rows.tolist(), components.columns.tolist(), elements, strict=True
    ):
        if row < size:
            matrix[row, column] = root[row] * element * root[column] * phase[column]
        else:
            upwards[row - size, column] = root[row] * element * root[column] * phase[column]
            # W_{io} = W_{ō ī}
            o, i = mirror[row], mirror[column]
            downwards[i, o - size] = root[i] * element * root[o] * phase[o]
    norm = sum((abs(w) * irrep.dimension for w, irrep in zip(weights, support, strict=True)), flint.arb(0))
    return BallTruncation(
        matrix,
        upwards,
        downwards,
        upper_float(norm * link_tail(model.link, cutoff, values)),
        all(isinstance(number, flint.arb) for number in (*weights, *k)),
        _exactly_hermitian(model, support, values) and all(p == 1 for p in phase),
    )


def upper_float(number: Any) -> float:
    """A float above the absolute value of a ball."""
    # the summand keeps numbers below the range of floats from vanishing
    return float(abs(number).upper()) * (1 + 2.0**-50) + 1e-290


def _elements(components: Any, weights: list[Any]) -> list[Any]:
    """Σ_c w_c N_c at every place; N are small integers."""
    columns = components.toarray().T
    cache: dict[tuple[int, ...], Any] = {}
    found = []
    for column in columns.astype(int).tolist():
        key = tuple(column)
        if key not in cache:
            terms = (weight * count for weight, count in zip(weights, key, strict=True) if count)
            cache[key] = sum(terms, flint.arb(0))
        found.append(cache[key])
    return found


def _roots(k: list[Any]) -> tuple[list[Any], list[Any]]:
    """√|k| and k/|k|; the sign of every real k must be decided."""
    roots, phases = [], []
    for number in k:
        size = abs(number)
        roots.append(size.sqrt())
        if isinstance(number, flint.acb):
            phases.append(number / size if number != 0 else flint.acb(1))
        elif number >= 0:
            phases.append(flint.arb(1))
        elif number < 0:
            phases.append(flint.arb(-1))
        else:
            raise ConvergenceError(
                "the sign of a link coefficient is undecided at this precision: narrow the interval "
                "or raise the precision."
            )
    return roots, phases


@lru_cache(maxsize=8)
def _link_expressions(link: LinkWeight, cutoff: int) -> tuple[sympy.Expr, ...]:
    return tuple(link.coefficient(irrep) for irrep in link.group.irreps(cutoff))


def coefficient_balls(expressions: Sequence[sympy.Expr], values: Mapping[str, Any]) -> list[Any]:
    """Balls that contain exact coefficients; rational values enter the expressions as they are."""
    exact = {
        sympy.Symbol(name): sympy.Rational(value.numerator, value.denominator)
        for name, value in values.items()
        if isinstance(value, Fraction)
    }
    numbers = {name: ball(value) for name, value in values.items()}
    return [expression_ball(expression.xreplace(exact), numbers) for expression in expressions]


PROVEN_TAILS = ("heat kernel", "Wilson", "coefficient table", "loop coupling")
"""Kinds of link weight whose ``largest_outside`` is a proven bound, monotone in every parameter."""


def link_tail(link: LinkWeight, cutoff: int, values: Mapping[str, Any]) -> float:
    """A float not below |k_r| for every irrep with Σ a_i > cutoff, at all ends of the intervals."""
    if link.kind not in PROVEN_TAILS:
        raise ConvergenceError(
            f"no proven bound of |k_r| beyond the basis is built in for the link weight {link.kind!r} "
            f"(there is one for {', '.join(PROVEN_TAILS)}): spectrum(...) gives masses with an error."
        )
    names = [symbol.name for symbol in link.parameters]
    ends = [(v.lower, v.upper) if isinstance(v, Interval) else (v,) for v in (values[name] for name in names)]
    bounds = [
        float(np.max(link.largest_outside(cutoff, dict(zip(names, map(float, corner), strict=True)))))
        for corner in product(*ends)
    ]
    if len(bounds) > 1 and link.kind == "coefficient table" and max(bounds) > 0:
        raise ConvergenceError(
            "a coefficient table that depends on an interval needs a cutoff beyond its last irrep: "
            "give a single value, or fewer irreps in the table."
        )
    # the slack covers the rounding of exact values to floats
    return max(bounds) * (1 + 1e-9)


def _exactly_hermitian(model: RingModel, support: tuple[Irrep, ...], values: Mapping[str, Any]) -> bool:
    """w_c̄ = w_c* with exact numbers; an interval never counts."""
    exact = {}
    for symbol in model.site.parameters:
        value = values[symbol.name]
        if hasattr(value, "numerator"):
            value = sympy.Rational(value.numerator, value.denominator)
        if not isinstance(value, sympy.Expr):
            return False
        exact[symbol] = value
    return all(
        sympy.expand(
            model.site.coefficient(c).subs(exact)
            - sympy.conjugate(model.site.coefficient(c.conjugate).subs(exact))
        )
        == 0
        for c in support
    )
