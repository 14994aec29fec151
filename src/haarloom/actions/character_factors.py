"""Exact factors of a class function whose characters can be bounded: what a proof takes from a weight.

A weight that is known only by its values on the torus has coefficients from quadrature, with an error that
is measured and not proven. One that says by what exact factors it is built has coefficients and a tail
that ball arithmetic can enclose (`haarloom.numerics.ball_characters`).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import reduce
from operator import mul
from typing import TypeAlias

import sympy
from sympy import Expr, Mul

from haarloom.actions.class_expression import ClassExpression
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.irrep import Irrep

__all__ = [
    "BosonFactor",
    "CharacterFactor",
    "ExponentialFactor",
    "FiniteFactor",
    "merged_factors",
    "written_factors",
]


@dataclass(frozen=True)
class FiniteFactor:
    """Σ_c w_c χ_c, finitely many."""

    function: ClassFunction


@dataclass(frozen=True)
class ExponentialFactor:
    """exp[Σ_r h_r χ_r], finitely many."""

    exponent: ClassFunction


@dataclass(frozen=True)
class BosonFactor:
    """det_R(1 − zP)^{−n}, |z| < 1."""

    irrep: Irrep
    fugacity: Expr
    copies: int


CharacterFactor: TypeAlias = FiniteFactor | ExponentialFactor | BosonFactor


def merged_factors(factors: Sequence[CharacterFactor]) -> tuple[CharacterFactor, ...]:
    """The same product with one finite factor and one exponential at most, in this order."""
    finite = [factor.function for factor in factors if isinstance(factor, FiniteFactor)]
    exponents = [factor.exponent for factor in factors if isinstance(factor, ExponentialFactor)]
    merged: list[CharacterFactor] = [factor for factor in factors if isinstance(factor, BosonFactor)]
    if exponents:
        merged.insert(0, ExponentialFactor(sum(exponents[1:], exponents[0])))
    if finite:
        merged.insert(0, FiniteFactor(reduce(mul, finite)))
    return tuple(merged)


def written_factors(written: ClassExpression) -> tuple[CharacterFactor, ...] | None:
    """Factors of an expression that is a product of polynomials and exponentials of polynomials, else None.

    Examples
    --------
    >>> from haarloom.actions.class_expression import class_expression
    >>> from haarloom.algebra.group import SU
    >>> [type(part).__name__ for part in written_factors(class_expression(SU(3), "(1 + z*L)*exp(h*L)"))]
    ['FiniteFactor', 'ExponentialFactor']
    """
    finite: list[Expr] = []
    exponents: list[Expr] = []
    for part in Mul.make_args(written.expression):
        if isinstance(part, sympy.exp):
            exponents.append(part.args[0])
        elif part.is_Pow and part.exp.is_Integer and isinstance(part.base, sympy.exp):
            exponents.append(part.exp * part.base.args[0])
        else:
            finite.append(part)
    polynomial = written.part(Mul(*finite)).finite
    exponent = written.part(sympy.Add(*exponents)).finite
    if polynomial is None or exponent is None:
        return None
    return merged_factors([FiniteFactor(polynomial), *([ExponentialFactor(exponent)] if exponents else [])])
