"""Levels of a small group from its pencil, and their radii, for many points at once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import permutations
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["GroupNumbers", "Margins", "group_numbers", "group_radii"]


MIXED = 1e-4
"""Part of other groups in a group below which its cube is no more than rounding."""


@dataclass(frozen=True, eq=False)
class Margins:
    """What the bound needs at each point, shape (M,) each: ‖D‖, what couples beyond the shell, ‖B‖, η."""

    beyond: NDArray[np.float64]
    tail: NDArray[np.float64]
    rim: NDArray[np.float64]
    noise: NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class GroupNumbers:
    """A group of s levels at M points, one of the g groups of V, with dual basis Y, Y V = 1, and B = Y T V.

    Attributes
    ----------
    values
        Levels of its diagonal block of B, shape (s, M).
    right, left
        ‖V‖ and ‖Y‖ of its bases, shape (M,).
    upwards, downwards
        How strongly they couple beyond the basis, ‖C V‖ and ‖Y B‖, shape (M,).
    residual, left_residual
        ‖T V − V B‖ and ‖Y T − B Y‖, shape (M,).
    departure
        Size of the part of its diagonal block that is not normal, shape (M,).
    coupling
        Product of the norms of its blocks of B with each group, there and back, shape (g, M); for its own
        0, or infinite where the groups are too mixed for a count to second order.
    """

    values: NDArray[np.complex128]
    right: NDArray[np.float64]
    left: NDArray[np.float64]
    upwards: NDArray[np.float64]
    downwards: NDArray[np.float64]
    residual: NDArray[np.float64]
    left_residual: NDArray[np.float64]
    departure: NDArray[np.float64]
    coupling: NDArray[np.float64]


@np.errstate(all="ignore")  # numbers without a bound are infinite or none, and radii say so
def group_numbers(
    vectors: NDArray[Any],
    images: NDArray[Any],
    beyond: NDArray[Any],
    dual: tuple[NDArray[Any] | None, NDArray[np.int64]],
    groups: Sequence[slice],
) -> list[GroupNumbers]:
    """Levels of all groups at M points, from the pencil (Vᵀ ΦJ T V, Vᵀ ΦJ V).

    Because ΦJ maps right onto left vectors, Y is the inverse of the overlap times (ΦJ V)ᵀ, and what
    holds of left vectors follows from the right ones: Y T − B Y is that inverse times (ΦJ (T V − V B))ᵀ.

    Parameters
    ----------
    vectors, images, beyond
        V, T V inside and beyond the basis, shapes (n, m, M), (n, m, M), (·, m, M).
    dual
        (Φ, J); Φ broadcasts to (n, m, M), or is None where it is 1.
    groups
        Slices of the m vectors.
    """
    factors, order = dual
    partner = np.take(vectors, order, axis=0)
    if factors is not None:
        partner = partner * factors
    inverse, block = _solved(_products(partner, vectors), _products(partner, images))
    residual = images - np.einsum("cap,ncp->nap", block, vectors)
    diagonal, coupling, mixed = _decoupled(block, groups)
    right, up, rest = (
        np.array([_size(array[:, group]) for group in groups]) for array in (vectors, beyond, residual)
    )
    turned = np.array([[_size(inverse[one, other]) for other in groups] for one in groups])
    left, down, left_rest = (np.einsum("abp,bp->ap", turned, norms) for norms in (right, up, rest))
    found = []
    for place, own in enumerate(diagonal):
        values = _block_values(own)
        departure = np.maximum(_size(own) ** 2 - (np.abs(values) ** 2).sum(axis=0), 0.0)
        coupling[place, place] = np.where(mixed < MIXED, 0.0, np.inf)
        found.append(
            GroupNumbers(
                values=values,
                right=right[place],
                left=left[place],
                upwards=up[place],
                downwards=down[place],
                residual=rest[place],
                left_residual=left_rest[place],
                departure=np.sqrt(departure),
                coupling=coupling[place],
            )
        )
    return found


def _decoupled(
    block: NDArray[Any], groups: Sequence[slice]
) -> tuple[list[NDArray[Any]], NDArray[np.float64], NDArray[np.float64]]:
    """Diagonal blocks of (1 + X)⁻¹ B (1 + X) to second order, how others couple to them, and ‖X‖.

    X_ab = B_ab/(mean of b − mean of a) makes the blocks between groups vanish where the levels of a group
    are close together; what is left of them is O_ab = B_ab + B_aa X_ab − X_ab B_bb. X is as small as the
    interpolation error, so that norms of vectors stay what they were.

    Returns
    -------
    Blocks of shape (s, s, M); ‖O_ab‖ ‖O_ba‖ of shape (g, g, M); ‖X‖ of shape (M,).
    """
    points, count = block.shape[-1], len(groups)
    parts = [[block[one, other] for other in groups] for one in groups]
    means = [np.einsum("aap->p", parts[a][a]) / len(parts[a][a]) for a in range(count)]
    mixed = np.zeros(points)
    turn: list[list[Any]] = [[None] * count for _ in groups]
    open_: list[list[Any]] = [[None] * count for _ in groups]
    for a, b in permutations(range(count), 2):
        turn[a][b] = parts[a][b] / (means[b] - means[a])
        open_[a][b] = parts[a][b] + _times(parts[a][a], turn[a][b]) - _times(turn[a][b], parts[b][b])
        mixed += _size(turn[a][b]) ** 2
    coupling = np.zeros((count, count, points))
    diagonal = [parts[a][a] for a in range(count)]
    for a, b in permutations(range(count), 2):
        diagonal[a] = diagonal[a] + _times(parts[a][b], turn[b][a]) - _times(turn[a][b], open_[b][a])
        coupling[a, b] = _size(open_[a][b]) * _size(open_[b][a])
    return diagonal, coupling, np.sqrt(mixed)


def _times(left: NDArray[Any], right: NDArray[Any]) -> NDArray[Any]:
    """Products of matrices, points last."""
    if left.shape[1] == 1:
        return np.asarray(left * right)
    return np.einsum("acp,cdp->adp", left, right)


def _solved(overlap: NDArray[Any], element: NDArray[Any]) -> tuple[NDArray[Any], NDArray[Any]]:
    """O⁻¹ and O⁻¹ E of m × m matrices, shape (m, m, M) each; infinite where O is singular."""
    count = len(overlap)
    unit = np.broadcast_to(np.eye(count), (overlap.shape[-1], count, count))
    right = np.concatenate([unit, np.moveaxis(element, 2, 0)], axis=2)
    try:
        found = np.linalg.solve(np.moveaxis(overlap, 2, 0), right)
    except np.linalg.LinAlgError:
        regular = np.linalg.cond(np.moveaxis(overlap, 2, 0)) < 1e15
        found = np.full(right.shape, np.inf, dtype=right.dtype)
        found[regular] = np.linalg.solve(np.moveaxis(overlap, 2, 0)[regular], right[regular])
    turned = np.ascontiguousarray(np.moveaxis(found, 0, 2))
    return turned[:, :count], turned[:, count:]


def _products(left: NDArray[Any], right: NDArray[Any]) -> NDArray[Any]:
    """All products of two bases, (n, s, M) each, summed over n: shape (s, s, M)."""
    return np.asarray(np.einsum("nap,ncp->acp", left, right))


def _size(array: NDArray[Any]) -> NDArray[np.float64]:
    """Frobenius norms over the first two axes, shape (M,)."""
    partner = array.conj() if np.iscomplexobj(array) else array
    return np.asarray(np.sqrt(np.einsum("ijp,ijp->p", array, partner).real))


def _block_values(block: NDArray[Any]) -> NDArray[np.complex128]:
    """Eigenvalues of s × s blocks (s, s, M): shape (s, M)."""
    if len(block) == 1:
        return block[0].astype(complex)
    if len(block) > 2:
        finite = np.isfinite(block).all(axis=(0, 1))
        flat = np.moveaxis(np.where(finite, block, 0.0), 2, 0)
        return np.linalg.eigvals(flat).astype(complex).T
    mean = (block[0, 0] + block[1, 1]) / 2
    half = (block[0, 0] - block[1, 1]) / 2
    split = np.sqrt((half * half + block[0, 1] * block[1, 0]).astype(complex))
    return np.stack([mean + split, mean - split])


def group_radii(
    groups: list[GroupNumbers], margins: Margins, rest: NDArray[np.float64], swell: float
) -> NDArray[np.float64]:
    """Radius around each level that holds one of the untruncated T, shape (levels, M); else infinite.

    The inequality of :mod:`haarloom.numerics.bounds` with one term for each group, solved in closed
    form: a group of s levels has a resolvent of norm at most Σ_k Nᵏ/(δ_1 ⋯ δ_{k+1}), k < s, with δ the
    distances to its levels, nearest first; a residual couples it to the levels left out like B and C
    couple it to what was cut off; and what is left of the groups in each other counts in second order.

    Parameters
    ----------
    rest
        Largest |λ| of the levels left out, shape (M,).
    swell
        Their resolvent at a level λ is at most this over |λ| − rest; 1 for a normal matrix.
    """
    centres = np.concatenate([group.values for group in groups])
    size = np.abs(centres)
    owner = np.repeat(np.arange(len(groups)), [len(group.values) for group in groups])
    apart = np.abs(centres[:, None] - centres[None, :])
    with np.errstate(all="ignore"):
        # a tenth of the distance to D and to the rest is given away: it makes room for the radius itself
        room = (size - margins.beyond) * 0.9
        spare = (size - rest) * (0.9 / swell)
        strengths = [_strength(group, margins, room, spare) for group in groups]
        crowd = _crowd(groups, strengths, apart, owner) + _left_over(groups, margins, room, spare)
        radius = np.full(centres.shape, np.inf)
        for level, number in enumerate(owner):
            group = groups[number]
            nearest = np.array([apart[level, owner == other].min(axis=0) for other in range(len(groups))])
            # its own entry is 0, or infinite where there is no bound
            shift = np.where(group.coupling > 0, group.coupling / nearest, 0.0).sum(axis=0)
            load = (strengths[number][level] + shift) / (1 - crowd[level])
            found = _reach(load, group.departure, apart[level, owner == number])
            others = apart[level, owner != number].min(axis=0, initial=np.inf)
            holds = (crowd[level] < 1) & (found < 0.1 * np.minimum(others, size[level]))
            holds &= (room[level] > 0) & (spare[level] > 0)
            radius[level] = np.where(holds, 1.05 * found, np.inf)
    return radius


def _strength(
    group: GroupNumbers, margins: Margins, room: NDArray[np.float64], spare: NDArray[np.float64]
) -> NDArray[np.float64]:
    """√(c² g + ‖V‖² η + r²/…) √(b² g + ‖Y‖² η + …) of a group near every level, shape (levels, M)."""
    up = group.upwards + margins.tail * group.right
    down = group.downwards + margins.tail * group.left
    first = up**2 / room + group.right**2 * margins.noise + group.residual**2 / spare
    second = down**2 / room + group.left**2 * margins.noise + group.left_residual**2 / spare
    return np.asarray(np.sqrt(first * second))


def _reach(
    load: NDArray[np.float64], departure: NDArray[np.float64], apart: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Radius from which on load · ‖resolvent‖ < 1 on the circle.

    Parameters
    ----------
    apart
        Distances to all s levels of the group, its own 0 among them, shape (s, M).
    """
    order = len(apart)
    if order == 1:
        return load
    others = np.sort(apart, axis=0)[1:]
    # on a circle that stays on this side of the middle, each other level is at least half as far as now
    alone = load * (1 + np.cumprod(2 * departure / others, axis=0).sum(axis=0))
    # a circle around all of them: each of the s terms is at most 1/s at the largest of these distances
    terms = [(order * load * departure**k) ** (1 / (k + 1)) for k in range(order)]
    together = others[-1] + np.max(terms, axis=0)
    return np.where(alone < others[0] / 2, alone, together)


def _resolvent(
    distance: NDArray[np.float64], departure: NDArray[np.float64], order: int
) -> NDArray[np.float64]:
    total = term = 1 / distance
    for _ in range(1, order):
        term = term * departure / distance
        total = total + term
    return np.asarray(total)


def _crowd(
    groups: list[GroupNumbers],
    strengths: list[NDArray[np.float64]],
    apart: NDArray[np.float64],
    owner: NDArray[np.int64],
) -> NDArray[np.float64]:
    """What all other groups add to the left side near each level, shape (levels, M)."""
    total = np.zeros(apart.shape[1:])
    for number, group in enumerate(groups):
        outside = owner != number
        nearest = 0.9 * apart[np.ix_(outside, owner == number)].min(axis=1)
        resolvent = _resolvent(nearest, group.departure, len(group.values))
        total[outside] += strengths[number][outside] * resolvent
    return total


def _left_over(
    groups: list[GroupNumbers], margins: Margins, room: NDArray[np.float64], spare: NDArray[np.float64]
) -> NDArray[np.float64]:
    """The levels left out, as one block with the norms of the whole rim."""
    projector = np.sum([group.left * group.right for group in groups], axis=0) + 1.0
    coupling = margins.rim**2 / room + margins.noise
    return np.asarray(coupling * projector / spare)
