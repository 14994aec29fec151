"""The group and its irreps as values."""

from __future__ import annotations

import copy
import pickle
from typing import Any

import pytest

from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import GroupError, LabelError, ParameterError


def test_there_is_one_group_for_each_n() -> None:
    assert SU(3) is SU(3)
    assert SU(3) is not SU(4)
    assert copy.deepcopy(SU(3)) is SU(3)
    assert pickle.loads(pickle.dumps(SU(3))) is SU(3)


@pytest.mark.parametrize("n", [1, 9, 0, -3, 2.0, "3", True, None])
def test_n_out_of_range(n: Any) -> None:
    with pytest.raises(GroupError, match="2"):
        SU(n)


def test_a_group_cannot_be_changed() -> None:
    with pytest.raises(AttributeError, match="constant"):
        SU(3).n = 4


def test_equal_irreps_hash_and_pickle_equal() -> None:
    one, other = SU(3).irrep(2, 1), SU(3).irrep("15")
    assert one == other
    assert hash(one) == hash(other)
    assert pickle.loads(pickle.dumps(one)) == other
    assert pickle.dumps(one) == pickle.dumps(other)
    assert len({one, other}) == 1


def test_irreps_of_different_groups_differ() -> None:
    assert SU(3).irrep(1, 0) != SU(4).irrep(1, 0, 0)
    assert SU(2).irrep(1) != (1,)


def test_an_irrep_is_frozen() -> None:
    with pytest.raises(AttributeError):
        SU(3).fundamental.labels = (0, 1)


def test_representations_are_cheap_and_rebuild_the_value() -> None:
    irrep = SU(3).irrep(2, 1)
    assert repr(irrep) == "SU(3).irrep(2, 1)"
    assert eval(repr(irrep), {"SU": SU}) == irrep
    assert str(irrep) == "15"


def test_ways_to_say_an_irrep() -> None:
    group = SU(3)
    assert (
        group.irrep(1, 1) == group.irrep("8") == group.irrep((1, 1)) == group.irrep([1, 1]) == group.adjoint
    )
    assert group.irrep(group.adjoint) is group.adjoint or group.irrep(group.adjoint) == group.adjoint


def test_special_irreps() -> None:
    for n in range(2, 9):
        group = SU(n)
        assert group.trivial.dimension == 1
        assert group.antifundamental == group.fundamental.conjugate
        assert group.adjoint in group.fundamental * group.antifundamental
    assert SU(2).antifundamental == SU(2).fundamental
    assert SU(2).adjoint.labels == (2,)


def test_an_irrep_of_another_group_is_refused() -> None:
    with pytest.raises(GroupError, match=r"SU\(4\)"):
        SU(3).irrep(SU(4).fundamental)


@pytest.mark.parametrize("labels", [(), (1,), (None, 1), (1, -1), (True, 0), (1.0, 0), (b"8",)])
def test_bad_labels(labels: tuple[Any, ...]) -> None:
    with pytest.raises(LabelError):
        SU(3).irrep(*labels)


def test_irreps_up_to_a_cutoff() -> None:
    assert [irrep.labels for irrep in SU(3).irreps(1)] == [(0, 0), (1, 0), (0, 1)]
    assert SU(3).count_irreps(8) == len(SU(3).irreps(8)) == 45
    with pytest.raises(ParameterError):
        SU(3).irreps(-1)


def test_sorting_follows_the_basis_order() -> None:
    basis = SU(4).irreps(3)
    shuffled = dict.fromkeys(basis[::-1])
    assert tuple(sorted(shuffled)) == basis
    with pytest.raises(TypeError):
        sorted([SU(3).trivial, 3])


def test_reality() -> None:
    assert SU(3).adjoint.is_real
    assert not SU(3).fundamental.is_real
    assert all(isinstance(irrep, Irrep) and irrep.is_real for irrep in SU(2).irreps(5))
