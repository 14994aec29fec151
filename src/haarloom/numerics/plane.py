"""All points of a rectangle in parameter space on one basis: from warm starts where they hold, or densely."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.batch import TruncationBatch, batch_errors, complete_levels, truncate_batch
from haarloom.numerics.bounds import mass_errors
from haarloom.numerics.threads import in_parallel
from haarloom.numerics.verdicts import verdict_codes

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["Plane", "PlaneLevels", "dense_points", "solve_plane"]

NODES = 16
"""Most nodes along an axis from which subspaces are interpolated."""

FEW_POINTS = 64
"""Points up to which a plane is solved densely."""

ELEMENTS = 500_000
"""Matrix elements in one stack: bounds scratch memory and keeps it in the cache."""

MANY_FAILURES = 0.2
"""Part of the points of a patch that may fail before it is halved."""


@dataclass(frozen=True, eq=False)
class Plane:
    """A rectangle of points on one basis.

    Attributes
    ----------
    names, axes
        Two parameters and their values, shapes (R,) and (C,); an axis of one point makes it a line,
        and then its name may be empty.
    fixed
        The other parameters.
    levels
        Leading levels wanted, the ground level included.
    tolerance
        Relative error of the masses up to which warm starts are accepted.
    """

    model: RingModel
    cutoff: int
    names: tuple[str, str]
    axes: tuple[NDArray[np.float64], NDArray[np.float64]]
    fixed: Mapping[str, Any]
    levels: int
    tolerance: float

    @property
    def shape(self) -> tuple[int, int]:
        """(R, C)."""
        return len(self.axes[0]), len(self.axes[1])

    def halves(self, axis: int | None = None) -> tuple[Plane, Plane]:
        """Two parts, cut across the given axis, or across the one that has more points."""
        rows, columns = self.shape
        if axis is None or self.shape[axis] < 2:
            axis = 0 if rows > columns else 1
        cut = self.shape[axis] // 2
        first, second = self.axes
        if axis == 0:
            return replace(self, axes=(first[:cut], second)), replace(self, axes=(first[cut:], second))
        return replace(self, axes=(first, second[:cut])), replace(self, axes=(first, second[cut:]))

    def values(self, first: NDArray[np.float64], second: NDArray[np.float64]) -> dict[str, NDArray[Any]]:
        """Parameter arrays at a list of points; length one where nothing varies."""
        points = dict(zip(self.names, (_constant(first), _constant(second)), strict=True))
        points.pop("", None)
        return {name: np.atleast_1d(number) for name, number in self.fixed.items()} | points

    def batch(self, first: NDArray[np.float64], second: NDArray[np.float64]) -> TruncationBatch:
        """T at a list of points."""
        return truncate_batch(self.model, self.cutoff, self.values(first, second))

    def stacks(self, points: int) -> list[slice]:
        """Parts of a list of points, each small enough to be solved at once."""
        step = max(16, ELEMENTS // self.model.group.count_irreps(self.cutoff) ** 2)
        return [slice(start, min(start + step, points)) for start in range(0, points, step)]

    def accepts(self, values: NDArray[Any], radius: NDArray[np.float64]) -> NDArray[np.bool_]:
        """Whether every mass of a point is as accurate as wanted; last axis the level."""
        errors = mass_errors(values, radius)
        # |Re m| ≤ |m| decides almost everywhere, without a complex logarithm
        sizes = np.abs(values)
        with np.errstate(divide="ignore", invalid="ignore"):
            decays = np.abs(np.log(sizes[..., 1:] / sizes[..., :1]))
        accepted = np.asarray((errors <= self.tolerance * decays).all(axis=-1))
        open_ = ~accepted
        if open_.any():
            with np.errstate(divide="ignore", invalid="ignore"):
                masses = np.abs(np.log(values[open_][:, 1:] / values[open_][:, :1]))
            accepted[open_] = (errors[open_] <= self.tolerance * masses).all(axis=-1)
        return accepted


@dataclass(frozen=True, eq=False)
class PlaneLevels:
    """Leading levels at every point.

    Attributes
    ----------
    values, radius, verdicts
        Eigenvalues, radii and verdicts (positions in ``VERDICTS``): (R, C, L), (R, C, L), (R, C, L − 1).
    cutoff, dense
        K, and whether the point was solved without a warm start, shape (R, C).
    """

    values: NDArray[np.complex128]
    radius: NDArray[np.float64]
    verdicts: NDArray[np.int8]
    cutoff: NDArray[np.int32]
    dense: NDArray[np.bool_]


def _constant(numbers: NDArray[np.float64]) -> NDArray[np.float64]:
    return numbers[:1] if len(numbers) and (numbers == numbers[0]).all() else numbers


def solve_plane(plane: Plane) -> PlaneLevels:
    """Leading levels at all points of a plane.

    A rectangle on which warm starts fail too often is halved; one with few points to a node is
    solved densely.
    """
    from haarloom.numerics.frames import levels_from_frames
    from haarloom.numerics.plane_cutoff import fitted

    rows, columns = plane.shape
    if rows * columns <= FEW_POINTS:
        first, second = np.repeat(plane.axes[0], columns), np.tile(plane.axes[1], rows)
        values, radius, verdicts = dense_points(plane, first, second)
        shape = (rows, columns, -1)
        everywhere = _marks(plane, np.ones((rows, columns), dtype=bool))
        parts = values.reshape(shape), radius.reshape(shape), verdicts.reshape(shape)
        return PlaneLevels(*parts, *everywhere)
    warm = levels_from_frames(plane)
    if isinstance(warm, tuple):
        values, radius, verdicts = warm
        bad = ~plane.accepts(values, radius)
        if bad.mean() <= MANY_FAILURES:
            places = np.nonzero(bad)
            if len(places[0]):
                found = dense_points(plane, plane.axes[0][places[0]], plane.axes[1][places[1]])
                values[places], radius[places], verdicts[places] = found
            return PlaneLevels(values, radius, verdicts, *_marks(plane, bad))
    halves = plane.halves(warm if isinstance(warm, int) else None)
    return _joined(plane, [solve_plane(fitted(half)) for half in halves])


def _joined(plane: Plane, parts: list[PlaneLevels]) -> PlaneLevels:
    axis = 0 if parts[0].values.shape[0] < plane.shape[0] else 1
    names = ("values", "radius", "verdicts", "cutoff", "dense")
    return PlaneLevels(
        *(np.concatenate([getattr(part, name) for part in parts], axis=axis) for name in names)
    )


def _marks(plane: Plane, dense: NDArray[np.bool_]) -> tuple[NDArray[np.int32], NDArray[np.bool_]]:
    return np.full(plane.shape, plane.cutoff, dtype=np.int32), dense


def dense_points(
    plane: Plane, first: NDArray[np.float64], second: NDArray[np.float64]
) -> tuple[NDArray[Any], NDArray[np.float64], NDArray[np.int8]]:
    """Values, radii and verdicts at a list of points, by LAPACK."""

    def solved(part: slice) -> tuple[NDArray[Any], NDArray[np.float64], NDArray[np.int8]]:
        batch = plane.batch(first[part], second[part])
        values, right, left = batch.solved()
        radius = batch_errors(batch, complete_levels(batch, values, right, left), plane.levels)
        leading = values[:, : plane.levels].astype(complex)
        _look_again(plane, first[part], second[part], leading, radius)
        return leading, radius, verdict_codes(leading, radius, values, batch.real, batch.hermitian)

    found = in_parallel(solved, plane.stacks(len(first)))
    values, radius, verdicts = (np.concatenate(part) for part in zip(*found, strict=True))
    return values, radius, verdicts


def _look_again(
    plane: Plane,
    first: NDArray[np.float64],
    second: NDArray[np.float64],
    leading: NDArray[np.complex128],
    radius: NDArray[np.float64],
) -> None:
    """Points where the bound for single levels fails, near a merger: take the levels that meet together."""
    from haarloom.numerics.bounds import eigenvalue_errors
    from haarloom.numerics.dense import solve_dense
    from haarloom.numerics.truncation import truncate

    for place in np.flatnonzero(~np.isfinite(radius).all(axis=1)):
        point = dict(zip(plane.names, (float(first[place]), float(second[place])), strict=True))
        point.pop("", None)
        truncation = truncate(plane.model, plane.cutoff, {**plane.fixed, **point})
        system = solve_dense(truncation)
        leading[place] = system.values[: plane.levels]
        radius[place] = eigenvalue_errors(truncation, system, plane.levels)
