"""Sums of irreps as values."""

from __future__ import annotations

import pickle

import pytest
from hypothesis import given

from algebra.strategies import irreps, pairs
from haarloom.algebra.decomposition import Decomposition, product_of
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep

G = SU(3)


@given(pairs())
def test_equal_values_hash_and_pickle_equal(pair: tuple[Irrep, Irrep]) -> None:
    one, other = pair[0] * pair[1], pair[1] * pair[0]
    assert hash(one) == hash(other)
    assert pickle.loads(pickle.dumps(one)) == one
    assert pickle.loads(pickle.dumps(one)).factors == one.factors


@given(pairs(largest=5))
def test_character_of_a_product_is_the_product_of_characters(pair: tuple[Irrep, Irrep]) -> None:
    assert (pair[0] * pair[1]).character() == pair[0].character() * pair[1].character()


def test_it_is_a_mapping_in_basis_order() -> None:
    product = G.adjoint * G.adjoint
    assert dict(product) == {
        G.irrep(name): count
        for name, count in zip(("1", "8", "10", "10bar", "27"), (1, 2, 1, 1, 1), strict=True)
    }
    assert list(product) == sorted(product)
    assert product.get(G.fundamental, 0) == 0
    assert len(product) == 5


def test_faces() -> None:
    product = G.fundamental * G.adjoint
    assert str(product) == "3 + 6bar + 15"
    assert str(G.adjoint * G.adjoint) == "1 + 2·8 + 10 + 10bar + 27"
    assert product.latex() == r"\mathbf{3} \oplus \overline{\mathbf{6}} \oplus \mathbf{15}"
    assert r"2\,\mathbf{8}" in (G.adjoint * G.adjoint)._repr_latex_()
    assert repr(G.adjoint * G.adjoint).endswith("…})")
    assert str(Decomposition(G, {})) == "0"
    long = (G.irrep(9, 9) * G.irrep(9, 9))._repr_latex_()
    assert long.endswith(r"\oplus \cdots$")
    assert len(long) < 3000


def test_it_cannot_be_changed() -> None:
    with pytest.raises(AttributeError, match="frozen"):
        (G.adjoint * G.adjoint).group = SU(2)
    with pytest.raises(TypeError):
        (G.adjoint * G.adjoint)[G.adjoint] = 3


def test_sums_and_products_of_sums() -> None:
    quarks = G.fundamental * G.antifundamental
    assert quarks + G.trivial * G.trivial == Decomposition(G, {(0, 0): 2, (1, 1): 1})
    assert (
        quarks * G.adjoint
        == G.adjoint * quarks
        == Decomposition(G, {(0, 0): 1, (1, 1): 3, (3, 0): 1, (0, 3): 1, (2, 2): 1})
    )
    assert (quarks * quarks).dimension == 81
    with pytest.raises(TypeError):
        quarks + 1
    with pytest.raises(TypeError):
        quarks * "8"


@given(irreps(largest=4))
def test_product_of_nothing_is_trivial(irrep: Irrep) -> None:
    group = irrep.group
    assert product_of(group, ()) == {group.trivial: 1}
    assert product_of(group, (irrep,)) == {irrep: 1}
