"""Exceptional points: where two levels merge, to full precision, with a proven bracket."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from math import ceil, floor, log
from typing import TYPE_CHECKING, Any

import flint
import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.exceptions import ConvergenceError, ParameterError
from haarloom.numerics.ball_truncation import ball_truncation
from haarloom.numerics.balls import as_exact, exact_text, precision
from haarloom.numerics.certify import IRREP_LIMIT, attempt
from haarloom.numerics.cutoff import checked_levels
from haarloom.numerics.mergers import (
    FloatMerger,
    MatrixFamily,
    merger_guesses,
    newton_merger,
    sufficient_cutoff,
)
from haarloom.numerics.parameters import checked_values, parameter_names, plain_numbers
from haarloom.numerics.threads import single_threaded

if TYPE_CHECKING:
    from haarloom.algebra.irrep import Irrep
    from haarloom.ring.model import RingModel

__all__ = ["ExceptionalPoint", "exceptional_point", "exceptional_points"]


@dataclass(frozen=True, eq=False)
class ExceptionalPoint:
    """Two levels that merge along a line.

    Near it λ − λ* ≈ ±√(q (p − p*)): a complex pair where q (p − p*) < 0.

    Attributes
    ----------
    parameter, values
        What varies, and the exact values of the others.
    level
        Position of the pair among the masses: 1 if the two lowest ones merge.
    value
        p*, a fraction, correct to ``digits`` decimal places.
    bracket
        Two fractions around p*; with ``proven`` the untruncated T has a complex pair at one end, two
        real levels at the other and hence a merger between.
    eigenvalue, square_root_coefficient
        λ* and q.
    vector
        The coalescing right eigenvector, unit norm, shape (n,).
    cutoff
        Of the basis that was used.
    """

    model: RingModel
    parameter: str
    values: Mapping[str, Any]
    level: int
    value: Fraction
    bracket: tuple[Fraction, Fraction]
    proven: bool
    digits: int
    eigenvalue: float
    square_root_coefficient: float
    vector: NDArray[np.float64] = field(repr=False)
    cutoff: int

    @property
    def basis(self) -> tuple[Irrep, ...]:
        """Irreps of the components of ``vector``."""
        return tuple(self.model.group.irreps(self.cutoff))

    def __repr__(self) -> str:
        kind = "proven" if self.proven else "not proven"
        low, high = (exact_text(end) for end in self.bracket)
        return (
            f"ExceptionalPoint: levels {self.level} and {self.level + 1} merge at {self.parameter} in "
            f"[{low}, {high}] ({kind}); λ* = {self.eigenvalue:.12g}, "
            f"λ − λ* ≈ ±√({self.square_root_coefficient:.6g} ({self.parameter} − {self.parameter}*))"
        )


@single_threaded
def exceptional_points(
    model: RingModel,
    parameter: str,
    between: tuple[Any, Any],
    levels: int = 4,
    samples: int = 65,
    **values: Any,
) -> tuple[FloatMerger, ...]:
    """All mergers among the leading levels on a line that a grid of samples shows, in double precision.

    Parameters
    ----------
    parameter, between
        The line: name and two ends.
    levels
        Leading levels that are looked at, the ground level included.
    samples
        Grid points; two mergers between neighbouring points go unseen.
    **values
        One number for each other parameter.

    Raises
    ------
    ParameterError
        For an unknown parameter or an empty interval.
    """
    start, stop, fixed = _line(model, parameter, between, values)
    count = checked_levels(levels)
    cutoff = sufficient_cutoff(model, [{**fixed, parameter: end} for end in (start, stop)], count)
    family = MatrixFamily(model, cutoff, (parameter,), fixed)
    line = np.linspace(start, stop, samples)
    width = (stop - start) / (samples - 1)
    found = [
        newton_merger(family, *guess, 2 * width, lambda p: start - width <= p <= stop + width)
        for guess in merger_guesses(family, line, count)
    ]
    return tuple(sorted(found, key=lambda merger: (merger.value, merger.level)))


@single_threaded
def exceptional_point(
    model: RingModel,
    parameter: str,
    between: tuple[Any, Any],
    level: int = 1,
    digits: int = 15,
    prove: bool = True,
    **values: Any,
) -> ExceptionalPoint:
    """The first merger of one level on a line, to any number of digits, with a proven bracket.

    Parameters
    ----------
    parameter, between
        The line: name and two ends.
    level
        Which pair: 1 for the two lowest masses.
    digits
        Decimal places of p*; the bracket is one unit of the last of them.
    prove
        Whether to certify both ends of the bracket on the untruncated T.
    **values
        Exact numbers for the other parameters (a float counts as the decimal that Python prints).

    Raises
    ------
    ConvergenceError
        If no merger of this level lies between the ends.
    ParameterError
        For an unknown parameter or an empty interval.
    """
    exact = {name: as_exact(name, value) for name, value in values.items()}
    plain: dict[str, Any] = {
        name: float(value) if isinstance(value, Fraction) else value for name, value in exact.items()
    }
    candidates = exceptional_points(model, parameter, between, level + 2, **plain)
    mine = [merger for merger in candidates if merger.level == level]
    if not mine:
        seen = ", ".join(f"level {m.level} at {m.value:.6g}" for m in candidates) or "none at all"
        raise ConvergenceError(
            f"level {level} merges with the next one nowhere for {parameter} between {between[0]} and "
            f"{between[1]} (mergers seen: {seen}): widen the interval, or ask for another level."
        )
    merger = mine[0]
    cutoff = sufficient_cutoff(model, [{**plain, parameter: merger.value}], level + 2) + 1
    result = None
    while True:
        value = _refined(model, parameter, exact, merger, cutoff, digits)
        result = _bracketed(model, parameter, exact, merger, value, cutoff, digits, prove)
        cutoff += 2
        if result.proven or not prove or count_up_to(model.group.rank, cutoff) > IRREP_LIMIT:
            return result


def _line(
    model: RingModel, parameter: str, between: tuple[Any, Any], values: Mapping[str, Any]
) -> tuple[float, float, dict[str, Any]]:
    if parameter not in parameter_names(model):
        raise ParameterError(
            f"{parameter!r} is no parameter of this model, which has "
            f"{', '.join(parameter_names(model)) or 'none'}."
        )
    start, stop = (float(plain_end(parameter, end)) for end in between)
    if not start < stop:
        raise ParameterError(f"between = {between!r} is empty: give the smaller end first.")
    fixed = plain_numbers(checked_values(model, {**values, parameter: start}))
    fixed.pop(parameter)
    return start, stop, fixed


def plain_end(parameter: str, end: Any) -> Fraction:
    """An end of a line as an exact real number."""
    exact = as_exact(parameter, end)
    if not isinstance(exact, Fraction):
        raise ParameterError(f"{parameter} = {end!r} is no end of a line: give a real number.")
    return exact


def _refined(
    model: RingModel, parameter: str, exact: Mapping[str, Any], merger: FloatMerger, cutoff: int, digits: int
) -> Fraction:
    """p* on one truncated basis to the wanted digits: Newton's method with Arb's numbers."""
    bits = ceil(digits * log(10, 2)) * 2 + 128
    with precision(bits):
        value, level = flint.arb(merger.value), flint.arb(merger.eigenvalue)
        column, row = (
            _padded(merger.bordered.left, cutoff, model),
            _padded(merger.bordered.right, cutoff, model),
        )
        goal = flint.arb(10) ** (-digits - 6)
        for _ in range(40):
            step_level, step_value = _newton_step(model, parameter, exact, cutoff, value, level, column, row)
            value, level = (value + step_value).mid(), (level + step_level).mid()
            if abs(step_value) < goal:
                return _as_fraction(value)
    raise ConvergenceError(
        f"Newton's method at {digits} digits did not settle near {parameter} = {merger.value:.6g}: "
        "three levels may be close to merging there."
    )


def _padded(vector: NDArray[Any], cutoff: int, model: RingModel) -> list[Any]:
    size = count_up_to(model.group.rank, cutoff)
    numbers = np.zeros(size)
    shared = min(size, len(vector))
    numbers[:shared] = np.real(vector[:shared])
    return (numbers / np.linalg.norm(numbers)).tolist()


def _newton_step(
    model: RingModel,
    parameter: str,
    exact: Mapping[str, Any],
    cutoff: int,
    value: Any,
    level: Any,
    column: list[Any],
    row: list[Any],
) -> tuple[Any, Any]:
    """(δλ, δp) from the bordered system, the slope of T by a central difference in the working precision."""
    offset = Fraction(1, 2 ** (flint.ctx.prec // 3))
    here = _as_fraction(value)
    matrix, above, below = (
        ball_truncation(model, cutoff, {**exact, parameter: here + shift}).matrix.mid()
        for shift in (Fraction(0), offset, -offset)
    )
    size = matrix.nrows()
    slope = (above - below) * flint.acb(flint.fmpq(1, 2 * offset.numerator) * offset.denominator)
    whole = flint.acb_mat(size + 1, size + 1)
    for i, line in enumerate(matrix.table()):
        for j, entry in enumerate(line):
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


def _as_fraction(number: Any) -> Fraction:
    mantissa, exponent = number.mid().man_exp()
    return Fraction(int(mantissa)) * Fraction(2) ** int(exponent)


def _bracketed(
    model: RingModel,
    parameter: str,
    exact: Mapping[str, Any],
    merger: FloatMerger,
    value: Fraction,
    cutoff: int,
    digits: int,
    prove: bool,
) -> ExceptionalPoint:
    unit = Fraction(1, 10**digits)
    low, high = floor(value / unit) * unit, ceil(value / unit) * unit
    proven = prove and _changes_between(model, parameter, exact, merger.level, (low, high), cutoff, digits)
    bordered = merger.bordered
    return ExceptionalPoint(
        model=model,
        parameter=parameter,
        values=dict(exact),
        level=merger.level,
        value=value,
        bracket=(low, high),
        proven=proven,
        digits=digits,
        eigenvalue=merger.eigenvalue,
        square_root_coefficient=float(bordered.square_root_coefficient[0]),
        vector=bordered.right / np.linalg.norm(bordered.right),
        cutoff=_cutoff_of(model, len(bordered.right)),
    )


def _cutoff_of(model: RingModel, size: int) -> int:
    cutoff = 0
    while count_up_to(model.group.rank, cutoff) < size:
        cutoff += 1
    return cutoff


def _changes_between(
    model: RingModel,
    parameter: str,
    exact: Mapping[str, Any],
    level: int,
    ends: tuple[Fraction, Fraction],
    cutoff: int,
    digits: int,
) -> bool:
    """Whether the pair is proven complex at one end and real at the other.

    Between them the two eigenvalues move continuously inside a disc that holds no third one, shown on
    the whole bracket at once; going from the axis to a pair they must meet.
    """
    bits = 2 * ceil(digits * log(10, 2)) + 96
    verdicts = [
        {
            found.verdict
            for found in attempt(model, {**exact, parameter: end}, level + 2, cutoff, bits).levels[level:]
        }
        for end in ends
    ]
    if {frozenset(v) for v in verdicts} != {frozenset({"real"}), frozenset({"complex pair"})}:
        return False
    from haarloom.numerics.balls import Interval

    across = attempt(model, {**exact, parameter: Interval(*ends)}, level + 2, cutoff, bits)
    return all(found.count == 2 for found in across.levels[level:])
