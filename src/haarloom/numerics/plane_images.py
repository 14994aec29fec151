"""T on interpolated vectors at the points of a plane.

Where W has few characters they are applied one by one to the vectors of many points at once;
otherwise, and to correct vectors, T is stacked point by point.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import partial
from math import ceil
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.corrections import corrected
from haarloom.numerics.group_levels import Margins
from haarloom.numerics.labels import conjugation
from haarloom.numerics.plane import Plane
from haarloom.numerics.plane_numbers import plane_numbers
from haarloom.numerics.threads import split

__all__ = ["PlanePart", "plane_parts", "point_parts"]

FEW_COMPONENTS = 16
"""Most irreps in W that are applied one by one."""

LIFT = 1
"""How much larger the cutoff is for points that miss the tolerance at first."""

NUMBERS = 400_000
"""Most numbers in the vectors that are evaluated together; bounds scratch memory."""

LEAST_POINTS = 256
"""Fewest points for a thread: each of its calls should be long against the lock they all need between."""


@dataclass(frozen=True, eq=False)
class PlanePart:
    """Some points p of a plane, counted row by row.

    Attributes
    ----------
    points
        Which.
    vectors, images, beyond
        V, T V inside and beyond the basis, shapes (n, m, p), (n, m, p), (·, m, p). Points come last,
        so that every sum over a basis runs along contiguous memory for many of them.
    dual
        (Φ, J): the left partner of a vector v is Φ · v[J]; Φ broadcasts to (n, m, p), or is None
        where it is 1.
    margins, hermitian, real
        What bound and verdicts need.
    """

    points: slice
    vectors: NDArray[Any]
    images: NDArray[Any]
    beyond: NDArray[Any]
    dual: tuple[NDArray[Any] | None, NDArray[np.int64]]
    margins: Margins
    hermitian: NDArray[np.bool_]
    real: bool


PartJob = Callable[[], PlanePart]


def plane_parts(
    plane: Plane, frames: NDArray[Any], weights: tuple[NDArray[np.float64], NDArray[np.float64]]
) -> list[PartJob]:
    """Jobs that cover all points of a plane, some rows at a time.

    Parameters
    ----------
    frames
        Vectors at the nodes, shape (first nodes, second nodes, m, n).
    weights
        Interpolation weights along both axes, shapes (R, first nodes) and (C, second nodes).
    """
    rows, columns = plane.shape
    if not (plane.model.site.finite and len(plane.model.site.support()) <= FEW_COMPONENTS):
        places = np.divmod(np.arange(rows * columns), columns)
        return point_parts(plane, frames, weights, places)
    numbers = plane_numbers(plane)
    upright = frames.transpose(3, 2, 1, 0)
    second = np.ascontiguousarray(weights[1].T)

    def at(start: int) -> PlanePart:
        some = slice(start, min(start + step, rows))
        shape = (some.stop - start, columns)
        across = np.swapaxes(upright @ weights[0][some].T, 2, 3)
        vectors = (np.ascontiguousarray(across) @ second).reshape(*across.shape[:3], columns)
        here = numbers.rows(some)
        images = here.images(vectors).reshape(-1, vectors.shape[1], shape[0] * columns)
        size = numbers.size
        phase = None
        if not numbers.positive:
            phase = np.broadcast_to(here.phase[:size], (size, *shape)).reshape(size, 1, -1)
        return PlanePart(
            slice(start * columns, some.stop * columns),
            vectors.reshape(size, vectors.shape[1], -1),
            images[:size],
            images[size:],
            (phase, numbers.mirror),
            here.margins(shape),
            here.hermitian_at(shape),
            numbers.real,
        )

    # as many parts for every thread
    threads = len(split(rows * columns, LEAST_POINTS))
    fitting = max(1, NUMBERS // (frames.shape[2] * frames.shape[3] * columns))
    step = ceil(rows / (threads * ceil(rows / (threads * fitting))))
    return [partial(at, start) for start in range(0, rows, step)]


def point_parts(
    plane: Plane,
    frames: NDArray[Any],
    weights: tuple[NDArray[np.float64], NDArray[np.float64]],
    places: tuple[NDArray[np.int64], NDArray[np.int64]],
    groups: Sequence[slice] = (),
) -> list[PartJob]:
    """Jobs that cover a list of points of a plane, some at a time.

    Parameters
    ----------
    places
        Rows and columns of the points.
    groups
        Groups of vectors. Where they are given, the interpolated vectors are corrected on a larger basis.
    """
    count, inner = frames.shape[2:]
    flat = frames.reshape(-1, count * inner)
    if groups:
        plane = replace(plane, cutoff=plane.cutoff + LIFT)
    mirror = conjugation(plane.model.group.rank, plane.cutoff)

    def at(part: slice) -> PlanePart:
        row, column = places[0][part], places[1][part]
        share = (weights[0][row][:, :, None] * weights[1][column][:, None, :]).reshape(len(row), -1)
        batch = plane.batch(plane.axes[0][row], plane.axes[1][column])
        phase = batch.phase[:, : batch.size]
        upright = np.zeros((len(row), batch.size, count), dtype=np.result_type(batch.matrix, flat))
        upright[:, :inner] = np.swapaxes((share @ flat).reshape(-1, count, inner), 1, 2)
        if groups:
            upright = corrected(batch.matrix, upright, (phase, mirror), groups)
        images = (upright, batch.matrix @ upright, batch.upwards @ upright)
        vectors, inside, beyond = (np.ascontiguousarray(np.moveaxis(array, 0, 2)) for array in images)
        margins = Margins(batch.norm * batch.outside, batch.rest, batch.rim, batch.noise)
        dual = (phase.T[:, None], mirror)
        return PlanePart(part, vectors, inside, beyond, dual, margins, batch.hermitian, batch.real)

    return [partial(at, part) for part in plane.stacks(len(places[0]))]
