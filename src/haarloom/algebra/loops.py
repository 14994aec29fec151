"""Characters as polynomials in the fundamental loops e_1 = L, e_2, …, e_{N−1} = L*.

The fundamental loops are the characters of the N − 1 antisymmetric irreps, the elementary symmetric
functions of the eigenvalues of P; e_N = det P = 1. For SU(3) they are L = tr P and L* = tr P†; for SU(2) L
alone.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from functools import lru_cache
from types import MappingProxyType
from typing import Any

from sympy import ZZ, Add, Expr, Mul, Pow, S, Symbol
from sympy.polys.orderings import grevlex
from sympy.polys.rings import PolyRing

from haarloom.algebra.bounded_cache import cached_terms
from haarloom.algebra.coefficients import total
from haarloom.algebra.labels import Labels, rows_from_labels

__all__ = [
    "character_in_loops",
    "characters_in_loops",
    "loop_symbols",
    "loops_by_monomial",
    "sum_of_monomials",
]


@lru_cache(maxsize=8)
def loop_symbols(n: int) -> tuple[Symbol, ...]:
    """The symbols e_1 … e_{N−1}: ``L``, ``E_2``, …, ``L^*``.

    >>> loop_symbols(3), loop_symbols(4), loop_symbols(2)
    ((L, L^*), (L, E_2, L^*), (L,))
    """
    middle = tuple(Symbol(f"E_{k}") for k in range(2, n - 1))
    return (Symbol("L"),) if n == 2 else (Symbol("L"), *middle, Symbol("L^*"))


@lru_cache(maxsize=8)
def _loop_ring(n: int) -> Any:
    """The ring ℤ[e_1, …, e_{N−1}]."""
    return PolyRing(loop_symbols(n), ZZ, grevlex)


def character_in_loops(labels: Labels) -> Expr:
    """One character as a polynomial in the fundamental loops.

    >>> character_in_loops((1, 1)), character_in_loops((2, 0))
    (L*L^* - 1, L**2 - L^*)
    """
    return characters_in_loops(len(labels) + 1, [(labels, S.One)])


def characters_in_loops(n: int, coefficients: Iterable[tuple[Labels, Expr]]) -> Expr:
    """Σ_r a_r χ_r as a polynomial in the loops, coefficients collected monomial by monomial."""
    return sum_of_monomials(loop_symbols(n), loops_by_monomial(coefficients))


def loops_by_monomial(coefficients: Iterable[tuple[Labels, Expr]]) -> dict[tuple[int, ...], Expr]:
    """Σ_r a_r χ_r in the loops, as a mapping from exponents of e_1 … e_{N−1} to coefficients."""
    gathered: dict[tuple[int, ...], list[Expr]] = {}
    for labels, coefficient in coefficients:
        for exponents, integer in polynomial(labels).items():
            gathered.setdefault(exponents, []).append(integer * coefficient)
    return {exponents: total(terms) for exponents, terms in gathered.items()}


def sum_of_monomials(symbols: tuple[Symbol, ...], terms: Mapping[tuple[int, ...], Expr]) -> Expr:
    """Σ coefficient·∏ symbol^exponent as one SymPy sum."""
    return Add(
        *(
            Mul(
                coefficient,
                *(Pow(symbol, power) for symbol, power in zip(symbols, exponents, strict=True) if power),
            )
            for exponents, coefficient in terms.items()
        )
    )


@cached_terms(limit=100_000)
def polynomial(labels: Labels) -> Mapping[tuple[int, ...], int]:
    """Jacobi and Trudi: χ_λ = det h_{λ_i − i + j}, expanded from the last row up with shared minors.

    I. G. Macdonald, *Symmetric Functions and Hall Polynomials*, eq. I.3.4. The result maps exponents of e_1 …
    e_{N−1} to integers; ``minors`` holds the determinants of the rows done so far, by the set of columns
    used.
    """
    rows = [row for row in rows_from_labels(labels) if row]
    size = len(rows)
    complete = _complete(len(labels) + 1, max(rows, default=0) + size)
    minors = {0: complete[0]}
    for i in reversed(range(size)):
        grown: dict[int, Any] = {}
        for used, minor in minors.items():
            for j in range(size):
                degree = rows[i] - i + j
                if degree >= 0 and not used >> j & 1:
                    sign = -1 if (used & ((1 << j) - 1)).bit_count() % 2 else 1
                    key = used | 1 << j
                    grown[key] = grown.get(key, 0) + sign * minor * complete[degree]
        minors = grown
    return MappingProxyType({exponents: int(count) for exponents, count in minors[(1 << size) - 1].items()})


def _complete(n: int, degree: int) -> list[Any]:
    """h_0 … h_degree by h_m = Σ_k (−1)^{k−1} e_k h_{m−k} (Macdonald, eq. I.2.6′), with e_N = 1."""
    ring = _loop_ring(n)
    ladder = [ring.one]
    elementary = [*ring.gens, ring.one]
    for m in range(1, degree + 1):
        terms = ((1 if k % 2 else -1) * elementary[k - 1] * ladder[m - k] for k in range(1, min(n, m) + 1))
        ladder.append(sum(terms, ring.zero))
    return ladder
