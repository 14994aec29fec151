"""Levels of a small group from its pencil, and their radii, for many points at once."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["GroupNumbers", "Margins", "group_radii", "pencil_levels"]


@dataclass(frozen=True, eq=False)
class Margins:
    """What the bound needs at each point, shape (M,) each: ‖D‖, what couples beyond the shell, ‖B‖, η."""

    beyond: NDArray[np.float64]
    tail: NDArray[np.float64]
    rim: NDArray[np.float64]
    noise: NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class GroupNumbers:
    """A group of s levels at M points.

    Attributes
    ----------
    values
        Shape (s, M).
    right, left
        ‖V‖ and ‖Y‖ of its bases, shape (M,).
    upwards, residual
        ‖C V‖ and ‖T V − V B‖, shape (M,).
    departure
        Size of the part of B that is not normal, shape (M,).
    """

    values: NDArray[np.complex128]
    right: NDArray[np.float64]
    left: NDArray[np.float64]
    upwards: NDArray[np.float64]
    residual: NDArray[np.float64]
    departure: NDArray[np.float64]


def pencil_levels(
    vectors: NDArray[Any],
    images: NDArray[Any],
    beyond: NDArray[Any],
    dual: tuple[NDArray[Any] | None, NDArray[np.int64]],
) -> GroupNumbers:
    """Levels of (Vᵀ ΦJ T V, Vᵀ ΦJ V) at M points.

    Parameters
    ----------
    vectors, images, beyond
        V, T V inside and beyond the basis, shapes (n, s, M), (n, s, M), (·, s, M).
    dual
        (Φ, J); Φ broadcasts to (n, s, M), or is None where it is 1.
    """
    factors, order = dual
    partner = np.take(vectors, order, axis=0)
    if factors is not None:
        partner = partner * factors
    overlap, element = _products(partner, vectors), _products(partner, images)
    inverse = _inverse(overlap)
    block = np.einsum("acp,cdp->adp", inverse, element)
    if len(block) == 1:
        residual = images - block * vectors
    else:
        residual = images - np.einsum("cap,ncp->nap", block, vectors)
    right = _size(vectors)
    values = _block_values(block)
    departure = np.maximum(_size(block) ** 2 - (np.abs(values) ** 2).sum(axis=0), 0.0)
    return GroupNumbers(
        values, right, right * _size(inverse), _size(beyond), _size(residual), np.sqrt(departure)
    )


def _products(left: NDArray[Any], right: NDArray[Any]) -> NDArray[Any]:
    """All products of two bases, (n, s, M) each, summed over n: shape (s, s, M)."""
    return np.asarray(np.einsum("nap,ncp->acp", left, right))


def _size(array: NDArray[Any]) -> NDArray[np.float64]:
    """Frobenius norms over the first two axes, shape (M,)."""
    partner = array.conj() if np.iscomplexobj(array) else array
    return np.asarray(np.sqrt(np.einsum("ijp,ijp->p", array, partner).real))


def _inverse(matrix: NDArray[Any]) -> NDArray[Any]:
    """Inverses of s × s matrices, shape (s, s, M)."""
    with np.errstate(divide="ignore", invalid="ignore"):
        if len(matrix) == 1:
            return np.asarray(1 / matrix)
        if len(matrix) > 2:
            return np.moveaxis(np.linalg.inv(np.moveaxis(matrix, 2, 0)), 0, 2)
        (a, b), (c, d) = matrix
        return np.asarray(np.array([[d, -b], [-c, a]]) / (a * d - b * c))


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
    groups: list[GroupNumbers], margins: Margins, rest: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Radius around each level that holds one of the untruncated T, shape (levels, M); else infinite.

    The inequality of :mod:`haarloom.numerics.bounds` with one term for each group, solved in closed
    form: a group of s levels has a resolvent of norm at most Σ_k Nᵏ/(δ_1 ⋯ δ_{k+1}), k < s, with δ the
    distances to its levels, nearest first; and a residual couples it to the levels left out like B and
    C couple it to what was cut off.
    """
    centres = np.concatenate([group.values for group in groups])
    size = np.abs(centres)
    owner = np.repeat(np.arange(len(groups)), [len(group.values) for group in groups])
    apart = np.abs(centres[:, None] - centres[None, :])
    with np.errstate(all="ignore"):
        # a tenth of the distance to D and to the rest is given away: it makes room for the radius itself
        room = (size - margins.beyond) * 0.9
        spare = (size - rest) * 0.9
        strengths = [_strength(group, margins, room, spare) for group in groups]
        crowd = _crowd(groups, strengths, apart, owner) + _left_over(groups, margins, room, spare)
        radius = np.full(centres.shape, np.inf)
        for level, number in enumerate(owner):
            group = groups[number]
            load = strengths[number][level] / (1 - crowd[level])
            found = _reach(load, group.departure, apart[level, owner == number])
            others = apart[level, owner != number].min(axis=0, initial=np.inf)
            holds = (crowd[level] < 1) & (found < 0.1 * np.minimum(others, size[level]))
            holds &= (room[level] > 0) & (spare[level] > 0)
            radius[level] = np.where(holds, 1.05 * found, np.inf)
    return radius


def _strength(
    group: GroupNumbers, margins: Margins, room: NDArray[np.float64], spare: NDArray[np.float64]
) -> NDArray[np.float64]:
    """√(c² g + ‖V‖² η + r²/…) √(b² g + …) of a group near every level, shape (levels, M)."""
    up = group.upwards + margins.tail * group.right
    first = up**2 / room + group.right**2 * margins.noise + group.residual**2 / spare
    # left vectors are ΦJ times right ones and the inverse overlap: the same norms, times ‖Y‖/‖V‖
    return np.asarray(first * (group.left / group.right))


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
