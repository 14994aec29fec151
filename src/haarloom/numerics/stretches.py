"""Proven stretches: where along a line a level is real, and where it is one of a complex pair.

At a distance d from a merger the pair is apart by ∝ √d and its vectors are conditioned by ∝ 1/√d, so that
only pieces shorter than some part of d (about d/16 for Ember-I) can be decided, however fine the precision.
Halving alone down to a piece w would leave about 8 w undecided on either side; so what is left is peeled from
its ends by pieces that shrink with d.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import groupby
from typing import TYPE_CHECKING, Any, overload

from haarloom.exceptions import ParameterError
from haarloom.numerics.balls import Interval, as_exact
from haarloom.numerics.certify import UNDECIDED, attempt, prepared, values_text
from haarloom.numerics.cutoff import checked_levels
from haarloom.numerics.threads import single_threaded
from haarloom.numerics.verdicts import PAIR, REAL

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["ProvenStretches", "Stretch", "certified_stretches"]

BITS = 64
"""Working precision: the width of a piece outweighs rounding by far."""

PEEL = 256
"""The shortest piece that is peeled off an undecided stretch, as a part of ``finest``."""

SPLIT = 6
"""How often an undecided stretch is halved in search of a decided piece inside it."""


@dataclass(frozen=True)
class Stretch:
    """An interval of the parameter on all of which the verdict is proven (or nothing is)."""

    interval: Interval
    verdict: str

    def __str__(self) -> str:
        return f"{self.interval}: {self.verdict}"


@dataclass(frozen=True)
class ProvenStretches(Sequence[Stretch]):
    """Stretches of a line in order, each with what is proven on all of it; in a notebook a picture.

    Attributes
    ----------
    stretches
        Neighbours of one verdict are joined; together they cover the line.
    parameter, level
        What varies, and which mass: 1 is the lowest.
    values
        The other parameters, exact.
    """

    stretches: tuple[Stretch, ...]
    parameter: str
    level: int
    values: Mapping[str, Any]

    @overload
    def __getitem__(self, place: int) -> Stretch: ...
    @overload
    def __getitem__(self, place: slice) -> tuple[Stretch, ...]: ...
    def __getitem__(self, place: int | slice) -> Stretch | tuple[Stretch, ...]:
        return self.stretches[place]

    def __len__(self) -> int:
        return len(self.stretches)

    def __str__(self) -> str:
        lines = [f"  {_ends(stretch.interval)}: {stretch.verdict}" for stretch in self]
        return "\n".join([f"{self._title}:", *lines])

    __repr__ = __str__

    @property
    def _title(self) -> str:
        others = f" at {values_text(self.values)}" if self.values else ""
        return f"Proven of m_{self.level} along {self.parameter}{others}"

    def _repr_html_(self) -> str:
        from haarloom.actions.pictures import band_picture, table_html

        known = [REAL, PAIR, UNDECIDED]
        order = sorted({stretch.verdict for stretch in self}, key=lambda word: known.index(word))
        bands = [(float(s.interval.lower), float(s.interval.upper), s.verdict) for s in self]
        rows = [(_ends(stretch.interval), stretch.verdict) for stretch in self]
        return band_picture(bands, self.parameter, order) + table_html(
            (self.parameter, "proven on all of it"), rows, self._title, words=True
        )


def _ends(interval: Interval) -> str:
    return f"{float(interval.lower):.10g} … {float(interval.upper):.10g}"


Judge = Callable[[Interval], Stretch]


@single_threaded
def certified_stretches(
    model: RingModel,
    parameter: str,
    lower: Any,
    upper: Any,
    level: int = 1,
    finest: Any = Fraction(1, 1000),
    **values: Any,
) -> ProvenStretches:
    """Cut an interval into stretches with a proven verdict for one level.

    Parameters
    ----------
    parameter, lower, upper
        The line.
    level
        Which mass: 1 is the lowest.
    finest
        Around a merger an undecided stretch not longer than this remains. A longer one is left only where
        pieces of 1/256 of this decide nothing at its ends, nor pieces of 1/64 of itself inside it: for
        another reason than one merger, such as two of them that close to each other, or a cutoff that is
        too small.
    **values
        Exact numbers for the other parameters, as for :func:`haarloom.numerics.certify.certify`.

    Returns
    -------
    The stretches in order, with a picture for a notebook.

    Raises
    ------
    ParameterError
        If ``finest`` is no positive number, or the line no interval.
    """
    whole, smallest = Interval(lower, upper), as_exact("finest", finest)
    if not isinstance(smallest, Fraction) or smallest <= 0:
        raise ParameterError(f"finest = {finest!r}: give a positive length, e.g. '0.001'.")
    count = checked_levels(level) + 1
    exact, cutoff = prepared(model, count, {**values, parameter: whole})

    def judged(piece: Interval) -> Stretch:
        found = attempt(model, {**exact, parameter: piece}, count, cutoff, BITS)
        return Stretch(piece, found.levels[-1].verdict)

    coarse = _joined(_halved(judged, judged(whole), smallest))
    parts = _joined(part for stretch in coarse for part in _sharpened(judged, stretch, smallest))
    others = {name: value for name, value in exact.items() if name != parameter}
    return ProvenStretches(tuple(parts), parameter, count - 1, others)


def _halved(judged: Judge, stretch: Stretch, finest: Fraction) -> Iterator[Stretch]:
    """Pieces that are decided or not longer than the finest."""
    if stretch.verdict != UNDECIDED or stretch.interval.width <= finest:
        yield stretch
        return
    for half in stretch.interval.halves():
        yield from _halved(judged, judged(half), finest)


def _sharpened(judged: Judge, stretch: Stretch, finest: Fraction) -> Iterator[Stretch]:
    """Decided pieces at both ends of an undecided stretch, and what is left of it."""
    if stretch.verdict != UNDECIDED:
        yield stretch
        return
    left, rest, right = _peeled(judged, stretch.interval, finest)
    yield from left
    found = _inside(judged, rest) if rest.width > finest else None
    if found is None:
        # a short one away from every merger goes with this, too
        yield from _halved(judged, Stretch(rest, UNDECIDED), rest.width / 4)
    else:
        before = Stretch(Interval(rest.lower, found.interval.lower), UNDECIDED)
        after = Stretch(Interval(found.interval.upper, rest.upper), UNDECIDED)
        for part in (before, found, after):
            if part.interval.width:
                yield from _sharpened(judged, part, finest)
    yield from reversed(right)


def _peeled(judged: Judge, rest: Interval, finest: Fraction) -> tuple[list[Stretch], Interval, list[Stretch]]:
    """Decided pieces from both ends inwards, and what is left once it is short or its ends stay undecided."""
    peeled: tuple[list[Stretch], list[Stretch]] = ([], [])
    lengths = [finest, finest]
    while rest.width > finest and max(lengths) * PEEL >= finest:
        end = int(lengths[1] > lengths[0])  # the longer pieces first: they do not bring the merger closer
        cut = rest.upper - lengths[1] if end else rest.lower + lengths[0]
        parts = Interval(rest.lower, cut), Interval(cut, rest.upper)
        stretch = judged(parts[end])
        if stretch.verdict == UNDECIDED:
            lengths[end] /= 2
        else:
            peeled[end].append(stretch)
            rest = parts[1 - end]
    return peeled[0], rest, peeled[1]


def _inside(judged: Judge, whole: Interval) -> Stretch | None:
    """A decided piece of an interval, the longest that halving it shows."""
    pieces = [whole]
    for _ in range(SPLIT):
        pieces = [half for piece in pieces for half in piece.halves()]
        for piece in pieces:
            stretch = judged(piece)
            if stretch.verdict != UNDECIDED:
                return stretch
    return None


def _joined(pieces: Iterable[Stretch]) -> Iterator[Stretch]:
    for verdict, group in groupby(pieces, key=lambda piece: piece.verdict):
        members = list(group)
        yield Stretch(Interval(members[0].interval.lower, members[-1].interval.upper), verdict)
