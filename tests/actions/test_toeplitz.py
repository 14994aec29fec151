"""Toeplitz determinants: every route against exact arithmetic, and the stated error against the true one."""

from __future__ import annotations

from fractions import Fraction
from itertools import permutations

import numpy as np
import pytest
import sympy

from haarloom.actions.bessel import bessel_integers
from haarloom.actions.double_double import determinants
from haarloom.actions.toeplitz import difference_rows, toeplitz_complex, toeplitz_integers, toeplitz_sums


def _binomials(top: int, reach: int) -> list[int]:
    return [
        sympy.binomial(top, k + top // 2) if 0 <= k + top // 2 <= top else 0 for k in range(-reach, reach + 1)
    ]


@pytest.mark.parametrize("n", [2, 3, 4, 6])
def test_difference_rows_keep_every_minor(n: int) -> None:
    reach = 6
    coefficients = [int(value) for value in _binomials(10, reach + n)]
    rows = difference_rows(coefficients, n)
    rng = np.random.default_rng(3)
    for _ in range(5):
        columns = np.sort(rng.choice(2 * reach + 1, n, replace=False))
        exact = sympy.Matrix(n, n, lambda i, j: coefficients[int(columns[j]) + n + i]).det()  # noqa: B023
        approximate = np.linalg.det((rows.high + rows.low)[:, columns]) * float(rows.scale)
        assert approximate == pytest.approx(float(exact), rel=1e-9, abs=1e-6)


@pytest.mark.parametrize("n", [2, 3, 5, 8])
def test_double_double_determinants_have_thirty_digits(n: int, rng: np.random.Generator) -> None:
    matrices = rng.integers(-(10**6), 10**6, (4, n, n))
    matrices[:, -1] = matrices[:, 0] + rng.integers(-1, 2, (4, n))  # nearly dependent rows
    exact = [sympy.Matrix(m.tolist()).det() for m in matrices]
    high, low = determinants(matrices.astype(float), np.zeros(matrices.shape))
    for value, top, rest in zip(exact, high, low, strict=True):
        difference = abs(Fraction(int(value)) - Fraction(float(top)) - Fraction(float(rest)))
        norms = np.prod(np.linalg.norm(matrices.astype(float), axis=1), axis=1).max()
        assert difference <= 2.0**-95 * norms * n**2


def test_a_singular_matrix_has_determinant_zero() -> None:
    matrix = np.array([[[1.0, 2.0], [2.0, 4.0]], [[0.0, 0.0], [1.0, 1.0]]])
    assert determinants(matrix, np.zeros_like(matrix))[0].tolist() == [0.0, 0.0]


@pytest.mark.parametrize("n", [2, 3, 4, 5])
def test_all_routes_agree_with_the_exact_sum(n: int) -> None:
    reach, margin = 16, 8
    coefficients = [int(value) for value in _binomials(8, reach + n)]
    partitions = np.array([[0] * n, [1] + [0] * (n - 1), [3, 1] + [0] * (n - 2)])
    sums, error = toeplitz_sums(partitions, [difference_rows(coefficients, n)], margin)
    scale = float(difference_rows(coefficients, n).scale)
    other, slack = toeplitz_complex(partitions, np.array(coefficients, dtype=complex), margin)
    for place, rows in enumerate(partitions.tolist()):
        exact, _ = toeplitz_integers(tuple(rows), coefficients, reach + n, range(-8 - rows[0], 9))
        assert abs(sums[0, place] * scale - exact) <= error[0, place] * scale
        assert abs(other[place] - exact) <= slack[place]
        assert error[0, place] * scale < 1e-9 * max(1.0, abs(exact))


def test_integer_sum_is_the_signed_sum_over_permutations() -> None:
    table = bessel_integers(Fraction(3, 2), 12, 64)
    phi = table[:0:-1] + table
    total, sizes = toeplitz_integers((2, 1, 0), phi, 12, range(-1, 2))
    expected = 0
    for m in range(-1, 2):
        for order in permutations(range(3)):
            sign = sympy.combinatorics.Permutation(list(order)).signature()
            columns = [(2, 1, 0)[j] - j + m + order[j] for j in range(3)]
            expected += sign * phi[12 + columns[0]] * phi[12 + columns[1]] * phi[12 + columns[2]]
    assert total == expected
    assert len(sizes) == 3
    assert sum(sizes) >= abs(total)
