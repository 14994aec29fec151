"""Haar integrals of class functions as sums over a grid on the maximal torus (Weyl's integration formula)."""

from __future__ import annotations

from collections.abc import Callable
from math import factorial
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.group import SU
from haarloom.algebra.whole_numbers import whole_number
from haarloom.exceptions import ParameterError, SizeError
from haarloom.torus.angles import full_angles

__all__ = ["grid_angles", "haar_grid", "haar_integral", "weyl_density"]

_MOST_POINTS = 20_000_000


def weyl_density(group: SU, angles: Any) -> NDArray[np.float64]:
    """∏_{i<j} |x_i − x_j|² / N!: the Haar density of eigenphases against ∏ dθ_j/2π over N − 1 of them."""
    phases = full_angles(group.n, angles)
    density = np.full(phases.shape[:-1], 1.0 / factorial(group.n))
    for i in range(group.n):
        for j in range(i + 1, group.n):
            density *= 4.0 * np.sin((phases[..., i] - phases[..., j]) / 2.0) ** 2
    return density


def grid_angles(group: SU, points: int) -> NDArray[np.float64]:
    """The regular grid θ_j = 2πk/points, k = 0 … points − 1, shape (points, …, points, N − 1).

    Raises
    ------
    SizeError
        When points^(N−1) exceeds twenty million; the message says how many there would be.
    """
    if validated_points(points) ** group.rank > _MOST_POINTS:
        raise SizeError(
            f"{points} points an angle make {points**group.rank:,} grid points for {group} "
            f"({points**group.rank * 8 * group.rank / 2**30:.1f} GiB of angles alone), more than "
            f"{_MOST_POINTS:,}: "
            "take fewer points."
        )
    line = 2 * np.pi * np.arange(points) / points
    return np.stack(np.meshgrid(*[line] * group.rank, indexing="ij"), axis=-1)


def haar_grid(group: SU, points: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Nodes and weights of the trapezoidal rule for ∫ dP, Weyl measure included.

    Parameters
    ----------
    group : SU
    points : int
        Grid points for each of the N − 1 angles, at least 2N − 1.

    Returns
    -------
    angles : ndarray of shape (M, N − 1), M = points^(N−1)
    weights : ndarray of shape (M,)
        They add up to 1.

    Notes
    -----
    Exact for class functions whose eigenvalue exponents, relative to the last eigenvalue's, stay below
    points − 2(N − 1) in absolute value; the Weyl measure itself uses up 2(N − 1).
    """
    if validated_points(points) < 2 * group.n - 1:
        raise ParameterError(
            f"{points} points an angle given; {group} needs at least {2 * group.n - 1} to integrate "
            "even 1 exactly."
        )
    angles = grid_angles(group, points).reshape(-1, group.rank)
    return angles, weyl_density(group, angles) / len(angles)


def haar_integral(
    group: SU, function: Callable[[NDArray[np.float64]], Any], points: int
) -> tuple[complex, float]:
    """∫ dP f(P) for a class function given at angles, with the change on halving the grid as error.

    Returns
    -------
    value : complex
    error : float
        |I(2·points) − I(points)|; an estimate, not a bound.
    """
    results = []
    for count in (points, 2 * points):
        angles, weights = haar_grid(group, count)
        results.append(complex(np.sum(np.asarray(function(angles)) * weights)))
    return results[1], abs(results[1] - results[0])


def validated_points(points: Any) -> int:
    """Check a number of grid points: an integer ≥ 1."""
    return whole_number("points", points, 1, "64 is a good start")
