"""Class functions: the ring, conjugation, Haar integrals, matrices, values."""

from __future__ import annotations

import pickle
from fractions import Fraction
from typing import Any

import numpy as np
import pytest
import sympy
from hypothesis import given
from hypothesis import strategies as st
from sympy.abc import t, y, z

from algebra.strategies import class_functions, class_functions_of, groups
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.exceptions import ClassFunctionError, GroupError, MissingValueError, ParameterError

G = SU(3)
L, LBAR = G.loop, G.loop.conjugate()


@given(st.data())
def test_ring_laws(data: st.DataObject) -> None:
    group = data.draw(groups(largest=5))
    f, g, h = (data.draw(class_functions_of(group)) for _ in range(3))
    assert f + g == g + f
    assert f * g == g * f
    assert (f + g) + h == f + (g + h)
    assert (f * g) * h == f * (g * h)
    assert f * (g + h) == f * g + f * h
    assert f - f == ClassFunction(group, {})
    assert f * 1 == f + 0 == f
    assert not f * 0
    assert f**3 == f * f * f


@given(class_functions())
def test_equal_values_hash_and_pickle_equal(f: ClassFunction) -> None:
    twin = (2 * f + 1 - f) - 1
    assert twin == f
    assert hash(twin) == hash(f)
    assert pickle.loads(pickle.dumps(f)) == f


@given(class_functions())
def test_conjugation_is_an_involution_and_multiplicative(f: ClassFunction) -> None:
    assert f.conjugate(real=True).conjugate(real=True) == f
    assert f.conjugate().conjugate() == f
    assert (f * f).conjugate(real=True) == f.conjugate(real=True) ** 2


def test_coefficients_are_conjugated_too() -> None:
    assert (sympy.I * z * L).conjugate() == -sympy.I * sympy.conjugate(z) * LBAR
    assert (sympy.I * z * L).conjugate(real=True) == -sympy.I * z * LBAR
    assert ((1 + 2 * sympy.I) * L).inner(L) == 1 - 2 * sympy.I


@given(st.data())
def test_inner_product_is_the_haar_integral_of_the_product(data: st.DataObject) -> None:
    group = data.draw(groups(largest=4))
    f, g = data.draw(class_functions_of(group)), data.draw(class_functions_of(group))
    assert f.inner(g, real=True) == (f.conjugate(real=True) * g).haar()


@pytest.mark.parametrize("n", [2, 3, 4, 5])
def test_characters_are_orthonormal(n: int) -> None:
    basis = SU(n).irreps(2)
    for r in basis:
        for s in basis:
            assert r.character().inner(s.character()) == int(r == s)
            assert (r.character().conjugate() * s.character()).haar() == int(r == s)


@given(class_functions(largest=4))
def test_matrix_of_multiplication(f: ClassFunction) -> None:
    """Column s of the matrix holds the coefficients of f·χ_s."""
    basis = f.group.irreps(2)
    matrix = f.matrix(basis)
    for column, s in enumerate(basis):
        product = f * s.character()
        assert [matrix[row, column] for row in range(len(basis))] == [product[r] for r in basis]


@given(class_functions())
def test_sectors_add_up(f: ClassFunction) -> None:
    n = f.group.n
    sectors = [f.sector(k) for k in range(n)]
    assert sum(sectors, ClassFunction(f.group, {})) == f
    assert all(irrep.nality == k for k, sector in enumerate(sectors) for irrep in sector)


def test_coefficients_in_every_spelling() -> None:
    spelled = ClassFunction(
        G, {"1": 1, (1, 0): Fraction(1, 2), G.adjoint: "z", "6": 0.25, "6bar": np.int64(3)}
    )
    assert spelled.coefficients == {
        G.trivial: 1,
        G.fundamental: sympy.Rational(1, 2),
        G.irrep("6"): sympy.Rational(1, 4),
        G.adjoint: z,
        G.irrep("6bar"): 3,
    }
    assert spelled["8"] == spelled[1, 1] == z
    assert spelled["27"] == 0
    assert ClassFunction(G, {"3": 1, (1, 0): 2})["3"] == 3


def test_vanishing_coefficients_are_dropped() -> None:
    assert ClassFunction(G, {"3": (1 + z) ** 2 - 1 - 2 * z - z**2, "8": 0}) == ClassFunction(G, {})
    assert ClassFunction(G, {"3": 1 / (1 + z) + z / (1 + z) - 1}) == ClassFunction(G, {})
    assert len(L - L) == 0
    assert not L * 0


@pytest.mark.parametrize(
    ("left", "right"),
    [
        ((1 + z) ** 2, 1 + 2 * z + z**2),
        (sympy.exp(y + z), sympy.exp(y) * sympy.exp(z)),
        ((z**2 - 1) / (z - 1), z + 1),
        (z / (z**2 + z), 1 / (z + 1)),
        (1 / (1 + z) + 1, (2 + z) / (1 + z)),
        (sympy.sqrt(2) ** 2, 2),
    ],
)
def test_equal_coefficients_have_one_form(left: Any, right: Any) -> None:
    one, other = ClassFunction(G, {"3": left}), ClassFunction(G, {"3": right})
    assert one == other
    assert hash(one) == hash(other)


def test_relations_between_coefficients_are_kept_in_products() -> None:
    wave = ClassFunction(G, {"1": sympy.exp(-t * sympy.Rational(4, 3)), "3": sympy.I, "8": sympy.sqrt(2)})
    inverse = ClassFunction(G, {"1": sympy.exp(t * sympy.Rational(4, 3))})
    assert (wave * inverse)["1"] == 1
    assert (wave * wave)["6"] == -1
    assert (wave * wave)["27"] == 2


def test_floating_point_coefficients_stay_floating_point() -> None:
    inexact = ClassFunction(G, {"3": sympy.Float("0.3")})
    assert (inexact * L)["6"] == sympy.Float("0.3")
    assert (0.3 * L)["3"] == sympy.Rational(3, 10)


def test_operands_in_both_orders() -> None:
    for scalar in (2, z, sympy.I, Fraction(1, 3), 0.5):
        assert scalar * L == L * scalar
        assert scalar + L == L + scalar
        assert scalar - L == -(L - scalar)
    assert (L / 2)["3"] == sympy.Rational(1, 2)
    assert (L / (1 + z) * (1 + z)) == L


@pytest.mark.parametrize("operand", ["z", None, [1], True, float("nan"), float("inf"), G])
def test_foreign_operands_are_refused(operand: Any) -> None:
    with pytest.raises(TypeError):
        L + operand
    if not isinstance(operand, (str, list)):
        with pytest.raises(TypeError):
            operand * L
    with pytest.raises((TypeError, ClassFunctionError)):
        L.inner(operand)


@pytest.mark.parametrize(
    "value", ["1+z", "z z", True, None, [1], float("nan"), sympy.oo, sympy.zoo, sympy.nan]
)
def test_bad_coefficients(value: Any) -> None:
    with pytest.raises(ClassFunctionError, match="coefficient"):
        ClassFunction(G, {"3": value})


def test_mixed_groups() -> None:
    with pytest.raises(GroupError, match=r"SU\(2\)"):
        L + SU(2).loop
    with pytest.raises(GroupError):
        L * SU(4).loop
    with pytest.raises(GroupError):
        L.inner(SU(4).loop)
    with pytest.raises(GroupError):
        L.matrix(SU(2).irreps(1))
    assert SU(4).loop != L


def test_division_and_powers_are_limited() -> None:
    with pytest.raises(ParameterError, match="by 0"):
        L / 0
    with pytest.raises(ParameterError, match="by 0"):
        L / ((1 + z) ** 2 - 1 - 2 * z - z**2)
    with pytest.raises(TypeError):
        L / L
    for power in (-1, 0.5, True):
        with pytest.raises(ParameterError, match="power"):
            L**power
    assert ClassFunction(G, {"1": 1}) == L**0


def test_substitution_and_derivatives() -> None:
    f = 1 + z * L + z**2 * y * LBAR
    assert f.subs(z, 2) == 1 + 2 * L + 4 * y * LBAR
    assert f.subs({z: y}) == 1 + y * L + y**3 * LBAR
    assert f.subs(z, 0) == ClassFunction(G, {"1": 1})
    assert f.diff(z) == L + 2 * z * y * LBAR
    assert f.diff(z, 2) == 2 * y * LBAR
    assert f.parameters == (y, z)
    assert f.free_symbols == {y, z}


def test_values_on_arrays_of_angles() -> None:
    f = 1 + z * L + y * G.adjoint.character()
    angles = np.linspace(0, 1, 24).reshape(3, 4, 2)
    values = f.at(angles, z=0.5, y=2)
    assert values.shape == (3, 4)
    x = np.exp(1j * np.concatenate([angles, -angles.sum(axis=-1, keepdims=True)], axis=-1))
    loop = x.sum(axis=-1)
    np.testing.assert_allclose(values, 1 + 0.5 * loop + 2 * (abs(loop) ** 2 - 1), atol=1e-13)


def test_arrays_of_values_broadcast_against_the_angles() -> None:
    f = 1 + z * L
    angles = np.zeros((5, 2))
    assert f.at(angles, z=np.arange(5)).shape == (5,)
    assert f.at(angles, z=np.arange(3)[:, None]).shape == (3, 5)
    np.testing.assert_allclose(f.at(angles, z=np.arange(5)), 1 + 3 * np.arange(5))


def test_a_function_without_terms_has_values() -> None:
    np.testing.assert_array_equal(ClassFunction(G, {}).at(np.zeros((2, 7, 2))), np.zeros((2, 7)))


def test_missing_values_are_named() -> None:
    with pytest.raises(MissingValueError, match="y, z"):
        (y * L + z).at([0.1, 0.2])
    assert np.isfinite((y * L).at([0.1, 0.2], y=1, unused=3))


def test_it_cannot_be_changed() -> None:
    with pytest.raises(AttributeError, match="frozen"):
        L.group = SU(2)
    with pytest.raises(TypeError):
        L["3"] = 2
    copy = L.coefficients
    copy.clear()
    assert len(L) == 1


def test_faces() -> None:
    f = 1 + z * L - LBAR + (1 + y) * G.adjoint.character()
    assert f.latex() == (
        r"1 + z \chi_{\mathbf{3}} - \chi_{\overline{\mathbf{3}}} + \left(y + 1\right) \chi_{\mathbf{8}}"
    )
    assert f._repr_latex_().startswith("$1 + z")
    assert ClassFunction(G, {}).latex() == "0"
    long = ClassFunction(G, dict.fromkeys(G.irreps(9), (1 + z) ** 60))
    assert long._repr_latex_().endswith(r"+ \cdots$")
    assert r"\ldots" in long._repr_latex_()
    assert "<61 terms>" in repr(long)
    assert len(long._repr_latex_()) < len(long.latex()) / 1.5
    assert repr(L) == "ClassFunction(SU(3), {(1, 0): 1})"
    assert repr(G.loop**6).endswith("…})")
