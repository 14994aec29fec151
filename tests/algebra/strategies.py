"""Random irreps, products and class functions for the laws of the exact layer, and two slow referees."""

from __future__ import annotations

from fractions import Fraction
from math import prod

from flint import fmpq, fmpq_mat
from hypothesis import strategies as st
from sympy import Integer, Rational, Symbol

from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep

LARGEST_SUM = {2: 12, 3: 7, 4: 4, 5: 3, 6: 3, 7: 2, 8: 2}


@st.composite
def groups(draw: st.DrawFn, largest: int = 8) -> SU:
    return SU(draw(st.integers(2, largest)))


@st.composite
def irreps_of(draw: st.DrawFn, group: SU, smaller_by: int = 0) -> Irrep:
    cutoff = max(1, LARGEST_SUM[group.n] - smaller_by)
    return draw(st.sampled_from(group.irreps(cutoff)))


@st.composite
def irreps(draw: st.DrawFn, largest: int = 8) -> Irrep:
    return draw(irreps_of(draw(groups(largest))))


@st.composite
def pairs(draw: st.DrawFn, largest: int = 8) -> tuple[Irrep, Irrep]:
    group = draw(groups(largest))
    return draw(irreps_of(group)), draw(irreps_of(group, 1))


Z, Y = Symbol("z"), Symbol("y")


@st.composite
def class_functions_of(draw: st.DrawFn, group: SU) -> ClassFunction:
    cutoff = {2: 4, 3: 3, 4: 2}.get(group.n, 1)
    coefficients = st.sampled_from(
        [Integer(1), Integer(-2), Rational(1, 3), Z, 1 + Z, Y * Z - 2, Z**2 / 5, (Y + Z) ** 2]
    )
    return ClassFunction(
        group, draw(st.dictionaries(st.sampled_from(group.irreps(cutoff)), coefficients, max_size=4))
    )


@st.composite
def class_functions(draw: st.DrawFn, largest: int = 5) -> ClassFunction:
    return draw(class_functions_of(draw(groups(largest))))


def eigenvalues(n: int, seed: int) -> tuple[Fraction, ...]:
    """Distinct rational eigenvalues whose product is 1; ``seed`` moves their signs."""
    first = [
        Fraction(prime * (-1) ** (seed * j)) for j, prime in enumerate((2, 3, 5, 7, 11, 13, 17)[: n - 1])
    ]
    return (*first, 1 / prod(first, start=Fraction(1)))


def weyl_character(irrep: Irrep, x: tuple[Fraction, ...]) -> Fraction:
    """Exact character at rational eigenvalues as a quotient of Weyl's determinants, taken by python-flint."""
    n = len(x)
    staircase = [n - 1 - j for j in range(n)]
    shifted = [row + step for row, step in zip(irrep.partition, staircase, strict=True)]
    ratio = _determinant(x, shifted) / _determinant(x, staircase)
    return Fraction(int(ratio.p), int(ratio.q))


def _determinant(x: tuple[Fraction, ...], powers: list[int]) -> fmpq:
    entries = [[value**power for power in powers] for value in x]
    return fmpq_mat([[fmpq(e.numerator, e.denominator) for e in row] for row in entries]).det()
