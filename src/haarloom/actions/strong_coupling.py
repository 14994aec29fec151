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
    exponent = finite_exponent(link)
    moments, names = _moments(exponent, order)
    zero = moments.ring.zero
    trivial = [level.get(link.group.trivial.labels, zero) for level in moments.levels]
    top = [level.get(irrep.labels, zero) / irrep.dimension for level in moments.levels]
    ratio = _divided(top, trivial)
    strip = [moments.ring.one, *[zero] * order]
    for _ in range(link.plaquettes):
        strip = _truncated_product(strip, ratio)
    polynomial = sum(strip, zero).as_expr()
    return sympy.expand(polynomial.subs(names, simultaneous=True))


def finite_exponent(link: Link) -> ClassFunction:
    exponent = link.exponent()
    if exponent is None:
        raise ClassFunctionError(
            f"The plaquette action of kind '{link.kind}' is no finite combination of characters, so its k_r "
            "have no series in the coupling with rational coefficients; use .coefficient or .coefficients_at."
        )
    return exponent


@dataclass(frozen=True)
class _Moments:
    """⟨χ_r* S^M⟩/M! for M = 0 … order, by labels."""

    ring: Any
    levels: tuple[Mapping[Labels, Any], ...]


@lru_cache(maxsize=8)
def _moments(exponent: ClassFunction, order: int) -> tuple[_Moments, Mapping[Expr, Expr]]:
    """Moments with one polynomial generator for each coupling, and what the generators stand for."""
    parts = {labels: value.as_coeff_Mul() for labels, value in exponent.by_labels().items()}
    couplings = sorted({rest for _, rest in parts.values()}, key=sympy.default_sort_key)
    generators = [sympy.Symbol(f"g{i}") for i in range(len(couplings))]
    ring = sympy.polys.rings.PolyRing(generators, QQ)
    element = dict(zip(couplings, ring.gens, strict=True))
    step = {labels: element[rest] * QQ(count.p, count.q) for labels, (count, rest) in parts.items()}
    level: dict[Labels, Any] = {(0,) * exponent.group.rank: ring.one}
    levels = [level]
    for power in range(1, order + 1):
        following: dict[Labels, Any] = {}
        for labels, value in level.items():
            for factor, coupling in step.items():
                term = value * coupling / power
                for target, count in multiply(labels, factor).items():
                    following[target] = following.get(target, ring.zero) + count * term
        level = following
        levels.append(level)
    return _Moments(ring, tuple(levels)), dict(zip(generators, couplings, strict=True))


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
