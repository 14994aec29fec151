"""Continuous labels for levels along a path, through crossings and complex mergers.

A level is recognised by its spectral projector Π = x yᵀ. Between neighbouring points tr(Π_j Π'_k) goes to 1
for the same level and to 0 for every other one as the points approach each other, however steeply the levels
move and however many cross: it does not depend on the scale of the vectors, and sums to 1 over k (T. Kato,
*Perturbation Theory for Linear Operators*, II.1.4). Two levels that merge have no projectors of their own at
the merger, but their common one is smooth there, with tr(Π Π') ≈ 2. Where neither is clear, the path is
refined.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["Levels", "tracked"]

CLEAR = 0.25
"""How far from 0, 1 or 2 a trace may be: with refinement only the number of extra points depends on it."""

SAME = 1e-9
"""Levels closer than this part of the largest have no vectors of their own."""

NOTHING = 1e-14
"""Below this part of the largest a level is rounding."""

DEPTH = 8
"""How often one step of the path is halved."""

CLOSE = 0.5**DEPTH
"""How near to a point at which levels coincide their own vectors are taken, as a part of the step."""


@dataclass(frozen=True, eq=False)
class Levels:
    """Eigenvalues (m,) in spectral order with right and left vectors (n, m) in columns, yᵢᵀ xⱼ = δᵢⱼ."""

    values: NDArray[Any]
    right: NDArray[Any]
    left: NDArray[Any]

    def at(self, chosen: NDArray[np.int64]) -> Levels:
        """Some of them, in the given order."""
        return Levels(self.values[chosen], self.right[:, chosen], self.left[:, chosen])


def tracked(
    path: list[Levels], count: int, between: Callable[[float], Levels] | None = None
) -> NDArray[np.int64]:
    """Places at each point of the leading levels of the first one, followed as continuous branches.

    Where two real levels merge into a complex pair either may take either branch: the one listed first
    gets the partner with Im λ < 0, so that Im m > 0; and the larger |λ| where a pair becomes real, or where
    levels that coincide at the first point part.
    What happens and is undone between two points, like an avoided crossing narrower than the step, goes
    unseen: it counts as a crossing.

    Parameters
    ----------
    path
        All levels at each point, or at least more than ``count``, so that one that leaves the leading
        ones is seen to go. Its branch then goes on with the level that took its place.
    count
        How many are followed.
    between
        The levels at any position between two points, 1.5 for half-way between the second and the third:
        for a refinement, of which there are at most as many as points.

    Returns
    -------
    int array, shape (M, count): ``path[i].values[order[i]]`` follows the branches. Each row is a
    permutation of 0 … count − 1.
    """
    order = np.empty((len(path), count), dtype=np.int64)
    if not path:
        return order
    order[0] = np.arange(count)
    start = path[0].at(order[0])
    walk = _Walk(count, between, len(path), start, start, _shared(path[0].values)[:count])
    if between is not None and walk.unknown.any() and len(path) > 1:
        walk.to(0.0, CLOSE, between(CLOSE), DEPTH)
    steps, sure, shared = _clear_steps(path, count)
    for i in range(1, len(path)):
        if sure[i - 1] and not walk.unknown.any() and walk.fresh:
            order[i] = steps[i - 1][order[i - 1]]
            walk.here = walk.known = path[i].at(order[i])
            continue
        if between is not None and shared[i]:
            # levels that meet at the very point have their own vectors just before it
            walk.to(i - 1.0, i - CLOSE, between(i - CLOSE), DEPTH)
        order[i] = walk.to(i - 1.0, float(i), path[i], DEPTH)
    return order


def _clear_steps(
    path: list[Levels], count: int
) -> tuple[NDArray[np.int64], NDArray[np.bool_], NDArray[np.bool_]]:
    """All steps at once: where each level goes, shape (M − 1, count), and where that is beyond doubt.

    The last array says at which points some of the levels coincide, shape (M,).
    """
    values, right, left = (
        np.array([getattr(levels, name) for levels in path]) for name in ("values", "right", "left")
    )
    leading = slice(None), slice(None), slice(None, count)
    ahead = np.swapaxes(left[:-1][leading], 1, 2) @ right[1:]
    back = np.swapaxes(left[1:], 1, 2) @ right[:-1][leading]
    places, clear = _recognised(ahead * np.swapaxes(back, 1, 2))
    distinct = (np.diff(np.sort(places, axis=1), axis=1) > 0).all(axis=1) & (places < count).all(axis=1)
    shared = np.array([_shared(point)[:count].any() for point in values])
    return places, clear.all(axis=1) & distinct & ~shared[1:], shared


def _recognised(traces: NDArray[Any]) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
    """The level that each branch goes to, and whether no other comes into question; last axis the levels."""
    size = np.abs(traces)
    places = size.argmax(axis=-1)
    found = np.take_along_axis(traces, places[..., None], axis=-1)[..., 0]
    return places, ((size >= CLEAR).sum(axis=-1) == 1) & (np.abs(found - 1) < CLEAR)


@dataclass(eq=False)
class _Walk:
    """The branches where they are, and as they were when each last had vectors of its own.

    Attributes
    ----------
    budget
        Refinements that are left.
    here, known
        Levels now, and when their vectors were last their own.
    unknown
        Branches that have coincided with others from the start on: they part in spectral order.
    """

    count: int
    between: Callable[[float], Levels] | None
    budget: int
    here: Levels
    known: Levels
    unknown: NDArray[np.bool_]

    @property
    def fresh(self) -> bool:
        """Whether all vectors are those of the present point."""
        return self.known is self.here

    def to(self, start: float, stop: float, target: Levels, depth: int) -> NDArray[np.int64]:
        """Carry the branches to the next point; returns their places there."""
        order, doubtful = _matched(self.known, self.unknown, self.here.values, target)
        if doubtful and depth and self.between is not None and self.budget > 0:
            self.budget -= 1
            middle = (start + stop) / 2
            self.to(start, middle, self.between(middle), depth - 1)
            return self.to(middle, stop, target, depth - 1)
        self.here = target.at(order)
        own = ~_shared(target.values)[order]
        self.unknown = self.unknown & ~own
        if own.all():
            self.known = self.here
            return order
        self.known = Levels(
            self.here.values,
            np.where(own, self.here.right, self.known.right),
            np.where(own, self.here.left, self.known.left),
        )
        return order


def _matched(
    known: Levels, unknown: NDArray[np.bool_], last: NDArray[Any], target: Levels
) -> tuple[NDArray[np.int64], bool]:
    """Places of the branches among the levels of the target, and whether a closer look could change them."""
    traces = (known.left.T @ target.right) * (target.left.T @ known.right).T
    places, clear = _recognised(traces)
    if clear.all() and not unknown.any() and len(set(places.tolist())) == len(last) > places.max():
        return places, False
    return _grouped(traces, unknown, last, target.values)


def _grouped(
    traces: NDArray[Any], unknown: NDArray[np.bool_], last: NDArray[Any], values: NDArray[Any]
) -> tuple[NDArray[np.int64], bool]:
    """The same where levels have to be told apart by groups that are coupled with each other."""
    count, size = traces.shape
    links = np.zeros((count + size, count + size), dtype=bool)
    links[:count, count:] = np.abs(traces) >= CLEAR
    # of branches that have coincided from the start only the common projector says anything
    links[:count, :count] = unknown[:, None] & unknown & (np.abs(last[:, None] - last) <= SAME * np.abs(last))
    labels = _components(links)
    order, doubtful = np.full(count, -1), False
    shared = _shared(last), _shared(values)
    for label in dict.fromkeys(labels[:count].tolist()):
        rows, columns = (np.flatnonzero(part == label) for part in (labels[:count], labels[count:]))
        alike = len(rows) == len(columns)
        whole = alike and abs(traces[np.ix_(rows, columns)].sum() - len(rows)) < CLEAR * len(rows)
        if whole and columns.max() < count:
            order[rows] = columns[_paired(last[rows], values[columns])]
        settled = whole and (
            len(rows) == 1 or (len(rows) == 2 and not _stay_real(last[rows], values[columns]))
        )
        doubtful |= not (settled or shared[0][rows].all() or shared[1][columns].all())
    rows = np.flatnonzero(order < 0)
    columns = np.setdiff1d(np.arange(count), order)
    order[rows] = columns[_nearest(last[rows], values[columns])]
    return _upper_first(values, order, last), doubtful


def _components(links: NDArray[np.bool_]) -> NDArray[np.int64]:
    """A label for each node of a small graph, the same for nodes that are linked through others."""
    reach = links | links.T | np.eye(len(links), dtype=bool)
    while True:
        farther = reach @ reach
        if (farther == reach).all():
            return np.asarray(reach.argmax(axis=1))
        reach = farther


def _stay_real(last: NDArray[Any], values: NDArray[Any]) -> bool:
    """Whether two coupled levels are real at both ends: a closer look may show that they cross."""
    return not np.iscomplex([*last, *values]).any()


def _paired(last: NDArray[Any], values: NDArray[Any]) -> NDArray[np.int64]:
    """Places of coupled levels: two real ones keep their order, a pair keeps its signs."""
    if len(last) != 2 or np.iscomplex(last).any() != np.iscomplex(values).any():
        return _nearest(last, values)
    key = np.imag if np.iscomplex(last).any() else np.real
    found = np.empty(2, dtype=np.int64)
    found[np.argsort(-key(last), kind="stable")] = np.argsort(-key(values), kind="stable")
    return found


def _shared(values: NDArray[Any]) -> NDArray[np.bool_]:
    """Whether a level coincides with another one."""
    size = np.abs(values)
    apart = np.abs(values[:, None] - values[None, :])
    np.fill_diagonal(apart, np.inf)
    nearest = apart.argmin(axis=1)
    scale = np.maximum(np.maximum(size, size[nearest]), NOTHING * size.max())
    return np.asarray(apart.min(axis=1, initial=np.inf) < SAME * scale)


def _nearest(last: NDArray[Any], values: NDArray[Any]) -> NDArray[np.int64]:
    """Places with the smallest sum of squared distances, in order where it is equal."""
    from scipy.optimize import linear_sum_assignment

    distance = np.abs(last[:, None] - values[None, :]) ** 2
    places = np.arange(len(last))
    shift = np.abs(places[:, None] - places[None, :])
    return np.asarray(linear_sum_assignment(distance + 1e-12 * distance.max(initial=0.0) * shift)[1])


def _upper_first(values: NDArray[Any], order: NDArray[np.int64], last: NDArray[Any]) -> NDArray[np.int64]:
    """Give a freshly made pair its branches: the first listed the one with Im λ < 0."""
    order = order.copy()
    fresh = np.flatnonzero((last.imag == 0) & (values[order].imag != 0))
    for one in fresh:
        for other in fresh[fresh > one]:
            upper, lower = values[order[one]], values[order[other]]
            if upper == np.conj(lower) and upper.imag > 0:
                order[one], order[other] = order[other], order[one]
    return order
