"""Warm starts: invariant subspaces interpolated from neighbouring points, every residual checked.

Leading levels are grouped where |λ| drops clearly at every node of a patch. The invariant subspace of
a group varies smoothly as long as the group stays apart from the others, through mergers inside it as
well. It is computed densely at Chebyshev nodes, put into one gauge, and interpolated. At every point
the pencil (Vᵀ ΦJ T V, Vᵀ ΦJ V) of all groups is decoupled into one block for each, which gives its
levels: because ΦJ maps right onto left vectors, the error of an eigenvalue is of second order in that
of the subspace. A group of one or two levels needs no eigen-solver at all. Points that miss the
tolerance are corrected (:mod:`haarloom.numerics.corrections`), and solved densely if that is not enough.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import partial
from itertools import pairwise
from math import ceil
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.group_levels import group_numbers, group_radii
from haarloom.numerics.interpolation import chebyshev_decay, chebyshev_nodes, lagrange_matrix
from haarloom.numerics.labels import conjugation
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

SMOOTH = 3e-9
"""Interpolation error of a subspace that is aimed at: its square is lost in rounding."""

BEND = 1e-7
"""Estimated error of an interpolated subspace from which on it is not evaluated."""

MARGIN = 1
"""Nodes beyond that estimate."""

SPREAD = 1.25
"""How much the resolvent of the levels left out may grow between the points at which it is measured."""

FEW_NODES = 9
"""Nodes from which the number that is needed along an axis is estimated."""

FAR = 0.25
"""Smallest over largest value of an axis from which on it counts as away from zero."""

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
    swell
        How much larger the resolvent of the levels left out is, at a leading level, than that of a
        normal matrix with the same levels; measured at some nodes.
    """

    nodes: tuple[NDArray[np.float64], NDArray[np.float64]]
    vectors: NDArray[Any]
    groups: tuple[slice, ...]
    rest: float
    swell: float = 1.0


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
    frames = replace(frames, swell=_swell(plane, frames))
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
        lagrange_matrix(_stretched(nodes, axis), _stretched(axis, axis))
        for nodes, axis in zip(frames.nodes, plane.axes, strict=True)
    )
    return first, second


def _nodes(axis: NDArray[np.float64], count: int) -> NDArray[np.float64]:
    if len(axis) == 1:
        return axis
    ends = _stretched(axis[[0, -1]], axis)
    nodes = chebyshev_nodes(ends.min(), ends.max(), count)
    return np.exp(nodes) if _logarithmic(axis) else nodes


def _stretched(numbers: NDArray[np.float64], axis: NDArray[np.float64]) -> NDArray[np.float64]:
    """The variable in which subspaces are interpolated along an axis."""
    return np.log(numbers) if _logarithmic(axis) else numbers


def _logarithmic(axis: NDArray[np.float64]) -> bool:
    """Away from zero ln t and ln z need fewer nodes than t and z, near zero more (measured)."""
    low, high = sorted((float(axis[0]), float(axis[-1])))
    return low > FAR * high > 0


def _solved(plane: Plane, frames: _Frames, job: PartJob) -> tuple[slice, Levels]:
    part = job()
    groups = group_numbers(part.vectors, part.images, part.beyond, part.dual, frames.groups)
    levels = np.concatenate([group.values for group in groups])
    radii = group_radii(groups, part.margins, frames.rest * np.abs(levels[-1]), frames.swell).T
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
    few = min(FEW_NODES, len(line))
    middle = plane.axes[1 - axis][len(plane.axes[1 - axis]) // 2 :][:1]
    axes = (line, middle) if axis == 0 else (middle, line)
    frames = _frames(replace(plane, axes=axes), (few, 1) if axis == 0 else (1, few))
    if frames is None:
        return None
    decay = chebyshev_decay(frames.vectors if axis == 0 else frames.vectors[0])
    small = np.flatnonzero(decay < SMOOTH)
    if small.size:
        return int(max(small[0], 3))
    # the coefficients of an analytic function fall geometrically
    fall = np.log(decay[few // 2] / decay[-1]) / (few - 1 - few // 2)
    most = min(NODES, len(line))
    if most > few and fall * (most - few) < np.log(decay[-1] / BEND):
        return None
    return min(most, few + MARGIN + ceil(np.log(decay[-1] / SMOOTH) / fall)) if fall > 0 else most


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


def _swell(plane: Plane, frames: _Frames) -> float:
    """The largest ‖(λ − T)⁻¹‖ (|λ| − rest) on what the groups leave out, at corners and in the middle.

    The inverse restricted to it is the upper left block of the inverse of the bordered matrix of
    :mod:`haarloom.numerics.corrections`. Infinite where that is singular: a level of one group meets one
    of another, and nothing can be said.
    """
    ends = [np.array([0, len(nodes) // 2, len(nodes) - 1]) for nodes in frames.nodes]
    rows, columns = ends[0][[0, 0, 1, 2, 2]], ends[1][[0, 2, 1, 0, 2]]
    batch = plane.batch(frames.nodes[0][rows], frames.nodes[1][columns])
    basis = np.swapaxes(frames.vectors[rows, columns], 1, 2)
    points, size, count = basis.shape
    mirror = conjugation(plane.model.group.rank, plane.cutoff)
    partner = np.swapaxes(batch.phase[:, :size, None] * basis[:, mirror], 1, 2)
    try:
        block = np.linalg.solve(partner @ basis, partner @ (batch.matrix @ basis))
        levels: NDArray[Any] = np.linalg.eigvals(block)
        levels = np.take_along_axis(levels, np.argsort(-np.abs(levels), axis=1), axis=1)
        leading = levels[:, : plane.levels]
        kind = np.result_type(batch.matrix, leading)
        bordered = np.zeros((points, leading.shape[1], size + count, size + count), dtype=kind)
        bordered[:, :, :size, :size] = batch.matrix[:, None] - leading[:, :, None, None] * np.eye(size)
        bordered[:, :, :size, size:] = basis[:, None]
        bordered[:, :, size:, :size] = partner[:, None]
        inverse = np.linalg.inv(bordered)[:, :, :size, :size]
        norms = np.linalg.norm(inverse, 2, axis=(2, 3))
    except np.linalg.LinAlgError:
        return np.inf
    reach = float((norms * (np.abs(leading) - frames.rest * np.abs(levels[:, -1:]))).max())
    return max(1.0, SPREAD * reach) if np.isfinite(reach) else np.inf


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
