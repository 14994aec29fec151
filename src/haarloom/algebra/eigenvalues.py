"""Class functions as symmetric Laurent polynomials in the eigenvalues x_1 … x_N of P.

Since x_1 ⋯ x_N = 1 a monomial has many spellings. Here the exponents of every monomial add up to the N-ality:
the adjoint of SU(3) reads 2 + Σ_{i≠j} x_i/x_j, the antifundamental x_1 x_2 + x_1 x_3 + x_2 x_3.
"""

from __future__ import annotations

from collections.abc import Iterable
from functools import lru_cache
from itertools import pairwise

from sympy import Add, Expr, Integer, Mul, S, Symbol

from haarloom.algebra.coefficients import negated, normal_form, total
from haarloom.algebra.labels import Labels, Rows
from haarloom.algebra.loops import sum_of_monomials
from haarloom.algebra.weights import reflected, weight_system
from haarloom.exceptions import ClassFunctionError

__all__ = [
    "characters_in_contents_with",
    "characters_in_eigenvalues",
    "eigenvalue_symbols",
    "terms_from_eigenvalues",
]


@lru_cache(maxsize=8)
def eigenvalue_symbols(n: int) -> tuple[Symbol, ...]:
    """The symbols x_1 … x_N, the eigenvalues e^{iθ_j} of P.

    >>> eigenvalue_symbols(3)
    (x_1, x_2, x_3)
    """
    return tuple(Symbol(f"x_{j}") for j in range(1, n + 1))


def characters_in_contents_with(coefficients: Iterable[tuple[Labels, Expr]]) -> dict[Rows, Expr]:
    """Σ_r a_r χ_r as a combination of contents whose entries add up to the N-ality."""
    gathered: dict[Rows, list[Expr]] = {}
    for labels, coefficient in coefficients:
        for content, count in weight_system(labels).items():
            gathered.setdefault(_shifted(content), []).append(Integer(count) * coefficient)
    return {exponents: total(parts) for exponents, parts in gathered.items()}


def characters_in_eigenvalues(n: int, coefficients: Iterable[tuple[Labels, Expr]]) -> Expr:
    """Σ_r a_r χ_r as a symmetric Laurent polynomial in the eigenvalues."""
    return sum_of_monomials(eigenvalue_symbols(n), characters_in_contents_with(coefficients))


def terms_from_eigenvalues(expanded: Expr, n: int) -> dict[Labels, Expr]:
    """Character coefficients of an expanded symmetric Laurent polynomial in x_1 … x_N.

    Raises
    ------
    ClassFunctionError
        When it is not symmetric under permutations of the eigenvalues (modulo x_1 ⋯ x_N = 1).
    """
    terms = _collected(expanded, n)
    _check_symmetry(terms, n)
    found: dict[Labels, list[Expr]] = {}
    for content, value in terms.items():
        sign, ordered = reflected(tuple(c + n - 1 - i for i, c in enumerate(content)))
        if sign:
            labels = tuple(a - b - 1 for a, b in pairwise(ordered))
            found.setdefault(labels, []).append(value if sign > 0 else negated(value))
    return {labels: total(parts) for labels, parts in found.items()}


def _collected(expanded: Expr, n: int) -> dict[Rows, Expr]:
    """Monomials by exponents, shifted by a power of x_1 ⋯ x_N so that the smallest is 0."""
    place = {symbol: position for position, symbol in enumerate(eigenvalue_symbols(n))}
    gathered: dict[Rows, list[Expr]] = {}
    for term in Add.make_args(expanded):
        exponents, coefficient = [0] * n, S.One
        for factor in Mul.make_args(term):
            base, power = factor.as_base_exp()
            if base in place:
                exponents[place[base]] += int(power)
            else:
                coefficient *= factor
        gathered.setdefault(tuple(e - min(exponents) for e in exponents), []).append(coefficient)
    return {content: normal_form(total(parts)) for content, parts in gathered.items()}


def _check_symmetry(terms: dict[Rows, Expr], n: int) -> None:
    """Neighbouring transpositions generate all permutations."""
    for content, value in terms.items():
        for i in range(n - 1):
            swapped = (*content[:i], content[i + 1], content[i], *content[i + 2 :])
            if terms.get(swapped, S.Zero) != value:
                raise ClassFunctionError(
                    f"the expression changes when x_{i + 1} and x_{i + 2} are exchanged; "
                    f"a class function is symmetric in x_1 … x_{n}."
                )


def _shifted(content: Rows) -> Rows:
    columns = sum(content) // len(content)
    return tuple([exponent - columns for exponent in content])
