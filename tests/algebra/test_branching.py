"""Restriction to SU(N−1) × U(1) and to the centre."""

from __future__ import annotations

import pytest
from hypothesis import given

from algebra.strategies import irreps, pairs
from haarloom.algebra.branching import centre_content
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import rows_from_labels
from haarloom.exceptions import GroupError

LARGER = irreps().filter(lambda irrep: irrep.group.n > 2)


@given(LARGER)
def test_dimensions_add_up_and_the_charge_is_traceless(irrep: Irrep) -> None:
    branches = irrep.branches()
    assert sum(branch.irrep.dimension for branch in branches) == irrep.dimension
    assert sum(branch.irrep.dimension * branch.charge for branch in branches) == 0
    assert len(set(branches)) == len(branches)


@given(LARGER)
def test_weights_and_charges_are_those_of_the_irrep(irrep: Irrep) -> None:
    """Every state keeps its first N−2 Dynkin labels and its charge Σ_{i<N} c_i − (N−1)c_N."""
    n = irrep.group.n
    whole: dict[tuple[tuple[int, ...], int], int] = {}
    for weight, count in irrep.weights().items():
        charge = sum(i * m for i, m in enumerate(weight, start=1))
        key = (weight[:-1], charge)
        whole[key] = whole.get(key, 0) + count
    parts: dict[tuple[tuple[int, ...], int], int] = {}
    for branch in irrep.branches():
        for weight, count in branch.irrep.weights().items():
            key = (weight, branch.charge)
            parts[key] = parts.get(key, 0) + count
    assert parts == whole
    assert rows_from_labels(irrep.labels)[-1] == 0
    assert n > 2


def test_octet_under_isospin_and_hypercharge() -> None:
    found = [(branch.irrep.name, branch.charge) for branch in SU(3).adjoint.branches()]
    assert found == [("j=1/2", 3), ("j=0", 0), ("j=1", 0), ("j=1/2", -3)]
    assert SU(3).fundamental.branches()[0].latex() == r"j=\tfrac{1}{2}_{1}"


def test_su2_has_no_such_subgroup() -> None:
    with pytest.raises(GroupError, match="weights"):
        SU(2).fundamental.branches()


@given(pairs(largest=5))
def test_a_product_lives_in_one_sector(pair: tuple[Irrep, Irrep]) -> None:
    a, b = pair
    assert centre_content(a * b) == {(a.nality + b.nality) % a.group.n: a.dimension * b.dimension}


def test_sectors_of_a_sum() -> None:
    group = SU(3)
    assert centre_content(group.fundamental) == {1: 3}
    assert centre_content(group.fundamental * group.adjoint + group.adjoint * group.adjoint) == {0: 64, 1: 24}
