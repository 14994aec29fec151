"""Strong-coupling (character) series: k_r in powers of the couplings, with rational coefficients.

For w(U) = e^{S(U)} with S a finite class function, w_r = Σ_M ⟨χ_r* S^M⟩/(M! d_r), and powers of S are
tensor products: every coefficient is a count of walks on the irreps times the couplings.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any

import sympy
from sympy import QQ, Expr
from sympy.polys.rings import PolyRing

from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.products import multiply
from haarloom.exceptions import ClassFunctionError, ParameterError

if TYPE_CHECKING:
    from haarloom.actions.base import Link

__all__ = ["finite_exponent", "strong_coupling_series"]

Labels = tuple[int, ...]

_HIGHEST = 200


def strong_coupling_series(link: Link, irrep: Irrep, order: int) -> Expr:
    """k_r through a total order in the couplings, exactly.

    Parameters
    ----------
    link : Link
        With a finite plaquette action, ``link.exponent()``.
    irrep : Irrep
    order : int
        Highest total power of the couplings, from 0 to 200.

    Returns
    -------
    Expr
        A polynomial in the couplings with rational coefficients.

    Raises
    ------
    ClassFunctionError
        If ln w(U) is no finite combination of characters; then no such series exists here.

    References
    ----------
    J.-M. Drouffe, J.-B. Zuber, Phys. Rep. 102 (1983) 1, section 3.
    """
    if not isinstance(order, int) or isinstance(order, bool) or not 0 <= order <= _HIGHEST:
        raise ParameterError(f"order = {order!r} is not allowed: it must be an integer from 0 to {_HIGHEST}.")
    moments = _moments(finite_exponent(link), order)
    zero = moments.one - moments.one
    trivial = [level.get(link.group.trivial.labels, zero) for level in moments.levels]
    top = [level.get(irrep.labels, zero) / irrep.dimension for level in moments.levels]
    ratio = _divided(top, trivial)
    strip = [moments.one, *[zero] * order]
    for _ in range(link.plaquettes):
        strip = _truncated_product(strip, ratio)
    return moments.expression(strip)


def finite_exponent(link: Link) -> ClassFunction:
    """ln w(U) of the link weight, or a `ClassFunctionError` if it is no finite combination of characters."""
    exponent = link.exponent()
    if exponent is None:
        raise ClassFunctionError(
            f"The plaquette action of kind '{link.kind}' is no finite combination of characters, so its k_r "
            "have no series in the coupling with rational coefficients; use .coefficient or .coefficients_at."
        )
    return exponent


@dataclass(frozen=True)
class _Moments:
    """⟨χ_r* S^M⟩/M! for M = 0 … order, by labels.

    With one coupling the values are rational numbers, its M-th power understood; with several they are
    polynomials with one generator for each.
    """

    couplings: tuple[Expr, ...]
    one: Any
    levels: tuple[Mapping[Labels, Any], ...]

    def expression(self, graded: Sequence[Any]) -> Expr:
        """A sum of one value for each order, written in the couplings."""
        if len(self.couplings) == 1:
            terms = (sympy.Rational(int(c.numerator), int(c.denominator)) for c in graded)
            return sympy.expand(sympy.Add(*(c * self.couplings[0] ** k for k, c in enumerate(terms))))
        names = dict(zip(_generators(len(self.couplings)), self.couplings, strict=True))
        return sympy.expand(sum(graded, self.one - self.one).as_expr().subs(names, simultaneous=True))


def _generators(count: int) -> list[sympy.Symbol]:
    return [sympy.Symbol(f"g{i}") for i in range(count)]


@lru_cache(maxsize=8)
def _moments(exponent: ClassFunction, order: int) -> _Moments:
    parts = {labels: value.as_coeff_Mul() for labels, value in exponent.by_labels().items()}
    couplings = tuple(sorted({rest for _, rest in parts.values()}, key=sympy.default_sort_key))
    one, elements = QQ(1), [QQ(1)]
    if len(couplings) > 1:
        ring = PolyRing(_generators(len(couplings)), QQ)
        one, elements = ring.one, list(ring.gens)
    element = dict(zip(couplings, elements, strict=True))
    step = {labels: element[rest] * QQ(count.p, count.q) for labels, (count, rest) in parts.items()}
    level: dict[Labels, Any] = {(0,) * exponent.group.rank: one}
    levels = [level]
    for power in range(1, order + 1):
        following: dict[Labels, Any] = {}
        for labels, value in level.items():
            for factor, coupling in step.items():
                term = value * coupling / power
                for target, count in multiply(labels, factor).items():
                    following[target] = (
                        following[target] + count * term if target in following else count * term
                    )
        level = following
        levels.append(level)
    return _Moments(couplings, one, tuple(levels))


def _divided(top: Sequence[Any], bottom: Sequence[Any]) -> list[Any]:
    """Quotient of two series graded by the order; the divisor starts with 1."""
    quotient: list[Any] = []
    for degree, value in enumerate(top):
        quotient.append(
            value - sum((bottom[k] * quotient[degree - k] for k in range(1, degree + 1)), value * 0)
        )
    return quotient


def _truncated_product(a: Sequence[Any], b: Sequence[Any]) -> list[Any]:
    return [sum((a[k] * b[degree - k] for k in range(degree + 1)), a[0] * 0) for degree in range(len(a))]
