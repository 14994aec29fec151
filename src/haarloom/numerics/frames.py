"""Warm starts: invariant subspaces interpolated from neighbouring points, every residual checked.

Leading levels are grouped where |λ| drops clearly at every node of a patch. The invariant subspace of
a group varies smoothly as long as the group stays apart from the others, through mergers inside it as
well. It is computed densely at Chebyshev nodes, put into one gauge, and interpolated. At every point
the pencil (Vᵀ ΦJ T V, Vᵀ ΦJ V) of a group gives its levels: because ΦJ maps right onto left vectors,
the error of an eigenvalue is of second order in that of the subspace. A group of one or two levels
needs no eigen-solver at all.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import partial
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.group_levels import group_radii, pencil_levels
from haarloom.numerics.interpolation import chebyshev_decay, chebyshev_nodes, lagrange_matrix
from haarloom.numerics.ordering import spectral_order
from haarloom.numerics.plane import MANY_FAILURES, NODES, Plane
from haarloom.numerics.plane_images import PartJob, plane_parts, point_parts
from haarloom.numerics.threads import in_parallel, split
from haarloom.numerics.verdicts import verdict_codes

__all__ = ["levels_from_frames"]

EXTRA = 6
"""Most levels beyond those wanted that the last group may take in to end at a gap."""

GAP = 0.9
"""Ratio of neighbouring |λ|, at every node, below which they belong to different groups."""

LEAST_NODES = 8
"""Fewest nodes for a thread."""

SMOOTH = 1e-8
"""Interpolation error of a subspace that is aimed at: its square is lost in rounding."""

BEND = 1e-6
"""Estimated error of an interpolated subspace from which on it is not evaluated."""

SAMPLE = 4
"""Of so many points along each axis one is tried before a patch is evaluated in full."""


Levels = tuple[NDArray[np.complex128], NDArray[np.float64], NDArray[np.int8]]
"""Values, radii and verdicts."""


@dataclass(frozen=True, eq=False)
class _Frames:
    """Subspaces of all groups at the nodes.

    Attributes
    ----------
    nodes
        Along both axes.
    vectors
        Shape (first nodes, second nodes, m, n): one row for each vector.
    groups
        Slices of the m vectors.
    rest
        Largest ratio of the first |λ| left out to the last taken in.
    """

    nodes: tuple[NDArray[np.float64], NDArray[np.float64]]
    vectors: NDArray[Any]
    groups: tuple[slice, ...]
    rest: float


def levels_from_frames(
    plane: Plane,
) -> Levels | int | None:
    """Values, radii and verdicts at every point.

    Where the subspaces bend too much to be interpolated, the axis across which to halve the plane;
    None where levels do not group or T is not mirrored.
    """
    counts = [1, 1]
    for axis in (0, 1):
        count = _node_count(plane, axis)
        if count is None:
            return axis
        counts[axis] = count
    frames = _frames(plane, (counts[0], counts[1]))
    if frames is None:
        return None
    sample = replace(plane, axes=(plane.axes[0][::SAMPLE], plane.axes[1][::SAMPLE]))
    if not sample.accepts(*_everywhere(sample, frames)[:2]).mean() >= 1 - MANY_FAILURES:
        return None
    found = _everywhere(plane, frames)
    _improved(plane, frames, found)
    return found


def _everywhere(plane: Plane, frames: _Frames) -> Levels:
    """Values, radii and verdicts at all points from the interpolated subspaces."""
    rows, columns = plane.shape
    values = np.empty((rows * columns, plane.levels), dtype=complex)
    radius = np.empty((rows * columns, plane.levels))
    verdicts = np.empty((rows * columns, plane.levels - 1), dtype=np.int8)
    jobs = plane_parts(plane, frames.vectors, _weights(plane, frames))
    for points, found in in_parallel(partial(_solved, plane, frames), jobs):
        values[points], radius[points], verdicts[points] = found
    shape = (rows, columns, -1)
    return values.reshape(shape), radius.reshape(shape), verdicts.reshape(rows, columns, plane.levels - 1)


def _improved(plane: Plane, frames: _Frames, found: Levels) -> None:
    """Points that miss the tolerance, once more with corrected subspaces."""
    places = np.nonzero(~plane.accepts(found[0], found[1]))
    jobs = point_parts(plane, frames.vectors, _weights(plane, frames), (places[0], places[1]), frames.groups)
    for points, better in in_parallel(partial(_solved, plane, frames), jobs):
        for array, new in zip(found, better, strict=True):
            np.asarray(array)[places[0][points], places[1][points]] = new


def _weights(plane: Plane, frames: _Frames) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    first, second = (
        lagrange_matrix(nodes, axis) if len(axis) == 1 else lagrange_matrix(*_stretched(nodes, axis))
        for nodes, axis in zip(frames.nodes, plane.axes, strict=True)
    )
    return first, second


def _stretched(
    nodes: NDArray[np.float64], axis: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Square roots of a positive parameter: subspaces bend most near 0 (measured in t and in z)."""
    return (np.sqrt(nodes), np.sqrt(axis)) if axis.min() >= 0 else (nodes, axis)


def _nodes(axis: NDArray[np.float64], count: int) -> NDArray[np.float64]:
    if len(axis) == 1:
        return axis
    if axis.min() >= 0:
        return np.asarray(chebyshev_nodes(np.sqrt(axis.min()), np.sqrt(axis.max()), count) ** 2)
    return chebyshev_nodes(axis.min(), axis.max(), count)


def _solved(plane: Plane, frames: _Frames, job: PartJob) -> tuple[slice, Levels]:
    part = job()
    groups = [
        pencil_levels(part.vectors[:, group], part.images[:, group], part.beyond[:, group], part.dual)
        for group in frames.groups
    ]
    levels = np.concatenate([group.values for group in groups])
    radii = group_radii(groups, part.margins, frames.rest * np.abs(levels[-1])).T
    levels = np.ascontiguousarray(levels.T)
    order = spectral_order(levels)
    levels, radii = (np.take_along_axis(array, order, axis=1) for array in (levels, radii))
    leading, radius = levels[:, : plane.levels], radii[:, : plane.levels]
    verdicts = verdict_codes(leading, radius, levels, part.real, part.hermitian)
    return part.points, (leading, radius, verdicts)


def _node_count(plane: Plane, axis: int) -> int | None:
    """Nodes needed along an axis, from the middle line of the plane; None where too many are."""
    line = plane.axes[axis]
    if len(line) <= 3:
        return len(line)
    most = min(NODES, len(line))
    middle = plane.axes[1 - axis][len(plane.axes[1 - axis]) // 2 :][:1]
    axes = (line, middle) if axis == 0 else (middle, line)
    frames = _frames(replace(plane, axes=axes), (most, 1) if axis == 0 else (1, most))
    if frames is None:
        return None
    decay = chebyshev_decay(frames.vectors if axis == 0 else frames.vectors[0])
    small = np.flatnonzero(decay < SMOOTH)
    if small.size:
        return int(max(small[0], 3))
    return most if most == len(line) or decay[-1] < BEND else None


def _frames(plane: Plane, counts: tuple[int, int]) -> _Frames | None:
    nodes = tuple(_nodes(axis, count) for axis, count in zip(plane.axes, counts, strict=True))
    first, second = (grid.reshape(-1) for grid in np.meshgrid(*nodes, indexing="ij"))
    parts = split(len(first), LEAST_NODES)
    found = list(in_parallel(lambda part: _at_nodes(plane, first[part], second[part]), parts))
    known = [part for part in found if part is not None]
    if len(known) < len(found):
        return None
    values, right = (np.concatenate(part) for part in zip(*(part[:2] for part in known), strict=True))
    real = all(part[2] for part in known)
    groups, rest = _groups(np.abs(values), plane.levels)
    if not groups:
        return None
    rows = [_in_gauge(right[:, :, group], real) for group in groups]
    if any(row is None for row in rows):
        return None
    vectors = np.concatenate([row for row in rows if row is not None], axis=1)
    vectors = np.ascontiguousarray(vectors).reshape(len(nodes[0]), len(nodes[1]), *vectors.shape[1:])
    return _Frames((nodes[0], nodes[1]), vectors, groups, rest)


def _at_nodes(
    plane: Plane, first: NDArray[np.float64], second: NDArray[np.float64]
) -> tuple[NDArray[Any], NDArray[Any], bool] | None:
    """Leading eigenvalues, right vectors, whether T is real; None where left vectors do not follow."""
    batch = plane.batch(first, second)
    return (*batch.leading(plane.levels + EXTRA), batch.real) if batch.mirrored else None


def _groups(sizes: NDArray[np.float64], levels: int) -> tuple[tuple[slice, ...], float]:
    """Slices of levels separated by gaps at every node, up to the first gap at or after ``levels``."""
    most = min(levels + EXTRA, sizes.shape[1] - 1)
    with np.errstate(divide="ignore", invalid="ignore"):
        ratios = np.nan_to_num(sizes[:, 1 : most + 1] / sizes[:, :most], nan=1.0).max(axis=0)
    ends = [place + 1 for place in range(most) if ratios[place] < GAP]
    last = next((end for end in ends if end >= levels), None)
    if last is None:
        return (), np.inf
    bounds = [0, *(end for end in ends if end <= last)]
    return tuple(slice(a, b) for a, b in pairwise(bounds)), float(ratios[last - 1])


def _in_gauge(right: NDArray[Any], real: bool) -> NDArray[Any] | None:
    """Subspace bases with Qᴴ V = 1 for one Q, as rows (nodes, s, n); None where that is ill-conditioned."""
    gauge = _orthonormal(right[len(right) // 2], real)
    overlap = gauge.conj().T @ right
    if not np.isfinite(overlap).all() or np.linalg.cond(overlap).max() > 1e9:
        return None
    frames = right @ np.linalg.inv(overlap)
    return np.swapaxes(frames.real if real else frames, 1, 2)


def _orthonormal(vectors: NDArray[Any], real: bool) -> NDArray[Any]:
    """Orthonormal basis of a span of eigenvectors, real where T is."""
    count = vectors.shape[1]
    if real and np.iscomplexobj(vectors):
        vectors = np.concatenate([vectors.real, vectors.imag], axis=1)
    return np.linalg.svd(vectors, full_matrices=False)[0][:, :count]
