"""Where two real levels merge into a complex pair along a line: found on a grid, then by Newton's method."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.exceptions import ConvergenceError
from haarloom.numerics.batch import truncate_batch
from haarloom.numerics.bordered import BorderedPoint, bordered_point
from haarloom.numerics.cutoff import automatic_truncation
from haarloom.numerics.ordering import masses_from
from haarloom.numerics.tracking import tracked

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["FloatMerger", "MatrixFamily", "merger_guesses", "newton_merger", "sufficient_cutoff"]

STEP = 1e-6
"""Relative step of central differences: their error, 1e-12, only slows Newton's method down."""


@dataclass(frozen=True)
class MatrixFamily:
    """T and its slopes as functions of some parameters, the others held fixed.

    Attributes
    ----------
    names
        Parameters that vary.
    fixed
        Values of the others.
    """

    model: RingModel
    cutoff: int
    names: tuple[str, ...]
    fixed: Mapping[str, Any]

    def around(self, point: Sequence[float]) -> tuple[NDArray[Any], list[NDArray[Any]]]:
        """T, shape (n, n), and ∂T/∂p for each parameter by central differences."""
        count = len(point)
        steps = [STEP * max(abs(value), 1e-3) for value in point]
        shifts = np.vstack([np.zeros(count), np.diag(steps), -np.diag(steps)])
        places = np.asarray(point, dtype=float) + shifts
        values = {name: np.array([number]) for name, number in self.fixed.items()}
        values |= dict(zip(self.names, places.T, strict=True))
        matrices = truncate_batch(self.model, self.cutoff, values).matrix
        spread = (places[1 : count + 1] - places[count + 1 :]).diagonal()
        slopes = [(matrices[1 + i] - matrices[1 + count + i]) / spread[i] for i in range(count)]
        return matrices[0], slopes


@dataclass(frozen=True, eq=False)
class FloatMerger:
    """A point where two levels coalesce, in floating point.

    Attributes
    ----------
    level
        Position of the pair: 1 for the two lowest masses.
    value, eigenvalue
        p* and λ*.
    bordered
        The bordered system there.
    """

    level: int
    value: float
    eigenvalue: float
    bordered: BorderedPoint


def sufficient_cutoff(model: RingModel, points: Sequence[Mapping[str, Any]], levels: int) -> int:
    """Largest of the automatic cutoffs at some points."""
    return max(automatic_truncation(model, levels, point, 1e-12)[0].cutoff for point in points)


def merger_guesses(
    family: MatrixFamily, line: NDArray[np.float64], levels: int
) -> Iterator[tuple[int, float, float, tuple[NDArray[Any], NDArray[Any]]]]:
    """Changes between real and complex along a line: (level, p, λ, borders) for each, in order of p.

    Parameters
    ----------
    line
        Grid of the only parameter of the family, shape (M,).
    levels
        Leading levels that are looked at.
    """
    (name,) = family.names
    values = {key: np.array([number]) for key, number in family.fixed.items()}
    batch = truncate_batch(family.model, family.cutoff, {**values, name: line})
    eigenvalues, right, left = batch.solved()
    count = min(levels + 2, eigenvalues.shape[1])
    order = 1 + tracked(masses_from(eigenvalues[:, :count]))
    followed = np.take_along_axis(eigenvalues, order, axis=1)
    paired = np.imag(followed) != 0
    for step, column in zip(*np.nonzero(paired[:-1] != paired[1:]), strict=True):
        complex_side = step if paired[step, column] else step + 1
        real_side = 2 * step + 1 - complex_side
        one = followed[complex_side, column]
        other = int(np.argmin(np.abs(followed[complex_side] - np.conj(one))))
        level = int(min(order[complex_side, column], order[complex_side, other]))
        if other <= column or level >= levels:
            continue
        inside = (one - np.conj(one)) ** 2
        outside = (followed[real_side, column] - followed[real_side, other]) ** 2
        share = float(np.real(inside / (inside - outside)))
        guess = line[complex_side] + share * (line[real_side] - line[complex_side])
        place = order[complex_side, column]
        borders = tuple(
            _unit(np.real(vectors[complex_side, :, place] * _phase(vectors[complex_side, :, place])))
            for vectors in (left, right)
        )
        yield level, float(guess), float(one.real), (borders[0], borders[1])


def _phase(vector: NDArray[Any]) -> complex:
    """Turns the largest component to the real axis."""
    largest = vector[np.argmax(np.abs(vector))]
    return complex(np.conj(largest) / abs(largest))


def _unit(vector: NDArray[Any]) -> NDArray[Any]:
    return np.asarray(vector / np.linalg.norm(vector))


def newton_merger(
    family: MatrixFamily,
    level: int,
    value: float,
    eigenvalue: float,
    borders: tuple[NDArray[Any], NDArray[Any]],
    largest_step: float,
    allowed: Callable[[float], bool],
) -> FloatMerger:
    """Newton's method on (g, g_λ) = 0 for (λ, p).

    Raises
    ------
    ConvergenceError
        If it does not settle within 30 steps, or leaves the allowed range of p.
    """
    for _ in range(30):
        bordered = bordered_point(*family.around([value]), eigenvalue, borders)
        step = np.linalg.solve(bordered.jacobian, -bordered.residual)
        shrink = min(1.0, largest_step / max(abs(step[1]), 1e-300))
        eigenvalue, value = eigenvalue + shrink * step[0], value + shrink * step[1]
        borders = (_unit(bordered.left), _unit(bordered.right))
        if not allowed(value):
            break
        if abs(step[1]) <= 4e-15 * max(abs(value), 1e-3):
            return FloatMerger(level, float(value), float(eigenvalue), bordered)
    raise ConvergenceError(
        f"Newton's method for a merger near {family.names[0]} = {value:.6g} did not settle: "
        "narrow the interval around the merger, or sample it more finely."
    )
