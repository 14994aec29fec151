"""The bordered system: one smooth function whose double zeros are the exceptional points.

For a matrix A(p) and borders b, c let

    [A − λ   b] [x]   [0]
    [ cᵀ     0] [g] = [1],

and (w, g) the same with the transpose. Then g(λ, p) = 0 exactly where λ is an eigenvalue, and

    g_λ = wᵀx,   g_p = −wᵀ A_p x,   g_λλ = w_λᵀx + wᵀx_λ,   g_λp = w_pᵀx + wᵀx_p,

where the derivatives of x and w solve the same system with (x, 0) or (−A_p x, 0) on the right. Two
levels coalesce where g = g_λ = 0; there λ − λ* ≈ ±√(−2 g_p/g_λλ · (p − p*)). The border keeps the
matrix regular as long as the level has one eigenvector (A. Griewank, G. W. Reddien, *IMA J. Numer.
Anal.* 4 (1984) 295; W. Govaerts, *Numerical Methods for Bifurcations of Dynamical Equilibria* (2000)).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["BorderedPoint", "Borders", "bordered_point", "unit"]

Borders = tuple[NDArray[Any], NDArray[Any]]
"""(b, c), close to the left and to the right vector of the level."""


@dataclass(frozen=True, eq=False)
class BorderedPoint:
    """g and its derivatives at one (λ, p).

    Attributes
    ----------
    g, g_level, g_second
        g, g_λ, g_λλ.
    g_parameters, g_mixed
        g_p and g_λp for each parameter, shape (P,).
    right, left
        x and w, shape (n,).
    """

    g: Any
    g_level: Any
    g_second: Any
    g_parameters: NDArray[Any]
    g_mixed: NDArray[Any]
    right: NDArray[Any]
    left: NDArray[Any]

    @property
    def residual(self) -> NDArray[Any]:
        """(g, g_λ)."""
        return np.array([self.g, self.g_level])

    @property
    def jacobian(self) -> NDArray[Any]:
        """Derivatives of (g, g_λ) by (λ, p_1, …), shape (2, 1 + P)."""
        return np.array([[self.g_level, *self.g_parameters], [self.g_second, *self.g_mixed]])

    @property
    def square_root_coefficient(self) -> NDArray[Any]:
        """q in λ − λ* ≈ ±√(q (p − p*)), for each parameter."""
        return np.asarray(-2 * self.g_parameters / self.g_second)


def bordered_point(
    matrix: NDArray[Any],
    slopes: Sequence[NDArray[Any]],
    level: Any,
    borders: Borders,
) -> BorderedPoint:
    """Evaluate the bordered system in floating point.

    Parameters
    ----------
    matrix
        A, shape (n, n).
    slopes
        ∂A/∂p for each parameter, shape (n, n) each.
    level
        λ.
    borders
        (b, c), shape (n,) each: close to the left and to the right vector.

    Raises
    ------
    numpy.linalg.LinAlgError
        If the bordered matrix is singular.
    """
    size = len(matrix)
    column, row = borders
    whole = np.zeros((size + 1, size + 1), dtype=np.result_type(matrix, column, row, type(level)))
    whole[:size, :size] = matrix - level * np.eye(size)
    whole[:size, size], whole[size, :size] = column, row
    last = np.zeros(size + 1)
    last[size] = 1.0
    inverse = np.linalg.inv(whole)
    right, left = (inverse @ last), (last @ inverse)
    x, w, g = right[:size], left[:size], right[size]
    # derivatives of x and of w by λ, then by each parameter
    forces = [x, *(-slope @ x for slope in slopes)]
    dual_forces = [w, *(-(w @ slope) for slope in slopes)]
    change = [(inverse[:size, :size] @ force) for force in forces]
    dual_change = [(force @ inverse[:size, :size]) for force in dual_forces]
    second = [dual @ x + w @ direct for dual, direct in zip(dual_change, change, strict=True)]
    first = np.array([w @ force for force in forces[1:]])
    return BorderedPoint(g, w @ x, second[0], first, np.array(second[1:]), x, w)


def unit(vector: NDArray[Any]) -> NDArray[Any]:
    """A vector of norm 1."""
    return np.asarray(vector / np.linalg.norm(vector))
