"""Character coefficients and matrix elements by Fourier transform."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import sympy
from scipy.special import ive
from sympy.abc import z

from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.exceptions import ParameterError
from haarloom.torus.characters import characters
from haarloom.torus.quadrature import haar_grid
from haarloom.torus.transform import character_coefficients, matrix_element, matrix_elements


@pytest.mark.parametrize(("n", "cutoff", "points"), [(2, 5, 32), (3, 3, 32), (4, 1, 24)])
def test_finite_class_functions_come_back(n: int, cutoff: int, points: int) -> None:
    group = SU(n)
    basis = group.irreps(cutoff)
    numbers = {irrep: sympy.Rational(place + 1, 7) * (-1) ** place for place, irrep in enumerate(basis)}
    function = ClassFunction(group, numbers)
    coefficients, error = character_coefficients(group, function.at, basis, points)
    np.testing.assert_allclose(coefficients, [float(numbers[irrep]) for irrep in basis], atol=1e-12)
    assert error.max() < 1e-12


@pytest.mark.parametrize(("n", "cutoff", "points"), [(2, 4, 40), (3, 3, 48), (4, 1, 24)])
def test_matrix_elements_are_those_of_fusion(n: int, cutoff: int, points: int) -> None:
    """⟨r|f|s⟩ on the torus against Σ_c w_c N_{cs}^r from the algebra."""
    group = SU(n)
    basis = group.irreps(cutoff)
    function = 1 + z * group.loop + z**2 * group.loop.conjugate() / 2
    exact = np.array(function.subs(z, sympy.Rational(3, 10)).matrix(basis).tolist(), dtype=float)
    found, error = matrix_elements(group, lambda angles: function.at(angles, z=0.3), basis, basis, points)
    np.testing.assert_allclose(found, exact, atol=1e-12)
    assert error.max() < 1e-12
    assert matrix_element(group, lambda a: function.at(a, z=0.3), basis[1], basis[0], points)[0] == (
        pytest.approx(exact[1, 0], abs=1e-12)
    )


def test_matrix_elements_are_integrals_against_two_characters(rng: np.random.Generator) -> None:
    """The antisymmetrised transform against the plain quadrature sum, for a function that is not finite."""
    group = SU(3)
    basis = group.irreps(2)

    def function(angles: np.ndarray) -> np.ndarray:
        return np.exp(0.7 * characters((group.fundamental,), angles)[..., 0])

    found, error = matrix_elements(group, function, basis, basis, 40)
    angles, weights = haar_grid(group, 64)
    table = characters(basis, angles)
    summed = (table.conj().T * (weights * function(angles))) @ table
    np.testing.assert_allclose(found, summed, atol=1e-11)
    assert error.max() < 1e-9


def test_wilson_coefficients_of_su2_are_bessel_functions() -> None:
    """∫ χ_j exp(β cos θ) = 2(2j+1) I_{2j+1}(β)/β (NIST DLMF 10.32.3), SciPy's functions as the referee."""
    beta, basis = 2.3, SU(2).irreps(6)
    found, error = character_coefficients(SU(2), lambda a: np.exp(beta * np.cos(a[..., 0])), basis, 64)
    expected = [2 * (m + 1) * ive(m + 1, beta) * np.exp(beta) / beta for m in range(7)]
    np.testing.assert_allclose(found.real, expected, rtol=1e-12)
    np.testing.assert_allclose(found.imag, 0, atol=1e-13)
    assert error.max() < 1e-12


def test_the_estimate_sees_aliasing() -> None:
    """A function too sharp for the coarse grid: the true error of the fine grid stays below the estimate."""
    basis, beta = SU(2).irreps(2), 60.0
    found, error = character_coefficients(SU(2), lambda a: np.exp(beta * (np.cos(a[..., 0]) - 1)), basis, 14)
    exact = np.array([2 * (m + 1) * ive(m + 1, beta) / beta for m in range(3)])
    assert error.max() > 1e-6
    assert np.all(np.abs(found - exact) <= error)


def test_a_constant_may_be_returned_as_a_scalar() -> None:
    found, _ = character_coefficients(SU(3), lambda _: 2.0, SU(3).irreps(1), 24)
    np.testing.assert_allclose(found, [2, 0, 0], atol=1e-14)


@pytest.mark.parametrize("points", [8, 0, -1, 2.5])
def test_too_few_points_say_how_many_are_needed(points: Any) -> None:
    with pytest.raises(ParameterError, match="points"):
        character_coefficients(SU(3), lambda a: a[..., 0] * 0, SU(3).irreps(3), points)
