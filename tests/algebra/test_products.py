"""Tensor products: interchangeable algorithms, exact evaluation as a referee, sum rules as laws."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import pytest
from hypothesis import given
from hypothesis import strategies as st

from algebra.strategies import eigenvalues, groups, irreps_of, pairs, weyl_character
from haarloom.algebra import products
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import labels_up_to
from haarloom.algebra.tableaux import count_by_tableaux
from haarloom.exceptions import GroupError, SizeError

Algorithm = Callable[[tuple[int, ...], tuple[int, ...]], Mapping[tuple[int, ...], int]]
ALGORITHMS: dict[str, Algorithm] = {
    "the chosen one": products.multiply,
    "weight reflection": products.multiply_by_reflection,
    "tableaux": count_by_tableaux,
}


@pytest.mark.parametrize("name", ALGORITHMS)
@pytest.mark.parametrize(("n", "cutoff"), [(2, 5), (3, 3), (4, 2), (5, 2), (8, 1)])
def test_product_of_characters_at_rational_eigenvalues(name: str, n: int, cutoff: int) -> None:
    """χ_a χ_b = Σ N χ_c exactly, the characters from Weyl's determinants in rational arithmetic."""
    group, x = SU(n), eigenvalues(n, 1)
    value = {irrep.labels: weyl_character(irrep, x) for irrep in group.irreps(2 * cutoff)}
    basis = labels_up_to(n - 1, cutoff)
    for a in basis:
        for b in basis:
            found = ALGORITHMS[name](a, b)
            assert value[a] * value[b] == sum(count * value[c] for c, count in found.items())


@given(pairs())
def test_algorithms_agree(pair: tuple[Irrep, Irrep]) -> None:
    results = [dict(algorithm(pair[0].labels, pair[1].labels)) for algorithm in ALGORITHMS.values()]
    assert results[0] == results[1] == results[2]


@pytest.mark.parametrize("name", ALGORITHMS)
@pytest.mark.parametrize("n", range(2, 9))
def test_trivial_factor(name: str, n: int) -> None:
    group = SU(n)
    for irrep in group.irreps(1):
        assert dict(ALGORITHMS[name](irrep.labels, group.trivial.labels)) == {irrep.labels: 1}
        assert dict(ALGORITHMS[name](group.trivial.labels, irrep.labels)) == {irrep.labels: 1}


@given(pairs())
def test_sum_rules(pair: tuple[Irrep, Irrep]) -> None:
    """Dimensions multiply, indices add as d₁T₂ + d₂T₁, the N-ality adds."""
    a, b = pair
    product = a * b
    assert product.dimension == a.dimension * b.dimension
    indices = sum(count * irrep.index for irrep, count in product.items())
    assert indices == a.dimension * b.index + b.dimension * a.index
    assert {irrep.nality for irrep in product} == {(a.nality + b.nality) % a.group.n}


@given(pairs())
def test_cubic_sum_rule(pair: tuple[Irrep, Irrep]) -> None:
    """tr (X⊗1 + 1⊗X)³ = d₂ tr₁X³ + d₁ tr₂X³, since generators are traceless: so adds d·C₃."""
    a, b = pair
    total = sum(count * c.dimension * c.casimir(3) for c, count in (a * b).items())
    assert total == a.dimension * b.dimension * (a.casimir(3) + b.casimir(3))


@given(pairs())
def test_products_commute_and_conjugate(pair: tuple[Irrep, Irrep]) -> None:
    a, b = pair
    assert a * b == b * a
    assert a.conjugate * b.conjugate == {irrep.conjugate: count for irrep, count in (a * b).items()}


@given(st.data())
def test_products_associate(data: st.DataObject) -> None:
    group = data.draw(groups(largest=5))
    a, b, c = (data.draw(irreps_of(group, 2)) for _ in range(3))
    assert (a * b) * c == a * (b * c)


@given(st.data())
def test_multiplicities_are_symmetric_in_three_irreps(data: st.DataObject) -> None:
    """The number of singlets in a ⊗ b ⊗ c̄ is symmetric, so N_{ab}^c = N_{b c̄}^{ā}."""
    group = data.draw(groups(largest=5))
    a, b = (data.draw(irreps_of(group, 1)) for _ in range(2))
    for c, count in (a * b).items():
        assert (b * c.conjugate)[a.conjugate] == count


@given(pairs())
def test_the_trivial_irrep_occurs_only_with_the_conjugate(pair: tuple[Irrep, Irrep]) -> None:
    a, b = pair
    assert (a * b).get(a.group.trivial, 0) == int(b == a.conjugate)


def test_closed_form_multiplicity_of_su3() -> None:
    """Against the closed-form product for every triple with p + q ≤ 4."""
    basis = labels_up_to(2, 4)
    for a in basis:
        for b in basis:
            found = count_by_tableaux(a, b)
            for c in labels_up_to(2, 8):
                assert products.multiplicity(a, b, c) == found.get(c, 0)


def test_closed_form_of_su3_for_large_labels() -> None:
    a, b = (12, 7), (9, 11)
    found = products.multiply(a, b)
    assert dict(found) == products.multiply_by_reflection(a, b)
    assert all(products.multiplicity(a, b, c) == count for c, count in found.items())


def test_multiplicity_of_other_groups_reads_the_product() -> None:
    assert products.multiplicity((1, 0, 1), (1, 0, 1), (1, 0, 1)) == 2
    assert products.multiplicity((1,), (1,), (1,)) == 0


def test_results_are_read_only() -> None:
    with pytest.raises(TypeError):
        products.multiply((1, 0), (1, 0))[0, 0] = 5


@pytest.mark.parametrize("n", [2, 3, 4])
def test_fusion_tensor_is_the_matrix_of_a_character(n: int) -> None:
    basis = labels_up_to(n - 1, 3)
    for factor in labels_up_to(n - 1, 2):
        dense = {(row, column): count for row, column, count in products.fusion_tensor(basis, factor)}
        for row, r in enumerate(basis):
            for column, s in enumerate(basis):
                assert dense.get((row, column), 0) == count_by_tableaux(factor, s).get(r, 0)


def test_mixed_groups_are_refused() -> None:
    with pytest.raises(GroupError, match=r"SU\(4\)"):
        SU(3).fundamental * SU(4).fundamental
    with pytest.raises(GroupError, match=r"SU\(2\)"):
        (SU(3).fundamental * SU(3).fundamental) * SU(2).fundamental
    with pytest.raises(TypeError):
        SU(3).fundamental * 3


@pytest.mark.parametrize(
    "labels", [(3_000_000_000,), (100_000, 100_000), (40, 40, 40), (5, 5, 5, 5, 5, 5, 5)]
)
def test_a_product_beyond_reach_is_refused_before_it_is_tried(labels: tuple[int, ...]) -> None:
    irrep = SU(len(labels) + 1).irrep(*labels)
    with pytest.raises(SizeError, match=r"\d,\d{3},\d{3}"):
        irrep * irrep


def test_one_multiplicity_of_very_large_irreps_is_still_within_reach() -> None:
    large = (10**6, 10**6)
    assert products.multiplicity(large, large, (0, 0)) == 1
    assert products.multiplicity(large, large, large) == 10**6 + 1
