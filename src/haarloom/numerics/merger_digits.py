"""A merger to any number of digits: Newton's method on the bordered system with Arb's numbers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from math import ceil, log
from typing import TYPE_CHECKING, Any

import flint
import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.exceptions import ConvergenceError
from haarloom.numerics.ball_truncation import ball_truncation
from haarloom.numerics.balls import precision
from haarloom.numerics.mergers import FloatMerger

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["ExactLine", "bits_for", "refined"]


@dataclass(frozen=True, eq=False)
class ExactLine:
    """A line through the parameters: the name of what varies, and exact values of the others."""

    model: RingModel
    parameter: str
    fixed: Mapping[str, Any]

    def at(self, value: Any) -> dict[str, Any]:
        """All values at a point of the line, or on an interval of it."""
        return {**self.fixed, self.parameter: value}


def bits_for(digits: int) -> int:
    """Working precision: a merger is a double root, which costs half of it."""
    return 2 * ceil(digits * log(10, 2)) + 128


def refined(line: ExactLine, merger: FloatMerger, cutoff: int, digits: int) -> Fraction:
    """p* on one truncated basis.

    Parameters
    ----------
    merger
        Where to start.
    digits
        Decimal places.

    Raises
    ------
    ConvergenceError
        If Newton's method does not settle.
    """
    with precision(bits_for(digits)):
        value, level = flint.arb(merger.value), flint.arb(merger.eigenvalue)
        size = count_up_to(line.model.group.rank, cutoff)
        borders = [_fitted(vector, size) for vector in (merger.bordered.left, merger.bordered.right)]
        goal = flint.arb(10) ** (-digits - 6)
        for _ in range(40):
            step_level, step_value = _newton_step(line, cutoff, value, level, *borders)
            value, level = (value + step_value).mid(), (level + step_level).mid()
            if abs(step_value) < goal:
                return _as_fraction(value)
    raise ConvergenceError(
        f"Newton's method at {digits} digits did not settle near {line.parameter} = {merger.value:.6g}: "
        "three levels may be close to merging there."
    )


def _fitted(vector: NDArray[Any], size: int) -> list[float]:
    """A vector on another basis, cut off or with zeros behind it, of norm 1."""
    numbers = np.zeros(size)
    shared = min(size, len(vector))
    numbers[:shared] = np.real(vector[:shared])
    return (numbers / np.linalg.norm(numbers)).tolist()


def _newton_step(
    line: ExactLine, cutoff: int, value: Any, level: Any, column: list[float], row: list[float]
) -> tuple[Any, Any]:
    """(δλ, δp) from the bordered system, the slope of T by a central difference in the working precision."""
    matrix, slope = _with_slope(line, cutoff, _as_fraction(value))
    size = matrix.nrows()
    whole = flint.acb_mat(size + 1, size + 1)
    for i, entries in enumerate(matrix.table()):
        for j, entry in enumerate(entries):
            whole[i, j] = entry - level if i == j else entry
        whole[i, size], whole[size, i] = column[i], row[i]
    inverse = whole.mid().inv().mid()
    x = flint.acb_mat(size, 1, [inverse[i, size] for i in range(size)])
    w = flint.acb_mat(1, size, [inverse[size, i] for i in range(size)])
    inner = flint.acb_mat(size, size, [inverse[i, j] for i in range(size) for j in range(size)])
    sx, ws = slope * x, w * slope
    g, g_level, g_value = inverse[size, size], (w * x)[0, 0], -(w * sx)[0, 0]
    g_second = 2 * (w * inner * x)[0, 0]
    g_mixed = -(ws * inner * x)[0, 0] - (w * inner * sx)[0, 0]
    determinant = g_level * g_mixed - g_value * g_second
    step_level = (-g * g_mixed + g_level * g_value) / determinant
    step_value = (-g_level * g_level + g * g_second) / determinant
    return step_level.real.mid(), step_value.real.mid()


def _with_slope(line: ExactLine, cutoff: int, place: Fraction) -> tuple[Any, Any]:
    """T and ∂T/∂p without radii."""
    offset = Fraction(1, 2 ** (flint.ctx.prec // 3))
    matrix, above, below = (
        ball_truncation(line.model, cutoff, line.at(place + shift)).matrix.mid()
        for shift in (Fraction(0), offset, -offset)
    )
    return matrix, (above - below) * flint.acb(flint.fmpq(offset.denominator, 2 * offset.numerator))


def _as_fraction(number: Any) -> Fraction:
    mantissa, exponent = number.mid().man_exp()
    return Fraction(int(mantissa)) * Fraction(2) ** int(exponent)
