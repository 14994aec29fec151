"""The exact problem behind a perturbation series: levels at the start, and T order by order."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING, Any

import numpy as np
import sympy

from haarloom.exceptions import ConvergenceError, ParameterError
from haarloom.numerics.balls import as_exact
from haarloom.numerics.exact_field import ExactField, exact_field
from haarloom.numerics.parameters import parameter_names
from haarloom.numerics.power_series import product

if TYPE_CHECKING:
    from haarloom.algebra.irrep import Irrep
    from haarloom.ring.model import RingModel

__all__ = ["SeriesProblem", "leading_groups", "series_problem"]


@dataclass(frozen=True, eq=False)
class SeriesProblem:
    """``order`` is what is kept; ``inner``, one more, what is computed: a square root costs half a power."""

    symbol: sympy.Symbol
    order: int
    inner: int
    basis: tuple[Irrep, ...]
    field: ExactField
    starts: list[Any]
    start_expressions: list[sympy.Expr]
    perturbation: list[dict[tuple[int, int], Any]]
    sizes: np.ndarray


def series_problem(model: RingModel, parameter: Any, order: int, values: Mapping[str, Any]) -> SeriesProblem:
    name = parameter.name if isinstance(parameter, sympy.Symbol) else str(parameter)
    if name not in parameter_names(model):
        raise ParameterError(
            f"{name!r} is no parameter of this model, which has "
            f"{', '.join(parameter_names(model)) or 'none'}."
        )
    if not isinstance(order, int) or isinstance(order, bool) or order < 1:
        raise ParameterError(f"order = {order!r}: give a whole number ≥ 1, the highest power to keep.")
    if not model.link.diagonal:
        raise ConvergenceError(
            f"the link weight {model.link.kind} mixes irreps: series are built in for diagonal links."
        )
    if not model.site.finite:
        raise ConvergenceError(
            f"the site weight {model.site.kind} has infinitely many characters: series are built in for "
            "finite site weights; expand the weight first and use the polynomial."
        )
    symbol, inner = sympy.Symbol(name), order + 1
    fixed = {sympy.Symbol(key): _rational(as_exact(key, value)) for key, value in values.items()}
    weights = {irrep: model.site.coefficient(irrep).subs(fixed) for irrep in model.site.support()}
    site = {irrep: _coefficients(weight, symbol, inner) for irrep, weight in weights.items()}
    _check_diagonal(site, symbol, model)
    basis = model.group.irreps(_reach(site, inner))
    link = [_coefficients(model.link.coefficient(irrep).subs(fixed), symbol, inner) for irrep in basis]
    field = exact_field([c for row in [*site.values(), *link] for c in row])
    link_elements = [[field.element(c) for c in row] for row in link]
    matrices = _matrices(site, basis, link_elements, field, inner)
    starts = [matrices[0].get((row, row), field.zero) for row in range(len(basis))]
    expressions = [field.expression(start) for start in starts]
    return SeriesProblem(
        symbol, order, inner, basis, field, starts, expressions, matrices[1:], _sizes(expressions)
    )


def _rational(value: Any) -> sympy.Expr:
    if isinstance(value, Fraction):
        return sympy.Rational(value.numerator, value.denominator)
    if isinstance(value, sympy.Expr):
        return value
    raise ParameterError(f"{value} is an interval: a series needs single exact numbers.")


def _coefficients(expression: sympy.Expr, symbol: sympy.Symbol, order: int) -> list[sympy.Expr]:
    """Taylor coefficients up to an order around 0."""
    if not expression.has(symbol):
        return [expression] + [sympy.S.Zero] * order
    if not expression.is_polynomial(symbol):
        expression = sympy.series(expression, symbol, 0, order + 1).removeO()
    polynomial = sympy.Poly(sympy.expand(expression), symbol)
    return [polynomial.coeff_monomial(symbol**power) for power in range(order + 1)]


def _check_diagonal(site: Mapping[Irrep, list[sympy.Expr]], symbol: sympy.Symbol, model: RingModel) -> None:
    for irrep, row in site.items():
        if irrep != model.group.trivial and row[0] != 0:
            raise ConvergenceError(
                f"at {symbol} = 0 the site weight still holds the character of {irrep.name}, so that T is "
                "not diagonal there and its levels have no closed form: expand in the parameter that "
                "switches all matter off, or set the others to 0."
            )


def _reach(site: Mapping[Irrep, list[sympy.Expr]], order: int) -> int:
    """Σ a_i that levels of small irreps reach within the order and come back from."""
    steps = [
        (sum(irrep.labels), next(power for power, c in enumerate(row) if c != 0))
        for irrep, row in site.items()
        if any(c != 0 for c in row)
    ]
    fastest = max((Fraction(distance, power) for distance, power in steps if power), default=Fraction(0))
    return 3 + int(fastest * order)


def _matrices(
    site: Mapping[Irrep, list[sympy.Expr]],
    basis: tuple[Irrep, ...],
    link: list[list[Any]],
    field: ExactField,
    order: int,
) -> list[dict[tuple[int, int], Any]]:
    """Coefficients of K W by power of the parameter: similar to T, without square roots."""
    from haarloom.algebra.products import fusion_tensor

    labels = [irrep.labels for irrep in basis]
    found: list[dict[tuple[int, int], Any]] = [{} for _ in range(order + 1)]
    for irrep, row in site.items():
        elements = [field.element(c) for c in row]
        for r, s, count in fusion_tensor(labels, irrep.labels):
            dressed = product(link[r], elements)
            for power, element in enumerate(dressed):
                if element != 0:
                    place = found[power]
                    place[r, s] = place.get((r, s), field.zero) + count * element
    return [{key: element for key, element in matrix.items() if element != 0} for matrix in found]


def _sizes(expressions: list[sympy.Expr]) -> np.ndarray:
    """Sizes of the starting levels at a sample point, where symbols stand for irregular positive numbers."""
    symbols = sorted({s for e in expressions for s in e.free_symbols}, key=str)
    sample = {s: sympy.Rational(1000 + 37 * number, 1009) for number, s in enumerate(symbols)}
    return np.array([abs(complex(e.subs(sample))) for e in expressions])


def leading_groups(problem: SeriesProblem, levels: int) -> list[list[int]]:
    """Positions of equal starting levels, largest first, until enough levels are covered."""
    groups: dict[Any, list[int]] = {}
    for place, start in enumerate(problem.starts):
        groups.setdefault(start, []).append(place)
    ordered = sorted(groups.values(), key=lambda group: -problem.sizes[group[0]])
    found: list[list[int]] = []
    while ordered and sum(map(len, found)) < levels:
        found.append(ordered.pop(0))
    return found
