"""The Haar measure on a grid of eigenphases."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from scipy.integrate import dblquad, quad

from haarloom.algebra.group import SU
from haarloom.exceptions import ParameterError, SizeError
from haarloom.torus.characters import characters
from haarloom.torus.quadrature import haar_grid, haar_integral, weyl_density


@pytest.mark.parametrize(("n", "cutoff", "points"), [(2, 8, 24), (3, 5, 20), (4, 2, 14), (5, 1, 12)])
def test_characters_are_orthonormal_on_the_grid(n: int, cutoff: int, points: int) -> None:
    """H. Weyl's orthogonality relations."""
    angles, weights = haar_grid(SU(n), points)
    table = characters(SU(n).irreps(cutoff), angles)
    gram = (table.conj().T * weights) @ table
    np.testing.assert_allclose(gram, np.eye(len(gram)), atol=1e-12)


@pytest.mark.parametrize("n", [2, 3, 4])
def test_the_smallest_grid_allowed_integrates_one_exactly(n: int) -> None:
    _, weights = haar_grid(SU(n), 2 * n - 1)
    assert weights.sum() == pytest.approx(1, abs=1e-14)
    with pytest.raises(ParameterError, match="at least"):
        haar_grid(SU(n), 2 * n - 2)


def test_moment_of_su2_by_adaptive_quadrature() -> None:
    """∫ |tr U|⁶ on SU(2) with the measure (2/π) sin²θ dθ on [0, π], by SciPy."""
    moment, _ = quad(lambda theta: (2 * np.cos(theta)) ** 6 * 2 / np.pi * np.sin(theta) ** 2, 0, np.pi)
    value, error = haar_integral(SU(2), lambda angles: (2 * np.cos(angles[..., 0])) ** 6, 10)
    assert value == pytest.approx(moment, abs=1e-10)
    assert error < 1e-12


def test_a_smooth_function_of_su3_by_adaptive_quadrature() -> None:
    def density(a: float, b: float) -> float:
        loop = np.exp(1j * a) + np.exp(1j * b) + np.exp(-1j * (a + b))
        measure = float(weyl_density(SU(3), [a, b])) / (2 * np.pi) ** 2
        return float(np.exp(loop.real / 2) * measure)

    expected, _ = dblquad(density, 0, 2 * np.pi, 0, 2 * np.pi, epsabs=1e-9, epsrel=1e-9)
    value, error = haar_integral(
        SU(3), lambda angles: np.exp(characters((SU(3).fundamental,), angles)[..., 0].real / 2), 24
    )
    assert value.real == pytest.approx(expected, abs=1e-8)
    assert error < 1e-12


def test_the_error_estimate_covers_a_grid_that_is_too_coarse() -> None:
    exact = 513  # ∫ |tr U|¹² on SU(3), the sixth of the numbers of Gessel and Rains
    value, error = haar_integral(
        SU(3), lambda angles: abs(characters((SU(3).fundamental,), angles)[..., 0]) ** 12, 7
    )
    assert error > 1
    assert abs(value - exact) <= error


def test_the_density_vanishes_where_eigenvalues_coincide() -> None:
    assert weyl_density(SU(3), [0.3, 0.3]) == pytest.approx(0, abs=1e-30)
    assert weyl_density(SU(4), np.zeros((2, 3))).shape == (2,)


@pytest.mark.parametrize("points", [0, -4, 2.0, True, None, "8"])
def test_points_are_a_positive_integer(points: Any) -> None:
    with pytest.raises(ParameterError, match="points"):
        haar_grid(SU(2), points)


def test_a_grid_beyond_memory_states_its_size() -> None:
    with pytest.raises(SizeError, match="10,000,000,000"):
        haar_grid(SU(6), 100)
