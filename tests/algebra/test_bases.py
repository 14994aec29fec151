"""The bases of class functions: each conversion round-trips, and all mean the same function."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
import sympy
from hypothesis import given

from algebra.strategies import class_functions
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.eigenphases import eigenphase_symbols
from haarloom.algebra.eigenvalues import eigenvalue_symbols
from haarloom.algebra.expressions import class_function_from
from haarloom.algebra.group import SU
from haarloom.algebra.loops import character_in_loops, loop_symbols
from haarloom.algebra.words import trace_word

BASES: dict[str, Callable[[ClassFunction], sympy.Expr]] = {
    "characters": ClassFunction.in_characters,
    "loops": ClassFunction.in_loops,
    "power sums": ClassFunction.in_power_sums,
    "eigenvalues": ClassFunction.in_eigenvalues,
    "eigenphases": ClassFunction.in_eigenphases,
}


@pytest.mark.parametrize("basis", BASES)
@given(f=class_functions())
def test_conversions_round_trip(basis: str, f: ClassFunction) -> None:
    assert class_function_from(BASES[basis](f), f.group) == f


@pytest.mark.parametrize("basis", BASES)
@pytest.mark.parametrize("n", range(2, 9))
def test_every_group_has_every_basis(basis: str, n: int) -> None:
    group = SU(n)
    f = group.adjoint.character() + sympy.Symbol("z") * group.loop**2 + sympy.I
    assert class_function_from(BASES[basis](f), group) == f


def substituted(expression: sympy.Expr, n: int, phases: np.ndarray) -> complex:
    """Value of an expression in any basis but the characters, by plain substitution."""
    x = np.exp(1j * phases)
    elementary = np.poly(x) * (-1.0) ** np.arange(n + 1)
    values = dict(zip(loop_symbols(n), elementary[1:], strict=False))
    values |= {trace_word(k): (x**k).sum() for k in range(1, n)}
    values |= dict(zip(eigenvalue_symbols(n), x, strict=True)) | dict(
        zip(eigenphase_symbols(n), phases, strict=True)
    )
    return complex(expression.subs(values))


@pytest.mark.parametrize("basis", [name for name in BASES if name != "characters"])
@pytest.mark.parametrize(
    ("n", "labels"),
    [(2, (5,)), (3, (3, 1)), (4, (1, 0, 1)), (4, (1, 1, 0)), (5, (0, 1, 0, 1)), (6, (0, 0, 1, 0, 0))],
)
def test_all_bases_have_the_values_of_the_character(
    basis: str, n: int, labels: tuple[int, ...], rng: np.random.Generator
) -> None:
    character = SU(n).irrep(labels).character()
    phases = rng.uniform(-3, 3, n)
    phases[-1] = -phases[:-1].sum()
    assert substituted(BASES[basis](character), n, phases) == pytest.approx(
        complex(character.at(phases)), abs=1e-9
    )


def test_su3_polynomials_known_by_heart() -> None:
    """Typed from memory; they follow from 3⊗3 = 6 + 3bar, 3⊗3bar = 1 + 8, 6⊗3 = 10 + 8."""
    L, M = loop_symbols(3)
    known = {"1": 1, "3": L, "3bar": M, "6": L**2 - M, "8": L * M - 1, "10": L**3 - 2 * L * M + 1}
    for name, polynomial in known.items():
        assert character_in_loops(SU(3).irrep(name).labels) == sympy.sympify(polynomial)


@pytest.mark.parametrize("spin", range(9))
def test_su2_characters_are_chebyshev_polynomials(spin: int) -> None:
    """χ_j(L) = U_{2j}(L/2), SymPy's polynomials as the referee."""
    (L,) = loop_symbols(2)
    assert SU(2).irrep(spin).character().in_loops() == sympy.expand(sympy.chebyshevu(spin, L / 2))


def test_exponents_in_the_eigenvalues_add_up_to_the_nality() -> None:
    for irrep in SU(4).irreps(2):
        expression = irrep.character().in_eigenvalues()
        for term in sympy.Add.make_args(expression):
            powers = term.as_powers_dict()
            assert sum(powers[x] for x in eigenvalue_symbols(4)) == irrep.nality


def test_real_characters_are_sums_of_cosines() -> None:
    theta = eigenphase_symbols(2)
    assert SU(2).adjoint.character().in_eigenphases() == 1 + 2 * sympy.cos(2 * theta[0])
    octet = SU(3).adjoint.character().in_eigenphases()
    assert not octet.has(sympy.exp, sympy.sin)
    odd = SU(3).loop - SU(3).loop.conjugate()
    assert not odd.in_eigenphases().has(sympy.exp, sympy.cos)
    assert class_function_from(odd.in_eigenphases(), SU(3)) == odd


def test_power_sums_are_traces_of_powers() -> None:
    for n in (3, 4):
        for k in range(1, n):
            trace = class_function_from(trace_word(k), SU(n))
            assert trace.in_power_sums() == trace_word(k)
