"""One chunk of a scan, solved in one process."""

from __future__ import annotations

import time
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.exceptions import HaarloomError
from haarloom.numerics.bounds import mass_errors
from haarloom.numerics.ordering import masses_from
from haarloom.numerics.plane import Plane, PlaneLevels, dense_points, solve_plane
from haarloom.numerics.plane_cutoff import sufficient
from haarloom.numerics.scan_grid import Chunk, ScanGrid
from haarloom.numerics.spectrum import spectrum
from haarloom.numerics.threads import single_threaded
from haarloom.numerics.verdicts import UNDECIDED, VERDICTS

__all__ = ["ChunkResult", "solve_chunk"]


@dataclass(frozen=True, eq=False)
class ChunkResult:
    """What a worker sends back: arrays of shape (rows, columns, …).

    Attributes
    ----------
    masses, error, verdicts
        Shape (R, C, L − 1); verdicts as positions in ``VERDICTS``.
    ground, cutoff
        λ_0 and K, shape (R, C).
    together
        Whether points were solved together, from warm starts or in stacks; else each by itself.
    note
        Why some points have no result; empty where all have.
    seconds
        How long it took.
    """

    chunk: Chunk
    masses: NDArray[np.complex128]
    error: NDArray[np.float64]
    verdicts: NDArray[np.int8]
    ground: NDArray[np.complex128]
    cutoff: NDArray[np.int32]
    together: bool = True
    note: str = ""
    seconds: float = 0.0


@single_threaded
def solve_chunk(grid: ScanGrid, chunk: Chunk) -> ChunkResult:
    """Masses at all points of a chunk; points whose bound does not close come back without numbers."""
    start = time.perf_counter()
    result = _solved(grid, chunk)
    return replace(result, seconds=time.perf_counter() - start)


def _solved(grid: ScanGrid, chunk: Chunk) -> ChunkResult:
    plane = _plane(grid, chunk)
    if not grid.model.link.diagonal:
        return _one_by_one(grid, chunk, plane)
    try:
        fitting = sufficient(plane)
        if fitting is None:
            return _one_by_one(grid, chunk, plane)
        found = solve_plane(fitting)
    except HaarloomError:
        return _one_by_one(grid, chunk, plane)
    _raise_cutoffs(fitting, found)
    return _packed(chunk, found)


def _plane(grid: ScanGrid, chunk: Chunk) -> Plane:
    rows, columns = grid.plane
    rest = iter(chunk.place)
    others = {
        name: grid.axes[axis][next(rest)]
        for axis, name in enumerate(grid.names)
        if axis not in (rows, columns)
    }
    fixed = {**grid.fixed, **others}
    if rows is None:
        # a line is a plane with one row: some fixed parameter, or a name that no weight asks for
        name = next(iter(fixed), "")
        first = np.array([float(np.real(fixed.get(name, 0.0)))])
        complex_row = name and np.iscomplexobj(np.asarray(fixed[name]))
        row = "" if complex_row else name
        fixed = fixed if complex_row else {key: value for key, value in fixed.items() if key != row}
    else:
        row, first = grid.names[rows], grid.axes[rows][slice(*chunk.rows)]
    names = (row, grid.names[columns])
    axes = (first, grid.axes[columns][slice(*chunk.columns)])
    return Plane(grid.model, 0, names, axes, fixed, grid.levels, grid.tolerance)


def _raise_cutoffs(plane: Plane, found: PlaneLevels) -> None:
    """Solve points that miss the tolerance again on larger bases."""
    for higher in (1, 3):
        places = np.nonzero(~plane.accepts(found.values, found.radius))
        if not len(places[0]):
            return
        first, second = (axis[place] for axis, place in zip(plane.axes, places, strict=True))
        larger = replace(plane, cutoff=plane.cutoff + higher)
        values, radius, verdicts = dense_points(larger, first, second)
        better = radius.max(axis=1) < found.radius[places].max(axis=1)
        chosen = tuple(place[better] for place in places)
        found.values[chosen], found.radius[chosen] = values[better], radius[better]
        found.verdicts[chosen], found.cutoff[chosen] = verdicts[better], larger.cutoff


def _packed(chunk: Chunk, found: PlaneLevels) -> ChunkResult:
    return ChunkResult(
        chunk,
        masses_from(found.values),
        mass_errors(found.values, found.radius),
        found.verdicts,
        found.values[:, :, 0],
        found.cutoff,
    )


def _one_by_one(grid: ScanGrid, chunk: Chunk, plane: Plane) -> ChunkResult:
    """Every point for itself: large bases, and chunks in which some point fails."""
    rows, columns = plane.shape
    shape = (rows, columns, grid.levels - 1)
    result = ChunkResult(
        chunk,
        np.full(shape, np.nan + 0j),
        np.full(shape, np.inf),
        np.full(shape, VERDICTS.index(UNDECIDED), dtype=np.int8),
        np.full(shape[:2], np.nan + 0j),
        np.full(shape[:2], -1, dtype=np.int32),
    )
    note = ""
    for row, first in enumerate(plane.axes[0]):
        for column, second in enumerate(plane.axes[1]):
            point = {**plane.fixed, **_named(plane, first, second)}
            try:
                found = spectrum(grid.model, levels=grid.levels, **point)
            except HaarloomError as problem:
                note = note or str(problem)
                continue
            result.masses[row, column] = found.masses
            result.error[row, column] = found.error
            result.verdicts[row, column] = [VERDICTS.index(word) for word in found.verdicts]
            result.ground[row, column] = found.eigenvalues[0]
            result.cutoff[row, column] = found.cutoff
    return replace(result, note=note, together=False)


def _named(plane: Plane, first: float, second: float) -> dict[str, Any]:
    named = dict(zip(plane.names, (float(first), float(second)), strict=True))
    named.pop("", None)
    return named
