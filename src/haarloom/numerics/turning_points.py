"""Folds and cusps of a followed curve, located to full precision.

On g = g_λ = 0 the curve runs along (g_x g_λy − g_y g_λx, g_y g_λλ, −g_x g_λλ) in (λ, x, y). So x turns round
where g_y = 0 and y where g_x = 0: a fold. Where g_λλ = 0 three levels meet, and both turn round at once: a
cusp (R. Thom, *Structural Stability and Morphogenesis* (1975); V. I. Arnold, *Catastrophe Theory* (1984)).
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from haarloom.exceptions import ConvergenceError
from haarloom.numerics.continuation import NOISE, Chart, Path, State, zero_along

__all__ = ["CUSP", "Turn", "with_turns"]

CUSP = 2
"""Kind of a turn at which three levels meet; 0 and 1 are folds in x and in y."""

LEVEL = 1e-9
"""Below this part of the gradient is rounding: a curve along an axis does not fold all the time."""


@dataclass(frozen=True)
class Turn:
    """A turn of a curve: its place among the points, and its kind (0 or 1: which axis folds; CUSP)."""

    index: int
    kind: int


def with_turns(chart: Chart, path: Path) -> tuple[Path, tuple[Turn, ...]]:
    """The path with every fold and cusp among its points.

    Two turns of one kind between neighbouring points go unseen: a step bends by less than 20 degrees.
    A turn that cannot be located is left out, and the path counts as incomplete. What looks like one at
    the very end of an open path is none: nothing comes after it.
    """
    complete = path.complete
    ends = [] if path.closed else [path.states[0], path.states[-1]]
    states: list[State] = [path.states[0]]
    turns: list[Turn] = []
    for first, second in pairwise(path.states):
        located = _located(chart, first, second)
        complete &= located is not None
        for kind, found in located or ():
            if any(_apart(found, end) < NOISE for end in ends):
                continue
            if _apart(found, second) < NOISE:
                turns.append(Turn(len(states), kind))  # the place that the second one takes below
                continue
            if _apart(found, states[-1]) >= NOISE:
                states.append(found)
            turns.append(Turn(len(states) - 1, kind))
        states.append(second)
    return Path(states, path.closed, complete), tuple(dict.fromkeys(turns))


def _located(chart: Chart, first: State, second: State) -> list[tuple[int, State]] | None:
    """Turns between two neighbours in the order in which they come; None if one of them escapes."""
    before, after = _tests(chart, first), _tests(chart, second) * _orientation(first, second)
    flips = (before >= 0) != (after >= 0)
    flips &= np.maximum(np.abs(before), np.abs(after)) > LEVEL
    try:
        found = [(kind, _turn(chart, first, second, kind)) for kind in np.flatnonzero(flips).tolist()]
    except ConvergenceError:
        return None
    # at a cusp whose tip lies along an axis the other parameter has a zero slope and does not turn round
    cusps = [state for kind, state in found if kind == CUSP]
    kept = [
        (kind, state)
        for kind, state in found
        if kind == CUSP or all(_apart(state, cusp) >= NOISE for cusp in cusps)
    ]
    return sorted(kept, key=lambda turn: _apart(first, turn[1]))


def _turn(chart: Chart, first: State, second: State, kind: int) -> State:
    for end in (first, second):
        if abs(_tests(chart, end)[kind]) < LEVEL:
            return end
    return zero_along(chart, first, second, lambda state: float(_tests(chart, state)[kind]))


def _tests(chart: Chart, state: State) -> NDArray[np.float64]:
    """What vanishes at a fold in x, at a fold in y, at a cusp: numbers without units."""
    gradient = np.real(state.bordered.g_parameters) * chart.size
    length = np.linalg.norm(gradient)
    bend = float(np.real(state.bordered.g_second)) * chart.level(state.unknowns) ** 2
    return np.array([*(gradient / length)[::-1], bend / np.hypot(bend, length)])


def _orientation(first: State, second: State) -> float:
    """g changes sign with one of the borders, and a curve may come round with one of them reversed."""
    signs = [np.sign(one @ other) for one, other in zip(first.borders, second.borders, strict=True)]
    return float(signs[0] * signs[1])


def _apart(one: State, other: State) -> float:
    return float(np.linalg.norm(one.unknowns - other.unknowns))
