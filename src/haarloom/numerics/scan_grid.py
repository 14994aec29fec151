"""The points of a scan: axes of any number, cut into chunks that a worker solves by itself."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import product
from math import prod
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.exceptions import ParameterError
from haarloom.numerics.branches import checked_path
from haarloom.numerics.cutoff import checked_levels
from haarloom.numerics.parameters import checked_values, plain_numbers

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["Chunk", "ScanGrid", "scan_grid"]


@dataclass(frozen=True, eq=False)
class ScanGrid:
    """A product of axes.

    Attributes
    ----------
    names, axes
        Parameters and their values, in the order of the result's dimensions.
    fixed
        One number for each other parameter.
    levels, tolerance
        Leading eigenvalues wanted, and the relative error of the masses that is aimed at.
    """

    model: RingModel
    names: tuple[str, ...]
    axes: tuple[NDArray[np.float64], ...]
    fixed: Mapping[str, float | complex]
    levels: int
    tolerance: float

    @property
    def shape(self) -> tuple[int, ...]:
        """Points along each axis."""
        return tuple(len(axis) for axis in self.axes)

    @property
    def points(self) -> int:
        """Number of points."""
        return prod(self.shape)

    @property
    def plane(self) -> tuple[int | None, int]:
        """Axes of the planes that are solved together, (rows, columns); None for no second axis.

        Columns move the site weight alone where some axis does: T is then cheapest to apply.
        """
        lengths = self.shape
        link = {symbol.name for symbol in self.model.link.parameters}
        inner = [axis for axis, name in enumerate(self.names) if name not in link]
        columns = max(inner or range(len(lengths)), key=lambda axis: lengths[axis])
        others = [axis for axis in range(len(lengths)) if axis != columns]
        return (max(others, key=lambda axis: lengths[axis]) if others else None), columns

    def chunks(self, rows_each: int, columns_each: int, skip: NDArray[np.bool_]) -> Iterator[Chunk]:
        """Chunks of at most so many rows and columns that cover every point outside ``skip``."""
        rows, columns = self.plane
        outer = [range(size) for axis, size in enumerate(self.shape) if axis not in (rows, columns)]
        whole = (0, 1 if rows is None else self.shape[rows]), (0, self.shape[columns])
        for place in product(*outer):
            plane = Chunk(tuple(place), *whole)
            wanted = ~skip[plane.index(self)]
            wanted = (wanted.T if plane.turned(self) else wanted).reshape(whole[0][1], whole[1][1])
            for row in _runs(np.asarray(wanted.any(axis=1)), rows_each):
                for column in _runs(np.asarray(wanted[slice(*row)].any(axis=0)), columns_each):
                    yield Chunk(tuple(place), row, column)


def _runs(wanted: NDArray[np.bool_], longest: int) -> Iterator[tuple[int, int]]:
    """Stretches (start, stop) that cover the wanted entries, none longer than allowed."""
    edges = np.flatnonzero(np.diff(np.concatenate([[False], wanted, [False]]).astype(np.int8)))
    for start, stop in edges.reshape(-1, 2).tolist():
        for first in range(start, stop, longest):
            yield first, min(first + longest, stop)


@dataclass(frozen=True)
class Chunk:
    """Part of one plane, at given places on the other axes; ``rows`` and ``columns`` are (start, stop)."""

    place: tuple[int, ...]
    rows: tuple[int, int]
    columns: tuple[int, int]

    @property
    def points(self) -> int:
        """Number of points."""
        return (self.rows[1] - self.rows[0]) * (self.columns[1] - self.columns[0])

    def index(self, grid: ScanGrid) -> tuple[int | slice, ...]:
        """Where the chunk sits in an array of the grid's shape."""
        rows, columns = grid.plane
        rest = iter(self.place)
        return tuple(
            slice(*self.rows) if axis == rows else slice(*self.columns) if axis == columns else next(rest)
            for axis in range(len(grid.axes))
        )

    def turned(self, grid: ScanGrid) -> bool:
        """Whether rows come after columns in the grid's order of axes."""
        rows, columns = grid.plane
        return rows is not None and rows > columns


def scan_grid(model: RingModel, values: Mapping[str, Any], levels: int, tolerance: float) -> ScanGrid:
    """Check the axes of a scan.

    Parameters
    ----------
    values
        Arrays for the axes, single numbers for the other parameters.

    Raises
    ------
    ParameterError
        For no axis at all, an empty or non-monotone one, values that are not finite, or a tolerance
        that is none.
    MissingValueError
        If a parameter is left without values.
    """
    axes = {name: checked_path(name, value) for name, value in values.items() if np.ndim(value) > 0}
    starts = {name: axis[0] for name, axis in axes.items()}
    fixed = plain_numbers(checked_values(model, {**values, **starts}))
    if not axes:
        raise ParameterError(
            "a scan needs at least one axis: give a list or an array for some parameter, "
            "or take model.spectrum(...) for a single point."
        )
    if not 0 < tolerance < 1:
        raise ParameterError(f"tolerance = {tolerance!r} is no relative error: give a number such as 1e-10.")
    # the whole grid is checked once here, so that no worker meets a value outside its domain
    for name, axis in axes.items():
        probe = {**fixed, name: axis}
        model.link.coefficients_at((model.group.trivial,), probe)
        model.site.norm_bound(probe)
    return ScanGrid(
        model,
        tuple(axes),
        tuple(axes.values()),
        {name: number for name, number in fixed.items() if name not in axes},
        checked_levels(levels),
        float(tolerance),
    )
