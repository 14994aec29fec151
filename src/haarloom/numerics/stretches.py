"""Proven stretches: where along a line a level is real, and where it is one of a complex pair."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from typing import TYPE_CHECKING, Any

from haarloom.numerics.balls import Interval
from haarloom.numerics.certify import UNDECIDED, attempt, prepared
from haarloom.numerics.cutoff import checked_levels
from haarloom.numerics.threads import single_threaded

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["Stretch", "certified_stretches"]


@dataclass(frozen=True)
class Stretch:
    """An interval of the parameter on all of which the verdict is proven (or nothing is)."""

    interval: Interval
    verdict: str

    def __str__(self) -> str:
        return f"{self.interval}: {self.verdict}"


@single_threaded
def certified_stretches(
    model: RingModel,
    parameter: str,
    lower: Any,
    upper: Any,
    level: int = 1,
    finest: Any = Fraction(1, 1000),
    **values: Any,
) -> tuple[Stretch, ...]:
    """Cut an interval into stretches with a proven verdict for one level.

    Pieces on which nothing can be shown are halved down to ``finest``; around a merger an undecided
    stretch of about that length remains.

    Parameters
    ----------
    parameter, lower, upper
        The line.
    level
        Which mass: 1 is the lowest.
    finest
        Shortest piece.
    **values
        Exact numbers for the other parameters, as for :func:`haarloom.numerics.certify.certify`.

    Returns
    -------
    Stretches in order, neighbours of one verdict joined; together they cover the interval.
    """
    whole = Interval(lower, upper)
    count = checked_levels(level) + 1
    exact, cutoff = prepared(model, count, {**values, parameter: whole})
    smallest = Fraction(finest)
    pieces = _decided(model, parameter, {**exact, parameter: whole}, count, cutoff, smallest)
    return tuple(_joined(pieces))


def _decided(
    model: RingModel, parameter: str, box: dict[str, Any], levels: int, cutoff: int, finest: Fraction
) -> Iterator[Stretch]:
    piece: Interval = box[parameter]
    verdict = attempt(model, box, levels, cutoff, 64).levels[-1].verdict
    if verdict != UNDECIDED or piece.width <= finest:
        yield Stretch(piece, verdict)
        return
    for half in piece.halves():
        yield from _decided(model, parameter, {**box, parameter: half}, levels, cutoff, finest)


def _joined(pieces: Iterator[Stretch]) -> Iterator[Stretch]:
    current: Stretch | None = None
    for piece in pieces:
        if current is not None and piece.verdict == current.verdict:
            current = Stretch(Interval(current.interval.lower, piece.interval.upper), piece.verdict)
            continue
        if current is not None:
            yield current
        current = piece
    if current is not None:
        yield current
