"""Trade names, both ways."""

from __future__ import annotations

import pytest
from hypothesis import given

from algebra.strategies import irreps
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import LabelError, UnknownNameError


@given(irreps())
def test_a_name_leads_back_to_its_irrep(irrep: Irrep) -> None:
    assert irrep.group.irrep(irrep.name) is not None
    assert irrep.group.irrep(irrep.name) == irrep


@pytest.mark.parametrize(("n", "cutoff"), [(2, 30), (3, 14), (4, 6), (5, 5), (6, 4), (7, 3), (8, 3)])
def test_names_are_different(n: int, cutoff: int) -> None:
    names = [irrep.name for irrep in SU(n).irreps(cutoff)]
    assert len(set(names)) == len(names)


def test_names_of_su3_in_everyday_use() -> None:
    names = "1 3 3bar 6 8 6bar 10 15 15bar 10bar 15' 24 27 24bar 15'bar"
    assert [irrep.name for irrep in SU(3).irreps(4)] == names.split()


def test_names_of_su2_are_spins() -> None:
    assert [irrep.name for irrep in SU(2).irreps(3)] == ["j=0", "j=1/2", "j=1", "j=3/2"]
    assert SU(2).irrep("3/2") == SU(2).irrep("4") == SU(2).irrep(3)


@pytest.mark.parametrize(
    ("n", "name", "labels"),
    [
        (5, "10", (0, 1, 0, 0)),
        (5, "45", (0, 1, 0, 1)),  # in 5bar ⊗ 10, common practice in grand unification
        (4, "20''", (0, 0, 3)),
        (4, "6", (0, 1, 0)),
        (3, "(2,1)", (2, 1)),
        (3, " ( 2 , 1 ) ", (2, 1)),
        (2, "(3)", (3,)),
    ],
)
def test_names_of_other_groups(n: int, name: str, labels: tuple[int, ...]) -> None:
    assert SU(n).irrep(name).labels == labels


def test_a_very_large_irrep_is_called_by_its_labels() -> None:
    large = SU(3).irrep(80, 70)
    assert large.name == "(80,70)"
    assert SU(3).irrep(large.name) == large


@pytest.mark.parametrize("name", ["9", "8bar", "3'", "10'", "", "bar", "3barbar", "three", "27''", "0", "١"])
def test_unknown_names_suggest_near_ones(name: str) -> None:
    with pytest.raises(UnknownNameError, match="Near names: ") as caught:
        SU(3).irrep(name)
    near = str(caught.value).split("Near names: ")[1].split(". Labels")[0].split(", ")
    assert all(SU(3).irrep(other).name == other for other in near)


def test_a_slip_of_the_finger_finds_the_name() -> None:
    with pytest.raises(UnknownNameError, match=r"10bar"):
        SU(3).irrep("10ba")


@pytest.mark.parametrize("name", ["j=2/2", "j=", "2bar", "j=-1"])
def test_unknown_spins(name: str) -> None:
    with pytest.raises(UnknownNameError):
        SU(2).irrep(name)


def test_labels_in_a_name_are_checked() -> None:
    with pytest.raises(LabelError, match="takes 2"):
        SU(3).irrep("(1,2,3)")


def test_faces() -> None:
    irrep = SU(3).irrep("15'bar")
    assert irrep.latex() == r"\overline{\mathbf{15}}'"
    assert irrep._repr_latex_() == r"$\overline{\mathbf{15}}'$"
    assert "overline" in irrep.html()
    assert "15" in irrep.html()
    assert SU(2).irrep(1).latex() == r"j=\tfrac{1}{2}"
    assert SU(2).irrep(1).html() == "<i>j=1/2</i>"
