"""What following levels along a path takes from T: the excited levels at and between its points."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.batch import truncate_batch
from haarloom.numerics.dense import biorthogonal, solve_dense
from haarloom.numerics.ordering import spectral_order
from haarloom.numerics.tracking import Levels, tracked
from haarloom.numerics.truncation import truncate

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["Solution", "excited_branches", "solved_stack", "solver_between"]

Solution = tuple[NDArray[Any], NDArray[Any], NDArray[Any]]
"""Eigenvalues (n,) in spectral order, right and left vectors (n, n) in columns."""


def excited_branches(
    path: Iterable[Solution], count: int, between: Callable[[float], Solution]
) -> NDArray[np.int64]:
    """Places of the levels 1 … count − 1 at each point, tracked; λ_0 is the largest one at each of them.

    Parameters
    ----------
    count
        Levels that are kept, λ_0 included.
    between
        From :func:`solver_between`.

    Returns
    -------
    int array, shape (M, count − 1), between 1 and count − 1.
    """
    levels = [_excited(*solution) for solution in path]
    return 1 + tracked(levels, count - 1, lambda position: _excited(*between(position)))


def solved_stack(matrices: NDArray[Any]) -> Solution:
    """All eigenvalues (M, n) of M matrices in spectral order, right and left vectors (M, n, n) in columns."""
    values, right = np.linalg.eig(matrices)
    order = spectral_order(values)
    right = np.take_along_axis(right, order[:, None, :], axis=2)
    return np.take_along_axis(values, order, axis=1), right, biorthogonal(right)


def _excited(values: NDArray[Any], right: NDArray[Any], left: NDArray[Any]) -> Levels:
    return Levels(values[1:], right[:, 1:], left[:, 1:])


def solver_between(
    model: RingModel, cutoff: int, fixed: Mapping[str, Any], parameter: str, line: NDArray[np.float64]
) -> Callable[[float], Solution]:
    """Solves T at any position between the points of a line: 1.5 is half-way from the second to the third."""

    def solution(position: float) -> Solution:
        value = float(np.interp(position, np.arange(len(line)), line))
        values = {**fixed, parameter: value}
        if not model.link.diagonal:
            system = solve_dense(truncate(model, cutoff, values))
            return system.values, system.right, system.left
        stack = truncate_batch(
            model, cutoff, {name: np.atleast_1d(number) for name, number in values.items()}
        )
        levels, right, left = stack.solved()
        return levels[0], right[0], left[0]

    return solution
