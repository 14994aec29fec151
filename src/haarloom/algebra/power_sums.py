"""Characters as polynomials in the power sums tr P, tr P², …, tr P^{N−1}."""

from __future__ import annotations

from collections.abc import Iterable
from functools import lru_cache
from typing import Any

from sympy import QQ, Expr, Symbol
from sympy.polys.rings import PolyRing

from haarloom.algebra.coefficients import total
from haarloom.algebra.labels import Labels
from haarloom.algebra.loops import loops_by_monomial, sum_of_monomials
from haarloom.algebra.words import trace_word

__all__ = ["characters_in_power_sums"]


def characters_in_power_sums(n: int, coefficients: Iterable[tuple[Labels, Expr]]) -> Expr:
    """Σ_r a_r χ_r in tr(P, 1) … tr(P, N − 1), by way of the fundamental loops."""
    gathered: dict[tuple[int, ...], list[Expr]] = {}
    for exponents, coefficient in loops_by_monomial(coefficients).items():
        for powers, number in _monomial(n, exponents).items():
            gathered.setdefault(powers, []).append(QQ.to_sympy(number) * coefficient)
    words = tuple(trace_word(k) for k in range(1, n))
    return sum_of_monomials(words, {powers: total(parts) for powers, parts in gathered.items()})


@lru_cache(maxsize=8)
def _elementary(n: int) -> tuple[Any, ...]:
    """e_1 … e_{N−1} in the power sums, by Newton's identities k·e_k = Σ_j (−1)^{j−1} p_j e_{k−j}."""
    ring = PolyRing([Symbol(f"p{k}") for k in range(1, n)], QQ)
    found = [ring.one]
    for k in range(1, n):
        terms = ((1 if j % 2 else -1) * ring.gens[j - 1] * found[k - j] for j in range(1, k + 1))
        found.append(sum(terms, ring.zero) * QQ(1, k))
    return tuple(found[1:])


def _monomial(n: int, exponents: tuple[int, ...]) -> Any:
    """∏ e_k^{a_k} in the power sums."""
    factors = [_power(n, k, power) for k, power in enumerate(exponents) if power]
    result = _elementary(n)[0].ring.one
    for factor in factors:
        result = result * factor
    return result


@lru_cache(maxsize=512)
def _power(n: int, k: int, power: int) -> Any:
    return _elementary(n)[k] ** power
