"""Masses along a line in parameter space: what a chart of masses against one parameter shows."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to, validated_cutoff
from haarloom.exceptions import ParameterError
from haarloom.numerics.batch import TruncationBatch, batch_errors, complete_levels, truncate_batch
from haarloom.numerics.bounds import eigenvalue_errors, mass_errors
from haarloom.numerics.compile import check_memory
from haarloom.numerics.cutoff import checked_levels
from haarloom.numerics.dense import solve_dense
from haarloom.numerics.ordering import masses_from
from haarloom.numerics.parameters import checked_values, plain_numbers
from haarloom.numerics.path_levels import excited_branches, solver_between
from haarloom.numerics.threads import in_parallel, single_threaded, split
from haarloom.numerics.truncation import truncate
from haarloom.numerics.verdicts import verdict_codes, verdict_words

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["MassBranches", "masses_along"]


@dataclass(frozen=True, eq=False)
class MassBranches:
    """Masses as continuous branches of one parameter.

    Attributes
    ----------
    parameter, grid
        Name and values of the parameter that varies, shape (M,).
    masses
        Shape (M, L − 1), complex: column j is one continuous branch. At the first point they are
        in spectral order.
    error
        Bound of |δm|, same shape; infinite where the cutoff does not suffice for a bound.
    complex_pair
        Whether the level is one of a complex pair beyond its error, same shape.
    verdicts
        ``"real"``, ``"complex pair"``, ``"complex"`` or ``"undecided"``, same shape.
    ground
        λ_0, shape (M,).
    cutoff
        K of the basis.
    fixed
        Values of the other parameters.
    """

    parameter: str
    grid: NDArray[np.float64]
    masses: NDArray[np.complex128]
    error: NDArray[np.float64]
    complex_pair: NDArray[np.bool_]
    verdicts: NDArray[np.str_]
    ground: NDArray[np.complex128]
    cutoff: int
    fixed: Mapping[str, float | complex]


@single_threaded
def masses_along(
    model: RingModel,
    parameter: str,
    grid: Any,
    levels: int = 6,
    cutoff: int = 6,
    **fixed: Any,
) -> MassBranches:
    """Masses at every point of a line, tracked, with errors, on one fixed basis.

    Parameters
    ----------
    parameter
        Name of the parameter that varies.
    grid
        Its values, shape (M,), rising or falling.
    levels
        Number of eigenvalues at each point, the leading one included.
    cutoff
        Irreps with Σ a_i ≤ cutoff.
    **fixed
        One number for each other parameter.

    Raises
    ------
    ParameterError
        For an empty or non-monotone grid, an unknown name, or more levels than irreps.
    MissingValueError, SizeError
        As for :func:`haarloom.numerics.spectrum.spectrum`.
    """
    line = checked_path(parameter, grid)
    checked = checked_values(model, {**fixed, parameter: line})
    others = plain_numbers({name: array for name, array in checked.items() if name != parameter})
    level, size = validated_cutoff(cutoff), count_up_to(model.group.rank, validated_cutoff(cutoff))
    count = checked_levels(levels, size)
    check_memory(8 * len(line) * size * size, f"{len(line)} points × {size:,} irreps squared")
    solved = _stacked if model.link.diagonal else _one_by_one
    lists = {name: array.reshape(-1) for name, array in checked.items()}
    found = solved(model, level, lists, min(count + GUARD, size))
    kept = found.values[:, : found.radius.shape[1]]
    between = solver_between(model, level, others, parameter, line)
    points = zip(found.values, found.right, found.left, strict=True)
    chosen = excited_branches(points, kept.shape[1], between)[:, : count - 1] - 1
    codes = verdict_codes(kept, found.radius, found.values, found.real, found.hermitian)
    verdicts = verdict_words(np.take_along_axis(codes, chosen, axis=1))
    return MassBranches(
        parameter=parameter,
        grid=line,
        masses=np.take_along_axis(masses_from(kept), chosen, axis=1),
        error=np.take_along_axis(mass_errors(kept, found.radius), chosen, axis=1),
        complex_pair=verdicts == "complex pair",
        verdicts=verdicts,
        ground=kept[:, 0].astype(complex),
        cutoff=level,
        fixed=others,
    )


@dataclass(frozen=True, eq=False)
class _Solved:
    """All levels at M points.

    Attributes
    ----------
    values, right, left
        Eigenvalues (M, n) in spectral order, vectors (M, n, n) in columns.
    radius
        Of the leading ones, shape (M, levels).
    real, hermitian
        Whether T is real everywhere; where it is Hermitian, shape (M,).
    """

    values: NDArray[Any]
    right: NDArray[Any]
    left: NDArray[Any]
    radius: NDArray[np.float64]
    real: bool
    hermitian: NDArray[np.bool_]


def _stacked(model: RingModel, cutoff: int, values: Mapping[str, NDArray[Any]], levels: int) -> _Solved:
    """All points at once, a part of them in each thread."""

    def job(part: slice) -> tuple[TruncationBatch, tuple[NDArray[Any], ...], NDArray[np.float64]]:
        some = {name: array if len(array) == 1 else array[part] for name, array in values.items()}
        batch = truncate_batch(model, cutoff, some)
        found = batch.solved()
        return batch, found, batch_errors(batch, complete_levels(batch, *found), levels)

    points = max(len(array) for array in values.values())
    batches, found, radii = zip(*in_parallel(job, split(points, LEAST_STACK)), strict=True)
    eigenvalues, right, left = (np.concatenate(arrays) for arrays in zip(*found, strict=True))
    return _Solved(
        values=eigenvalues,
        right=right,
        left=left,
        radius=np.concatenate(radii),
        real=all(batch.real for batch in batches),
        hermitian=np.concatenate([batch.hermitian for batch in batches]),
    )


def _one_by_one(model: RingModel, cutoff: int, values: Mapping[str, NDArray[Any]], levels: int) -> _Solved:
    """Point by point, for links that mix irreps."""
    points = max(len(array) for array in values.values())
    truncations = [
        truncate(model, cutoff, {name: array[min(i, len(array) - 1)] for name, array in values.items()})
        for i in range(points)
    ]
    systems = [solve_dense(truncation) for truncation in truncations]
    return _Solved(
        values=np.array([system.values.astype(complex) for system in systems]),
        right=np.array([system.right for system in systems]),
        left=np.array([system.left for system in systems]),
        radius=np.array([eigenvalue_errors(t, s, levels) for t, s in zip(truncations, systems, strict=True)]),
        real=all(truncation.real for truncation in truncations),
        hermitian=np.array([truncation.hermitian for truncation in truncations]),
    )


LEAST_STACK = 16
"""Fewest matrices for a thread."""

GUARD = 4
"""Levels beyond those asked for that are tracked along, so that a branch may leave the leading ones."""


def checked_path(name: str, grid: Any) -> NDArray[np.float64]:
    """Values along a path as a float array of shape (M,).

    Raises
    ------
    ParameterError
        If it is empty, not one-dimensional, not finite, or neither rising nor falling.
    """
    try:
        line = np.asarray(grid, dtype=float)
    except (TypeError, ValueError):
        raise ParameterError(
            f"{name} = {grid!r} is no path of real numbers: give a list or an array."
        ) from None
    if line.ndim != 1 or not len(line):
        raise ParameterError(
            f"{name} has shape {line.shape}: give at least one value, in a one-dimensional list or array."
        )
    if not np.isfinite(line).all():
        raise ParameterError(f"{name} holds values that are not finite: give finite numbers only.")
    steps = np.diff(line)
    if len(steps) and not ((steps > 0).all() or (steps < 0).all()):
        raise ParameterError(
            f"{name} neither rises nor falls throughout, so that levels cannot be followed along it: "
            "sort its values, each once."
        )
    return line
