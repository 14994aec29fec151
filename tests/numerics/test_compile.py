"""The compiled transfer matrix against the symbolic one, and what it refuses."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
import sympy

import haarloom as hl
from haarloom.exceptions import MissingValueError, ParameterError, SizeError
from haarloom.numerics.compile import compile_transfer
from haarloom.ring.model import RingModel


@pytest.mark.parametrize("n", [2, 3, 4])
def test_numbers_are_those_of_the_symbols(n: int) -> None:
    group = hl.SU(n)
    model = RingModel(hl.heat_kernel(group, "t"), hl.static_fermions(group, "z", "zb"))
    exact = model.transfer_matrix(2).matrix.subs({"t": sympy.Rational(7, 10), "z": sympy.Rational(2, 5), "zb": 0.1})
    numbers = compile_transfer(model, 2)(t=0.7, z=0.4, zb=0.1)
    np.testing.assert_allclose(numbers, np.array(exact.evalf(20).tolist(), dtype=float), rtol=1e-13, atol=1e-16)


def test_arrays_broadcast_and_dtype_follows(ember: RingModel) -> None:
    compiled = compile_transfer(ember, 3)
    grid = compiled(t=np.array([0.5, 1.0])[:, None], z=np.linspace(0, 1, 4))
    assert grid.shape == (2, 4, 10, 10)
    assert grid.dtype == np.float64
    np.testing.assert_array_equal(grid[1, 2], compiled(t=1.0, z=np.linspace(0, 1, 4)[2]))
    assert compiled(t=1, z=0.3j).dtype == np.complex128
    assert compiled(t=Fraction(1, 2), z=sympy.Rational(1, 3)).shape == (10, 10)


def test_negative_link_coefficients_have_imaginary_roots() -> None:
    group = hl.SU(2)
    link = hl.link_from_coefficients(group, {(0,): 1, (1,): -0.3, (2,): 0.1})
    model = RingModel(link, hl.static_fermions(group, "z"))
    compiled = compile_transfer(model, 2)
    matrix = compiled(z=0.4)
    assert matrix.dtype == np.complex128
    # similar to K W
    values = np.linalg.eigvals(compiled.unsymmetric(z=0.4))
    np.testing.assert_allclose(np.sort_complex(np.linalg.eigvals(matrix)), np.sort_complex(values), atol=1e-14)


@pytest.mark.parametrize(
    ("values", "error", "match"),
    [
        ({"t": 1}, MissingValueError, "no value for z"),
        ({"t": 1, "z": 0.3, "zz": 1}, ParameterError, "did you mean z"),
        ({"t": 1, "z": float("nan")}, ParameterError, "not finite"),
        ({"t": 1, "z": "three"}, ParameterError, "no number"),
        ({"t": -1, "z": 0.3}, ParameterError, "t"),
        ({"t": [1, 2], "z": [1, 2, 3]}, ParameterError, "broadcast"),
    ],
)
def test_bad_values_are_named(ember: RingModel, values: dict[str, object], error: type, match: str) -> None:
    with pytest.raises(error, match=match):
        compile_transfer(ember, 2)(**values)


def test_size_comes_first(ember: RingModel) -> None:
    with pytest.raises(SizeError, match=r"^[\d,.]+ GB for .* irreps|^[\d,.]+ GB for"):
        compile_transfer(ember, 2000)
    with pytest.raises(SizeError, match="points"):
        compile_transfer(ember, 8)(t=1.0, z=np.zeros(1_000_000))
