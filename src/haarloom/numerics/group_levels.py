"""Levels of a small group from its pencil, and their radii, for many points at once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["GroupNumbers", "Margins", "group_radii", "pencil_levels", "purge"]


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
        Shape (M, s).
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
    """Levels of (V ΦJ T Vᵀ, V ΦJ Vᵀ) for rows V.

    Parameters
    ----------
    vectors, images, beyond
        V, T V inside and beyond the basis, shapes (M, s, n), (M, s, n), (M, s, ·).
    dual
        (Φ, J); Φ is None where it is 1.
    """
    factors, order = dual
    partner = np.take(vectors, order, axis=2)
    if factors is not None:
        partner *= factors
    if vectors.shape[1] == 1:
        return _single(vectors[:, 0], images[:, 0], beyond[:, 0], partner[:, 0])
    overlap = np.einsum("pan,pbn->pab", partner, vectors)
    element = np.einsum("pan,pbn->pab", partner, images)
    inverse = _inverse(overlap)
    block = inverse @ element
    values = _block_values(block)
    residual = images - np.swapaxes(block, 1, 2) @ vectors
    right = _size(vectors)
    left = right * _size(inverse)
    departure = np.sqrt(np.maximum(_size(block) ** 2 - (np.abs(values) ** 2).sum(axis=1), 0.0))
    return GroupNumbers(values, right, left, _size(beyond), _size(residual), departure)


def purge(
    vectors: NDArray[Any], dual: tuple[NDArray[Any] | None, NDArray[np.int64]], groups: Sequence[slice]
) -> NDArray[Any]:
    """Take out of each group what it holds of the groups before it, by the form Vᵀ ΦJ V."""
    factors, order = dual
    found = vectors.copy()
    for place, group in enumerate(groups):
        for before in groups[:place]:
            basis = found[:, before]
            partner = np.take(basis, order, axis=2) * (1.0 if factors is None else factors)
            overlap = np.einsum("pan,pbn->pab", partner, basis)
            share = _inverse(overlap) @ np.einsum("pan,pbn->pab", partner, found[:, group])
            found[:, group] -= np.swapaxes(share, 1, 2) @ basis
    return found


def _single(
    vector: NDArray[Any], image: NDArray[Any], beyond: NDArray[Any], partner: NDArray[Any]
) -> GroupNumbers:
    """The two-sided Rayleigh quotient of one level."""
    overlap = np.einsum("pn,pn->p", partner, vector)
    value = np.einsum("pn,pn->p", partner, image) / overlap
    residual = image - value[:, None] * vector
    right = _size(vector)
    left = right / np.abs(overlap)
    none = np.zeros(len(value))
    return GroupNumbers(value.astype(complex)[:, None], right, left, _size(beyond), _size(residual), none)


def _size(array: NDArray[Any]) -> NDArray[np.float64]:
    flat = array.reshape(len(array), -1)
    return np.asarray(
        np.sqrt(np.einsum("pi,pi->p", flat, flat.conj() if np.iscomplexobj(flat) else flat).real)
    )


def _inverse(matrix: NDArray[Any]) -> NDArray[Any]:
    with np.errstate(divide="ignore", invalid="ignore"):
        if matrix.shape[1] == 1:
            return np.asarray(1 / matrix)
        if matrix.shape[1] > 2:
            return np.linalg.inv(matrix)
        a, b, c, d = matrix[:, 0, 0], matrix[:, 0, 1], matrix[:, 1, 0], matrix[:, 1, 1]
        flat = np.stack([d, -b, -c, a], axis=1) / (a * d - b * c)[:, None]
    return np.asarray(flat.reshape(-1, 2, 2))


def _block_values(block: NDArray[Any]) -> NDArray[np.complex128]:
    """Eigenvalues of s × s blocks, shape (M, s)."""
    if block.shape[1] == 1:
        return block[:, 0].astype(complex)
    if block.shape[1] > 2:
        finite = np.isfinite(block).all(axis=(1, 2))
        return np.linalg.eigvals(np.where(finite[:, None, None], block, 0.0)).astype(complex)
    mean = (block[:, 0, 0] + block[:, 1, 1]) / 2
    half = (block[:, 0, 0] - block[:, 1, 1]) / 2
    square = half * half + block[:, 0, 1] * block[:, 1, 0]
    split = np.sqrt(square.astype(complex))
    return np.stack([mean + split, mean - split], axis=1)


def group_radii(
    groups: list[GroupNumbers], margins: Margins, rest: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Radius around each level that holds one of the untruncated T, shape (M, levels); else infinite.

    The inequality of :mod:`haarloom.numerics.bounds` with one term for each group, solved in closed
    form: a group of s levels has a resolvent of norm at most Σ_k Nᵏ/(δ_1 ⋯ δ_{k+1}), k < s, with δ the
    distances to its levels, nearest first; and a residual couples it to the levels left out like B and
    C couple it to what was cut off.
    """
    centres = np.concatenate([group.values for group in groups], axis=1)
    size = np.abs(centres)
    owner = np.repeat(np.arange(len(groups)), [group.values.shape[1] for group in groups])
    apart = np.abs(centres[:, :, None] - centres[:, None, :])
    with np.errstate(all="ignore"):
        # a tenth of the distance to D and to the rest is given away: it makes room for the radius itself
        room = (size - margins.beyond[:, None]) * 0.9
        spare = (size - rest[:, None]) * 0.9
        strengths = [_strength(group, margins, room, spare) for group in groups]
        crowd = _crowd(groups, strengths, apart, owner) + _left_over(groups, margins, room, spare)
        radius = np.full(centres.shape, np.inf)
        for level, number in enumerate(owner):
            group = groups[number]
            load = strengths[number][:, level] / (1 - crowd[:, level])
            mine = np.flatnonzero(owner == number)
            found = _reach(load, group.departure, apart[:, level, mine])
            others = np.where(owner == number, np.inf, apart[:, level]).min(axis=1)
            holds = (crowd[:, level] < 1) & (found < 0.1 * np.minimum(others, size[:, level]))
            holds &= (room[:, level] > 0) & (spare[:, level] > 0)
            radius[:, level] = np.where(holds, 1.05 * found, np.inf)
    return radius


def _strength(
    group: GroupNumbers, margins: Margins, room: NDArray[np.float64], spare: NDArray[np.float64]
) -> NDArray[np.float64]:
    """√(c² g + ‖V‖² η + r²/…) √(b² g + …) of a group near every level, shape (M, levels)."""
    up = (group.upwards + margins.tail * group.right)[:, None]
    ratio = (group.left / group.right)[:, None]
    first = up**2 / room + (group.right**2 * margins.noise)[:, None] + (group.residual**2)[:, None] / spare
    # left vectors are ΦJ times right ones and the inverse overlap: the same norms, times ‖Y‖/‖V‖
    return np.asarray(first * ratio)


def _reach(
    load: NDArray[np.float64], departure: NDArray[np.float64], apart: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Radius from which on load · ‖resolvent‖ < 1 on the circle.

    Parameters
    ----------
    apart
        Distances to all s levels of the group, its own 0 among them, shape (M, s).
    """
    order = apart.shape[1]
    others = np.sort(apart, axis=1)[:, 1:]
    # on a circle that stays on this side of the middle, each other level is at least half as far as now
    factors = np.cumprod(2 * departure[:, None] / others, axis=1)
    alone = load * (1 + factors.sum(axis=1))
    if order == 1:
        return np.asarray(alone)
    # a circle around all of them: each of the s terms is at most 1/s at the largest of these distances
    terms = [(order * load * departure**k) ** (1 / (k + 1)) for k in range(order)]
    together = others[:, -1] + np.max(terms, axis=0)
    return np.where(alone < others[:, 0] / 2, alone, together)


def _resolvent(
    distance: NDArray[np.float64], departure: NDArray[np.float64], order: int
) -> NDArray[np.float64]:
    total = term = 1 / distance
    for _ in range(1, order):
        term = term * departure[:, None] / distance
        total = total + term
    return np.asarray(total)


def _crowd(
    groups: list[GroupNumbers],
    strengths: list[NDArray[np.float64]],
    apart: NDArray[np.float64],
    owner: NDArray[np.int64],
) -> NDArray[np.float64]:
    """What all other groups add to the left side near each level, shape (M, levels)."""
    total = np.zeros(apart.shape[:2])
    for number, group in enumerate(groups):
        outside = np.flatnonzero(owner != number)
        nearest = 0.9 * apart[:, outside][:, :, owner == number].min(axis=2)
        order = group.values.shape[1]
        total[:, outside] += strengths[number][:, outside] * _resolvent(nearest, group.departure, order)
    return total


def _left_over(
    groups: list[GroupNumbers], margins: Margins, room: NDArray[np.float64], spare: NDArray[np.float64]
) -> NDArray[np.float64]:
    """The levels left out, as one block with the norms of the whole rim."""
    projector = np.sum([group.left * group.right for group in groups], axis=0) + 1.0
    coupling = (margins.rim**2)[:, None] / room + margins.noise[:, None]
    return np.asarray(coupling * projector[:, None] / spare)
