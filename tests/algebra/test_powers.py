"""Tensor, symmetric, antisymmetric and Schur-functor powers."""

from __future__ import annotations

from math import comb

import pytest
from hypothesis import given
from hypothesis import strategies as st

from algebra.strategies import eigenvalues, irreps, weyl_character
from haarloom.algebra.decomposition import Decomposition
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.powers import adams, antisymmetric, symmetric
from haarloom.algebra.young_diagrams import YoungDiagram
from haarloom.exceptions import LabelError, ParameterError, SizeError

SMALL = irreps(largest=5).filter(lambda irrep: irrep.dimension <= 30)


@given(SMALL, st.integers(0, 4))
def test_dimensions_of_powers(irrep: Irrep, n: int) -> None:
    d = irrep.dimension
    assert irrep.symmetric_power(n).dimension == comb(d + n - 1, n)
    assert irrep.antisymmetric_power(n).dimension == comb(d, n)
    assert irrep.power(n).dimension == d**n


@given(SMALL)
def test_square_splits_into_symmetric_and_antisymmetric(irrep: Irrep) -> None:
    assert irrep.symmetric_power(2) + irrep.antisymmetric_power(2) == irrep * irrep


@given(SMALL)
def test_cube_splits_by_the_characters_of_three_objects(irrep: Irrep) -> None:
    mixed = irrep.schur_power(2, 1)
    assert irrep.symmetric_power(3) + irrep.antisymmetric_power(3) + mixed + mixed == irrep.power(3)


@given(SMALL, st.sampled_from([(1,), (2,), (1, 1), (2, 1), (3, 1), (2, 2), (2, 1, 1)]))
def test_schur_powers_have_the_hook_content_dimension(irrep: Irrep, rows: tuple[int, ...]) -> None:
    assert irrep.schur_power(*rows).dimension == YoungDiagram.of(*rows).dimension(irrep.dimension)


@given(st.sampled_from([(2,), (1, 1), (2, 1), (3, 1), (2, 2), (2, 1, 1), (4, 2)]), st.integers(2, 6))
def test_schur_powers_of_the_fundamental_are_irreps(rows: tuple[int, ...], n: int) -> None:
    power = SU(n).fundamental.schur_power(*rows)
    expected = {} if len(rows) > n else {YoungDiagram.of(*rows).irrep(SU(n)): 1}
    assert power == expected


@given(SMALL, st.integers(1, 4))
def test_adams_operation_raises_the_eigenvalues(irrep: Irrep, k: int) -> None:
    x = eigenvalues(irrep.group.n, 1)
    raised = weyl_character(irrep, tuple(value**k for value in x))
    found = adams(irrep.labels, k)
    assert raised == sum(
        count * weyl_character(irrep.group.irrep(labels), x) for labels, count in found.items()
    )


@given(SMALL)
def test_newton_identities_join_symmetric_and_antisymmetric_powers(irrep: Irrep) -> None:
    """Σ_k (−1)^k Λ^k ⊗ S^{n−k} = 0 for n = 3: the two generating functions are inverse to each other."""
    plus, minus = Decomposition(irrep.group, {}), Decomposition(irrep.group, {})
    for k in range(4):
        term = irrep.antisymmetric_power(k) * irrep.symmetric_power(3 - k)
        plus, minus = (plus + term, minus) if k % 2 == 0 else (plus, minus + term)
    assert plus == minus


@pytest.mark.parametrize("name", ["3", "6", "8"])
def test_antisymmetric_powers_mirror_at_half_the_dimension(name: str) -> None:
    irrep = SU(3).irrep(name)
    d = irrep.dimension
    for k in range(d + 1):
        mirrored = {other.conjugate: count for other, count in irrep.antisymmetric_power(d - k).items()}
        assert irrep.antisymmetric_power(k) == mirrored
    assert irrep.antisymmetric_power(d) == {SU(3).trivial: 1}
    assert irrep.antisymmetric_power(d + 1) == {}


@pytest.mark.parametrize("copies", [0, 1, 2, 3])
def test_copies_multiply_the_generating_functions(copies: int) -> None:
    """det^{copies} degree by degree, against products of one copy."""
    group = SU(3)
    for single, many in ((antisymmetric, antisymmetric), (symmetric, symmetric)):
        expected = [Decomposition(group, {(0, 0): 1})] + [Decomposition(group, {})] * 5
        for _ in range(copies):
            grown = [Decomposition(group, {})] * 6
            for k in range(6):
                for j in range(6 - k):
                    factor = Decomposition(group, dict(single((2, 0), 1, j)))
                    grown[k + j] = grown[k + j] + expected[k] * factor
            expected = grown
        assert [Decomposition(group, dict(many((2, 0), copies, k))) for k in range(6)] == expected


def test_trivial_powers() -> None:
    octet = SU(3).adjoint
    assert octet.power(0) == octet.symmetric_power(0) == octet.antisymmetric_power(0) == {SU(3).trivial: 1}
    assert octet.schur_power() == {SU(3).trivial: 1}
    assert octet.power(1) == octet.schur_power(1) == {octet: 1}


@pytest.mark.parametrize("n", [-1, 1.0, True, "2", None])
def test_powers_are_natural_numbers(n: object) -> None:
    for power in (SU(3).adjoint.power, SU(3).adjoint.symmetric_power, SU(3).adjoint.antisymmetric_power):
        with pytest.raises(ParameterError, match="power"):
            power(n)


def test_shapes_are_checked() -> None:
    with pytest.raises(LabelError, match="never grow"):
        SU(3).adjoint.schur_power(1, 2)


def test_a_power_beyond_reach_is_refused() -> None:
    with pytest.raises(SizeError, match="10000"):
        SU(3).adjoint.symmetric_power(10_000)
