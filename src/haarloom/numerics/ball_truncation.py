"""T on a truncated basis in ball arithmetic: the block inside, both couplings outwards, proven norms outside."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any

import flint
import sympy

from haarloom.algebra.labels import count_up_to, labels_up_to
from haarloom.exceptions import ConvergenceError
from haarloom.numerics.balls import ball, expression_ball
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
    if not site.finite:
        raise ConvergenceError(
            f"the site weight {site.kind} has infinitely many characters, for whose tail no proven bound is "
            "built in: certification needs a finite site weight; spectrum(...) gives masses with an error."
        )
    numbers = {name: ball(value) for name, value in values.items()}
    support = tuple(site.support())
    weights = [expression_ball(site.coefficient(irrep), numbers) for irrep in support]
    reach = int(site.reach(values) or 0)
    outer = cutoff + reach
    k = link_balls(model.link, outer, numbers)
    root, phase = _roots(k)
    components = site_components(site, cutoff, outer).pattern
    elements = _elements(components.components, weights)
    size = count_up_to(rank, cutoff)
    shell = count_up_to(rank, outer) - size
    matrix, upwards, downwards = flint.acb_mat(size, size), flint.acb_mat(shell, size), flint.acb_mat(size, shell)
    mirror = conjugation(rank, outer).tolist()
    for row, column, element in zip(components.rows.tolist(), components.columns.tolist(), elements, strict=True):
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
        upper_float(norm * link_tail(model.link, cutoff, numbers)),
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
            phases.append(number / size if not number == 0 else flint.acb(1))
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


def link_balls(link: LinkWeight, cutoff: int, numbers: Mapping[str, Any]) -> list[Any]:
    """Balls that contain k_r, for Σ a_i ≤ cutoff."""
    return [expression_ball(expression, numbers) for expression in _link_expressions(link, cutoff)]


def link_tail(link: LinkWeight, cutoff: int, numbers: Mapping[str, Any]) -> Any:
    """A ball not below |k_r| for every irrep with Σ a_i > cutoff.

    Heat kernel: C₂ rises with every label, because the inverse Cartan matrix has no negative element,
    so that the smallest C₂ outside sits on the first shell outside.
    """
    if link.kind == "heat kernel":
        shell = labels_up_to(link.group.rank, cutoff + 1)[count_up_to(link.group.rank, cutoff) :]
        weakest = min((link.group.irrep(labels) for labels in shell), key=lambda irrep: irrep.casimir(2))
        return expression_ball(link.coefficient(weakest), numbers)
    raise ConvergenceError(
        f"no proven bound of |k_r| beyond the basis is built in for the link weight {link.kind!r}: "
        "certification knows the heat kernel; spectrum(...) gives masses with an error."
    )


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
        sympy.expand(model.site.coefficient(c).subs(exact) - sympy.conjugate(model.site.coefficient(c.conjugate).subs(exact)))
        == 0
        for c in support
    )
