"""Exceptional points: where two levels merge, to full precision, with a proven bracket."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from math import ceil, floor
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.algebra.whole_numbers import whole_number
from haarloom.exceptions import ConvergenceError, ParameterError
from haarloom.numerics.balls import Interval, as_exact, exact_text
from haarloom.numerics.certify import IRREP_LIMIT, CertifiedLevel, attempt, checked_digits
from haarloom.numerics.cutoff import checked_levels
from haarloom.numerics.merger_digits import ExactLine, bits_for, refined
from haarloom.numerics.mergers import SAMPLES, FloatMerger, MatrixFamily, mergers_on, sufficient_cutoff
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
    samples: int = SAMPLES,
    **values: Any,
) -> tuple[FloatMerger, ...]:
    """All mergers among the leading levels on a line that a grid of samples shows, in double precision.

    The line is given as for :func:`exceptional_point`; levels that are equal at a grid point and have
    vectors of their own, as at z = 0, cross there and do not count.

    Parameters
    ----------
    levels
        Leading levels that are looked at, the ground level included.
    samples
        Grid points; two mergers of one pair between neighbouring points go unseen.

    Raises
    ------
    ConvergenceError
        If the grid shows a merger for which Newton's method does not settle.
    ParameterError
        For an unknown parameter, an empty interval, or a T that is not real.
    """
    found, unsettled = _on_line(model, parameter, between, levels, samples, values)
    if unsettled:
        raise _not_settled(parameter, unsettled)
    return found


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
        If no merger of this level lies between the ends, or Newton's method does not settle.
    ParameterError
        For an unknown parameter, an empty interval, or a T that is not real.
    """
    exact = {name: as_exact(name, value) for name, value in values.items()}
    plain: dict[str, Any] = {
        name: float(value) if isinstance(value, Fraction) else value for name, value in exact.items()
    }
    places = checked_digits(digits)
    merger = _first(
        level, parameter, between, *_on_line(model, parameter, between, level + 2, SAMPLES, plain)
    )
    cutoff = sufficient_cutoff(model, [{**plain, parameter: merger.value}], level + 2) + 1
    line = ExactLine(model, parameter, exact)
    while True:
        value = refined(line, merger, cutoff, places)
        result = _bracketed(line, merger, value, cutoff, places, prove)
        cutoff += 2
        if result.proven or not prove or count_up_to(model.group.rank, cutoff) > IRREP_LIMIT:
            return result


def _on_line(
    model: RingModel,
    parameter: str,
    between: tuple[Any, Any],
    levels: int,
    samples: int,
    values: Mapping[str, Any],
) -> tuple[tuple[FloatMerger, ...], list[float]]:
    """Mergers in order of the parameter, each once, and where Newton's method did not settle."""
    start, stop, fixed = _line(model, parameter, between, values)
    count, points = checked_levels(levels), whole_number("samples", samples, 2, "points of the grid")
    cutoff = sufficient_cutoff(model, [{**fixed, parameter: end} for end in (start, stop)], count)
    family = MatrixFamily(model, cutoff, (parameter,), fixed)
    found: list[FloatMerger] = []
    unsettled = []
    for place, merger in mergers_on(family, np.linspace(start, stop, points), count):
        if merger is None:
            unsettled.append(place)
        elif not any(merger.same(other) for other in found):
            found.append(merger)
    return tuple(sorted(found, key=lambda merger: (merger.value, merger.level))), unsettled


def _first(
    level: int,
    parameter: str,
    between: tuple[Any, Any],
    found: tuple[FloatMerger, ...],
    unsettled: list[float],
) -> FloatMerger:
    mine = [merger for merger in found if merger.level == level]
    if unsettled and (not mine or min(unsettled) < mine[0].value):
        raise _not_settled(parameter, unsettled)
    if not mine:
        seen = ", ".join(f"level {m.level} at {m.value:.6g}" for m in found) or "none at all"
        raise ConvergenceError(
            f"level {level} merges with the next one nowhere for {parameter} between {between[0]} and "
            f"{between[1]} (mergers seen: {seen}): widen the interval, or ask for another level."
        )
    return mine[0]


def _not_settled(parameter: str, places: list[float]) -> ConvergenceError:
    return ConvergenceError(
        f"Newton's method for a merger near {parameter} = {places[0]:.6g} did not settle: "
        "narrow the interval around the merger, or sample it more finely."
    )


def _line(
    model: RingModel, parameter: str, between: tuple[Any, Any], values: Mapping[str, Any]
) -> tuple[float, float, dict[str, Any]]:
    if parameter not in parameter_names(model):
        raise ParameterError(
            f"{parameter!r} is no parameter of this model, which has "
            f"{', '.join(parameter_names(model)) or 'none'}."
        )
    if len(between) != 2:
        raise ParameterError(f"between = {between!r}: give the two ends of the line.")
    start, stop = (float(_plain_end(parameter, end)) for end in between)
    if not start < stop:
        raise ParameterError(f"between = {between!r} is empty: give the smaller end first.")
    fixed = plain_numbers(checked_values(model, {**values, parameter: start}))
    fixed.pop(parameter)
    return start, stop, fixed


def _plain_end(parameter: str, end: Any) -> Fraction:
    """An end of a line as an exact real number."""
    exact = as_exact(parameter, end)
    if not isinstance(exact, Fraction):
        raise ParameterError(f"{parameter} = {end!r} is no end of a line: give a real number.")
    return exact


def _bracketed(
    line: ExactLine, merger: FloatMerger, value: Fraction, cutoff: int, digits: int, prove: bool
) -> ExceptionalPoint:
    unit = Fraction(1, 10**digits)
    low, high = floor(value / unit) * unit, ceil(value / unit) * unit
    bordered = merger.bordered
    return ExceptionalPoint(
        model=line.model,
        parameter=line.parameter,
        values=dict(line.fixed),
        level=merger.level,
        value=value,
        bracket=(low, high),
        proven=prove and _changes_between(line, merger.level, (low, high), cutoff, digits),
        digits=digits,
        eigenvalue=merger.eigenvalue,
        square_root_coefficient=float(bordered.square_root_coefficient[0]),
        vector=bordered.right / np.linalg.norm(bordered.right),
        cutoff=merger.cutoff,
    )


def _changes_between(
    line: ExactLine, level: int, ends: tuple[Fraction, Fraction], cutoff: int, digits: int
) -> bool:
    """Whether the pair is proven complex at one end and real at the other.

    Between them the two eigenvalues move continuously inside a disc that holds no third one, shown on
    the whole bracket at once; going from the axis to a pair they must meet.
    """

    def pair(value: Any) -> tuple[CertifiedLevel, ...]:
        return attempt(line.model, line.at(value), level + 2, cutoff, bits_for(digits)).levels[level:]

    verdicts = {frozenset(found.verdict for found in pair(end)) for end in ends}
    if verdicts != {frozenset({"real"}), frozenset({"complex pair"})}:
        return False
    return all(found.count == 2 for found in pair(Interval(*ends)))
