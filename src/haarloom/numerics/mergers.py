"""Where two real levels merge into a complex pair along a line: found on a grid, then by Newton's method."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.exceptions import ParameterError
from haarloom.numerics.batch import truncate_batch
from haarloom.numerics.bordered import BorderedPoint, Borders, bordered_point, unit
from haarloom.numerics.cutoff import automatic_truncation
from haarloom.numerics.path_levels import excited_branches, solved_stack, solver_between
from haarloom.numerics.truncation import truncate

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["SAMPLES", "FloatMerger", "MatrixFamily", "mergers_on", "sufficient_cutoff"]

STEP = 1e-4
"""Relative step of differences: a fourth order formula then errs by some 1e-12, from rounding alone."""

NOISE = 1e-9
"""Relative steps below this that no longer shrink are rounding: an ill-conditioned pair gets no better."""

SAMPLES = 65
"""Points of the grid on which a line is first looked at."""

FINER = 9
"""Points of the finer grid on a cell in which Newton's method fails."""

SAME, PLAIN = 1e-9, 1e4
"""Levels that agree to the first, with condition numbers below the second, cross and do not merge."""


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

    def matrices(self, places: NDArray[np.float64]) -> NDArray[Any]:
        """T at points of shape (M, P), one column for each name: shape (M, n, n)."""
        values = dict(zip(self.names, places.T, strict=True))
        if self.model.link.diagonal:
            single = {name: np.array([number]) for name, number in self.fixed.items()}
            return truncate_batch(self.model, self.cutoff, {**single, **values}).matrix
        points = [dict(zip(self.names, place, strict=True)) for place in places.tolist()]
        return np.array(
            [truncate(self.model, self.cutoff, {**self.fixed, **point}).dense for point in points]
        )

    def around(self, point: Sequence[float]) -> tuple[NDArray[Any], list[NDArray[Any]]]:
        """T, shape (n, n), and ∂T/∂p for each parameter: differences of fourth order."""
        count = len(point)
        steps = np.diag([STEP * max(abs(value), 1e-3) for value in point])
        places = np.asarray(point, dtype=float) + np.vstack(
            [np.zeros(count), steps, -steps, 2 * steps, -2 * steps]
        )
        matrices = self.matrices(places)
        up, down, far_up, far_down = matrices[1:].reshape(4, count, *matrices.shape[1:])
        slopes = (8 * (up - down) - (far_up - far_down)) / (12 * steps.diagonal()[:, None, None])
        return matrices[0], list(slopes)


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
    cutoff
        Of the basis.
    """

    level: int
    value: float
    eigenvalue: float
    bordered: BorderedPoint
    cutoff: int

    def same(self, other: FloatMerger) -> bool:
        """Whether it is the other one found again."""
        near = np.isclose((self.value, self.eigenvalue), (other.value, other.eigenvalue), rtol=NOISE, atol=0)
        return bool(near.all())


def sufficient_cutoff(model: RingModel, points: Sequence[Mapping[str, Any]], levels: int) -> int:
    """Largest of the automatic cutoffs at some points."""
    return max(automatic_truncation(model, levels, point, 1e-12)[0].cutoff for point in points)


def mergers_on(
    family: MatrixFamily, line: NDArray[np.float64], levels: int, depth: int = 3
) -> Iterator[tuple[float, FloatMerger | None]]:
    """Mergers on a line: where each is, and the merger, or None where Newton's method does not settle.

    A cell of the grid in which it fails is cut finer, ``depth`` times. The same merger may come twice.

    Parameters
    ----------
    line
        Grid of the only parameter of the family, shape (M,).
    levels
        Leading levels that are looked at.

    Raises
    ------
    ParameterError
        If T is not real.
    """
    for guess in _guesses(family, line, levels):
        merger = _settled(family, guess)
        if merger is not None:
            yield merger.value, merger
        elif depth:
            yield from mergers_on(family, np.linspace(*guess.cell, FINER), levels, depth - 1)
        else:
            yield guess.value, None


@dataclass(frozen=True, eq=False)
class _Guess:
    """A change between real and complex in one cell of a grid, and where Newton's method starts."""

    level: int
    cell: tuple[float, float]
    value: float
    eigenvalue: float
    borders: Borders


def _guesses(family: MatrixFamily, line: NDArray[np.float64], levels: int) -> Iterator[_Guess]:
    """Changes between real and complex along a line, in order of the parameter."""
    (name,) = family.names
    matrices = family.matrices(line[:, None])
    if np.iscomplexobj(matrices):
        raise ParameterError(
            "T is not real at these values, so that its levels do not merge into conjugate pairs: "
            "give real parameters."
        )
    eigenvalues, right, left = solved_stack(matrices)
    condition = np.linalg.norm(right, axis=1) * np.linalg.norm(left, axis=1)
    count = min(levels + 2, eigenvalues.shape[1])
    between = solver_between(family.model, family.cutoff, family.fixed, name, line)
    order = excited_branches(zip(eigenvalues, right, left, strict=True), count, between)
    followed = np.take_along_axis(eigenvalues, order, axis=1)
    paired = np.imag(followed) != 0
    for step, column in zip(*np.nonzero(paired[:-1] != paired[1:]), strict=True):
        complex_side = step if paired[step, column] else step + 1
        real_side = 2 * step + 1 - complex_side
        one = followed[complex_side, column]
        other = int(np.argmin(np.abs(followed[complex_side] - np.conj(one))))
        places = order[complex_side, [column, other]]
        if other <= column or places.min() >= levels:
            continue
        apart = followed[real_side, column] - followed[real_side, other]
        if abs(apart) < SAME * abs(one) and condition[real_side, order[real_side, column]] < PLAIN:
            continue  # equal levels with vectors of their own, as at z = 0: nothing coalesces
        inside, outside = (one - np.conj(one)) ** 2, apart**2
        share = float(np.clip(np.real(inside / (inside - outside)), 0, 1))
        vectors = [side[complex_side, :, places[0]] for side in (left, right)]
        yield _Guess(
            level=int(places.min()),
            cell=(float(line[step]), float(line[step + 1])),
            value=float(line[complex_side] + share * (line[real_side] - line[complex_side])),
            eigenvalue=float(one.real),
            borders=(_real_part(vectors[0]), _real_part(vectors[1])),
        )


def _real_part(vector: NDArray[Any]) -> NDArray[np.float64]:
    """Real part, of norm 1, once the largest component is turned to the real axis."""
    largest = vector[np.argmax(np.abs(vector))]
    return unit(np.real(vector * (np.conj(largest) / abs(largest))))


def _settled(family: MatrixFamily, guess: _Guess) -> FloatMerger | None:
    """Newton's method on (g, g_λ) = 0 for (λ, p); None if it does not settle inside the cell."""
    value, eigenvalue, borders, before = guess.value, guess.eigenvalue, guess.borders, np.inf
    low, high = sorted(guess.cell)
    for _ in range(30):
        try:
            bordered = bordered_point(*family.around([value]), eigenvalue, borders)
            step = np.linalg.solve(bordered.jacobian, -bordered.residual)
        except np.linalg.LinAlgError:
            return None
        shrink = min(1.0, (high - low) / max(abs(step[1]), 1e-300))
        eigenvalue, value = eigenvalue + shrink * step[0], value + shrink * step[1]
        borders = (unit(bordered.left), unit(bordered.right))
        length = abs(step[1]) / max(abs(value), 1e-3)
        if length <= 4e-15 or before / 2 < length < NOISE:
            slack = NOISE * max(abs(value), 1e-3)
            if not low - slack <= value <= high + slack:
                return None
            return FloatMerger(guess.level, float(value), float(eigenvalue), bordered, family.cutoff)
        if not low - (high - low) <= value <= high + (high - low):
            return None
        before = length
    return None
