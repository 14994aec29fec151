"""Character coefficients of a function on the torus, by Fourier transform and antisymmetrisation.

With F̂(c) the Fourier coefficient of f at content c, ⟨r|f|s⟩ = ∫dP χ_r* f χ_s = Σ_σ sgn(σ) F̂(r + ρ − σ(s +
ρ)), the sum over the permutations of N. It follows from Weyl's integration formula: the two denominators of
the characters cancel the measure, and one antisymmetric sum is spent on the N! of it. s trivial gives the
character coefficients.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import permutations
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ParameterError
from haarloom.torus.quadrature import grid_angles, validated_points

__all__ = ["character_coefficients", "matrix_element", "matrix_elements"]

Density = Callable[[NDArray[np.float64]], Any]


def character_coefficients(
    group: SU, function: Density, irreps: Sequence[Irrep], points: int
) -> tuple[NDArray[np.complex128], NDArray[np.float64]]:
    """Coefficients w_c = ∫dP χ_c* f of a class function given at angles.

    Parameters
    ----------
    group : SU
    function : callable
        Takes angles of shape (..., N − 1), returns values of shape (...); called on a grid of 2·points an
        angle.
    irreps : sequence of Irrep
        The c whose coefficients are wanted, n of them.
    points : int
        Grid points an angle of the coarse grid; must exceed the largest exponent asked for.

    Returns
    -------
    coefficients : complex ndarray (n,)
        From the fine grid.
    error : ndarray (n,)
        Difference to the coarse grid: an estimate of the aliasing error of the *coarse* one, so a cautious
        one.
    """
    fine, error = matrix_elements(group, function, irreps, [group.trivial], points)
    return fine[:, 0], error[:, 0]


def matrix_element(
    group: SU, function: Density, row: Irrep, column: Irrep, points: int
) -> tuple[complex, float]:
    """One matrix element ⟨row|f|column⟩ with its error estimate."""
    fine, error = matrix_elements(group, function, [row], [column], points)
    return complex(fine[0, 0]), float(error[0, 0])


def matrix_elements(
    group: SU, function: Density, rows: Sequence[Irrep], columns: Sequence[Irrep], points: int
) -> tuple[NDArray[np.complex128], NDArray[np.float64]]:
    """Matrix ⟨r|f|s⟩ over given rows and columns, with the change on halving the grid."""
    _check_points(group, rows, columns, points)
    values = np.asarray(function(grid_angles(group, 2 * points)), dtype=np.complex128)
    values = np.broadcast_to(values, (2 * points,) * group.rank)
    coarse = _antisymmetrised(np.fft.fftn(values[(slice(None, None, 2),) * group.rank]), rows, columns)
    fine = _antisymmetrised(np.fft.fftn(values), rows, columns)
    return fine, np.abs(fine - coarse)


def _antisymmetrised(
    spectrum: NDArray[np.complex128], rows: Sequence[Irrep], columns: Sequence[Irrep]
) -> NDArray[np.complex128]:
    points, size = spectrum.shape[0], spectrum.size
    upper, lower = _shifted(rows), _shifted(columns)
    total = np.zeros((len(rows), len(columns)), dtype=np.complex128)
    for order in permutations(range(upper.shape[1])):
        difference = upper[:, None, :] - lower[None, :, list(order)]
        exponents = difference[..., :-1] - difference[..., -1:]
        total += _sign(order) * spectrum[tuple(np.moveaxis(exponents % points, -1, 0))]
    result: NDArray[np.complex128] = total / size
    return result


def _shifted(irreps: Sequence[Irrep]) -> NDArray[np.int64]:
    """λ + ρ for each irrep, shape (n, N)."""
    rows = np.array([irrep.partition for irrep in irreps], dtype=np.int64)
    return rows + np.arange(rows.shape[1] - 1, -1, -1)


def _sign(order: tuple[int, ...]) -> int:
    inversions = sum(order[i] > order[j] for i in range(len(order)) for j in range(i + 1, len(order)))
    return -1 if inversions % 2 else 1


def _check_points(group: SU, rows: Sequence[Irrep], columns: Sequence[Irrep], points: int) -> None:
    """Exponents up to ±reach must not wrap around the coarse grid, or it would compare two aliases."""
    reach = (
        max(sum(irrep.labels) for irrep in rows)
        + max(sum(irrep.labels) for irrep in columns)
        + 2 * group.rank
    )
    if validated_points(points) <= 2 * reach:
        raise ParameterError(
            f"{points} points an angle given; exponents up to ±{reach} are asked for, so at least "
            f"{2 * reach + 1} are "
            "needed."
        )
