"""How large a basis a plane needs, judged from vectors on a larger one at a few of its points."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.numerics.batch import TruncationBatch
from haarloom.numerics.cutoff import closing_cutoff
from haarloom.numerics.plane import Plane

__all__ = ["LARGEST_PLANE", "fitted", "sufficient"]

LARGEST_PLANE = 250
"""Most irreps in the basis of a plane; beyond, every point is solved by itself."""

STEP = 3
"""By how much the basis grows on which the cutoffs below it are judged."""

SHARE = 0.25
"""Part of the tolerance that the truncation error may have."""


def sufficient(plane: Plane) -> Plane | None:
    """The plane on the smallest basis that suffices at its corners and in the middle.

    None where that takes more irreps than are solved together.

    Raises
    ------
    ConvergenceError
        If the truncation bound closes nowhere.
    """
    first, second = _probes(plane)
    values = plane.values(first, second)
    places = [{name: array[min(i, len(array) - 1)] for name, array in values.items()} for i in range(5)]
    cutoff = min(closing_cutoff(plane.model, plane.levels, place) for place in places)
    while plane.model.group.count_irreps(cutoff) <= LARGEST_PLANE:
        cutoff += STEP
        found = _smallest(replace(plane, cutoff=cutoff), first, second)
        if found is not None:
            return found if plane.model.group.count_irreps(found.cutoff) <= LARGEST_PLANE else None
    return None


def fitted(plane: Plane) -> Plane:
    """The plane on a smaller basis, if that suffices at its corners and in the middle."""
    return _smallest(plane, *_probes(plane)) or plane


def _probes(plane: Plane) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    rows, columns = (axis[[0, len(axis) // 2, -1]] for axis in plane.axes)
    return rows[[0, 0, 1, 2, 2]], columns[[0, 2, 1, 0, 2]]


def _smallest(plane: Plane, first: NDArray[np.float64], second: NDArray[np.float64]) -> Plane | None:
    """The smallest basis below that of the plane whose truncation errors are small enough at some points."""
    batch = plane.batch(first, second)
    values, right, left = (array[..., : plane.levels] for array in batch.solved())
    strict = replace(plane, tolerance=SHARE * plane.tolerance)
    for cutoff in range(plane.cutoff):
        inner = count_up_to(plane.model.group.rank, cutoff)
        if inner <= plane.levels:
            continue
        radius = _cut_radii(batch, inner, values, right, left, _outside(plane, cutoff, first, second))
        if strict.accepts(values.astype(complex), radius).all():
            return replace(plane, cutoff=cutoff)
    return None


def _cut_radii(
    batch: TruncationBatch,
    inner: int,
    values: NDArray[Any],
    right: NDArray[Any],
    left: NDArray[Any],
    outside: NDArray[np.float64],
) -> NDArray[np.float64]:
    """What cutting the basis down to its first irreps would shift each level by, shape (M, L).

    The bound of :mod:`haarloom.numerics.bounds` for one level, with vectors of the larger basis.
    """
    up = np.linalg.norm(batch.matrix[:, inner:, :inner] @ right[:, :inner], axis=1)
    turned = np.swapaxes(batch.matrix[:, :inner, inner:], 1, 2)
    down = np.linalg.norm(turned @ left[:, :inner], axis=1)
    room = np.abs(values) - outside[:, None]
    with np.errstate(divide="ignore"):
        return np.asarray(np.where(room > 0, up * down / np.maximum(room, 1e-300), np.inf))


def _outside(
    plane: Plane, cutoff: int, first: NDArray[np.float64], second: NDArray[np.float64]
) -> NDArray[np.float64]:
    """‖W‖ |k| beyond a cutoff, at each point; of length one where nothing varies."""
    values = plane.values(first, second)
    norm = np.asarray(plane.model.site.norm_bound(values), dtype=float).reshape(-1)
    largest = np.asarray(plane.model.link.largest_outside(cutoff, values), dtype=float).reshape(-1)
    return np.asarray(norm * largest)
