"""Invariant subspaces of a solved T, as the error bound wants them: single levels, clusters, and the rest."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.dense import EigenSystem
from haarloom.numerics.ordering import clean_cut
from haarloom.numerics.truncation import Truncation

__all__ = ["Block", "complete_blocks", "leading_blocks"]

STIFF = 1e4
"""Condition number from which a level is looked at together with its nearest neighbour."""

GUARD = 6
"""Most levels beyond those wanted that are kept apart from the rest."""


@dataclass(frozen=True, eq=False)
class Block:
    """An invariant subspace that the bound treats as one.

    Attributes
    ----------
    values
        Its eigenvalues, shape (m,); empty for the rest of the spectrum.
    upwards, downwards
        c = ‖C X‖ and b = ‖Yᵀ B‖.
    right, left
        ‖X‖ and ‖Y‖; their product is the condition number.
    departure
        ‖N‖, the size of the part that is not normal.
    clearance
        For the rest: 1/‖(Λ − S)⁻¹‖ at each leading level Λ, shape (levels,).
    """

    values: NDArray[Any]
    upwards: float
    downwards: float
    right: float
    left: float
    departure: float = 0.0
    clearance: NDArray[np.float64] | None = None


def complete_blocks(truncation: Truncation, system: EigenSystem, levels: int) -> list[Block]:
    """All computed levels, nearly coalesced ones together; with what was not computed as one block."""
    blocks = _level_blocks(truncation, system, levels, np.arange(len(system.values)))
    return [*blocks, *([_uncomputed(truncation, system, levels)] if system.rest else [])]


def leading_blocks(truncation: Truncation, system: EigenSystem, levels: int) -> list[Block]:
    """Leading levels one by one, all others as one block in an orthonormal basis.

    For a T so far from normal that its small eigenvalues are ill-conditioned beyond use.
    """
    count = clean_cut(system.values, levels, levels + GUARD)
    blocks = _level_blocks(truncation, system, levels, np.arange(count))
    return [*blocks, _rest(truncation, system, levels, count)] if count < truncation.size else blocks


def _rest(truncation: Truncation, system: EigenSystem, levels: int, count: int) -> Block:
    """The complement of the leading vectors: orthonormal Q with Yᵀ Q = 0; resolvents by singular values."""
    right, left = system.right[:, :count], system.left[:, :count]
    basis = np.linalg.qr(left.conj(), mode="complete")[0][:, count:]
    inner = basis.conj().T @ truncation.apply(basis)
    dual = basis.conj() - left @ (basis.conj().T @ right).T
    upwards, downwards = truncation.coupling(basis, dual)
    unit = np.eye(len(inner))
    clearance = [np.linalg.norm(value * unit - inner, -2) for value in system.values[:levels]]
    return Block(
        np.zeros(0),
        float(np.linalg.norm(upwards)),
        float(np.linalg.norm(downwards)),
        1.0,
        float(np.linalg.norm(dual, 2)),
        clearance=np.array(clearance),
    )


def _uncomputed(truncation: Truncation, system: EigenSystem, levels: int) -> Block:
    """The levels that were not computed, with the crude norms of the whole rim.

    Their resolvent is taken as if T were normal there: an estimate, not a proof, that enters the
    bounds of the computed levels in second order only.
    """
    projector = 1 + float(np.linalg.norm(system.right, 2) * np.linalg.norm(system.left, 2))
    rim = truncation.rim_norm
    clearance = np.maximum(np.abs(system.values[:levels]) - system.rest, 0.0)
    return Block(np.zeros(0), rim, rim * projector, 1.0, projector, clearance=clearance)


def _level_blocks(
    truncation: Truncation, system: EigenSystem, levels: int, kept: NDArray[np.int64]
) -> list[Block]:
    """Single levels, and clusters of nearly coalesced ones, out of the first ``len(kept)``."""
    clusters = _stiff_clusters(system, levels, truncation.noise, len(kept))
    blocks = [_cluster(truncation, system, members) for members in clusters]
    single = np.setdiff1d(kept, [member for members in clusters for member in members])
    right, left = system.right[:, single], system.left[:, single]
    norms = (
        *truncation.coupling(right, left),
        np.linalg.norm(right, axis=0),
        np.linalg.norm(left, axis=0),
    )
    for level, up, down, size, dual in zip(single, *norms, strict=True):
        value = system.values[level : level + 1]
        blocks.append(Block(value, float(up), float(down), float(size), float(dual)))
    return blocks


def _stiff_clusters(system: EigenSystem, levels: int, noise: float, count: int) -> list[list[int]]:
    """Groups of levels that nearly coalesce: large κ, joined to their nearest neighbour.

    Levels far below the ones asked for are left alone unless their κ η would reach up to these.
    """
    values, condition = system.values[:count], system.condition[:count]
    partner: dict[int, set[int]] = {}
    apart = np.abs(values[:, None] - values[None, :levels])
    apart[np.arange(levels), np.arange(levels)] = np.inf
    reaches = condition * noise > 0.01 * apart.min(axis=1)
    relevant = np.flatnonzero(reaches | ((condition > STIFF) & (np.arange(count) < levels + 2)))
    for level in map(int, relevant if count > 1 else ()):
        distance = np.abs(values - values[level])
        distance[level] = np.inf
        nearest = int(np.argmin(distance))
        group = partner.get(level, {level}) | partner.get(nearest, {nearest})
        for member in group:
            partner[member] = group
    groups = {id(group): sorted(group) for group in partner.values()}
    return list(groups.values())


def _cluster(truncation: Truncation, system: EigenSystem, members: list[int]) -> Block:
    """Levels taken together in an orthonormal basis, from ordered Schur forms of T and its transpose."""
    matrix = truncation.dense.astype(complex)
    basis, schur = _leading_schur(matrix, system.values[members])
    dual, _ = _leading_schur(matrix.T, system.values[members])
    dual = dual @ np.linalg.inv(basis.T @ dual)
    upwards, downwards = truncation.coupling(basis, dual)
    return Block(
        np.diag(schur),
        float(np.linalg.norm(upwards)),
        float(np.linalg.norm(downwards)),
        1.0,
        float(np.linalg.norm(dual, 2)),
        float(np.linalg.norm(np.triu(schur, 1))),
    )


def _leading_schur(matrix: NDArray[Any], values: NDArray[Any]) -> tuple[NDArray[Any], NDArray[Any]]:
    from scipy.linalg import schur

    size = len(values)
    ranks = np.abs(np.linalg.eigvals(matrix)[:, None] - values).min(axis=1)
    reach = np.sort(ranks)[size - 1 : size + 1].mean()
    form, vectors, _ = schur(matrix, output="complex", sort=lambda x: bool(np.abs(x - values).min() < reach))
    return vectors[:, :size], form[:size, :size]
