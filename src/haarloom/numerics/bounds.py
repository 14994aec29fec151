"""How far each computed eigenvalue may lie from one of the untruncated T.

Split T = [[A, B], [C, D]], A inside the basis. For |λ| > d ≥ ‖D‖, λ is an eigenvalue of T exactly
if it is one of A + B (λ − D)⁻¹ C. With A = X Λ Yᵀ, Yᵀ X = 1, the added term has in the eigenvector
basis elements of size at most bᵢ cⱼ / (|λ| − d), bᵢ = ‖yᵢᵀ B‖, cⱼ = ‖C xⱼ‖: products of a row and a
column, for which Gershgorin's argument sharpens to one scalar inequality. An eigenvalue needs

    Σᵢ √(bᵢ² g + ‖yᵢ‖² η) √(cᵢ² g + ‖xᵢ‖² η) / |λ − Λᵢ|  ≥  1,    g = 1 / (|λ| − d),

η bounding ‖δT‖ from rounding. Where the left side is below 1 on a whole circle,
the disc within holds as many eigenvalues of T as of A (switch B on continuously). Only the rim of
the basis that W couples outwards enters bᵢ and cᵢ.

Levels about to coalesce have a huge κᵢ = ‖xᵢ‖‖yᵢ‖. They are taken together: in an orthonormal basis of their
common invariant subspace the block is S = D + N, and 1/|λ − Λᵢ| is replaced by the bound
Σ_k ‖N‖ᵏ / dist(λ, D)^{k+1} of its resolvent (P. Henrici, *Numer. Math.* 4 (1962) 24).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.dense import EigenSystem
from haarloom.numerics.truncation import EPS, Truncation

__all__ = ["Block", "eigenvalue_errors", "mass_errors", "spectral_blocks"]

STIFF = 1e4
"""Condition number from which a level is looked at together with its nearest neighbour."""


@dataclass(frozen=True, eq=False)
class Block:
    """An invariant subspace that the bound treats as one.

    Attributes
    ----------
    values
        Its eigenvalues, shape (m,).
    upwards, downwards
        c = ‖C X‖ and b = ‖Yᵀ B‖.
    right, left
        ‖X‖ and ‖Y‖; their product is the condition number.
    departure
        ‖N‖, the size of the part that is not normal.
    around
        Whether ``values`` holds the radius of a disc about 0 that contains its eigenvalues.
    """

    values: NDArray[Any]
    upwards: float
    downwards: float
    right: float
    left: float
    departure: float
    around: bool = False


def spectral_blocks(truncation: Truncation, system: EigenSystem, levels: int) -> list[Block]:
    """The blocks of a spectrum with what each couples outwards; single levels unless nearly coalesced."""
    clusters = _stiff_clusters(system, levels)
    single = np.ones(len(system.values), dtype=bool)
    right, left = system.right.astype(complex), system.left.astype(complex)
    blocks = []
    for members in clusters:
        single[members] = False
        basis, dual, schur = _orthonormal_cluster(truncation, system, members)
        upwards, downwards = truncation.coupling(basis, dual)
        blocks.append(
            Block(
                np.diag(schur),
                float(np.linalg.norm(upwards)),
                float(np.linalg.norm(downwards)),
                1.0,
                float(np.linalg.norm(dual, 2)),
                float(np.linalg.norm(np.triu(schur, 1))),
            )
        )
    kept = np.flatnonzero(single)
    norms = (
        *truncation.coupling(right[:, kept], left[:, kept]),
        np.linalg.norm(right[:, kept], axis=0),
        np.linalg.norm(left[:, kept], axis=0),
    )
    for level, *sizes in zip(kept, *norms, strict=True):
        blocks.append(Block(system.values[level : level + 1], *map(float, sizes), departure=0.0))
    return blocks


def _left_over(truncation: Truncation, system: EigenSystem) -> list[Block]:
    """The levels that were not computed, as one block with the crude norms of the whole rim.

    Its resolvent is taken as if it were normal, with the largest |λ| left out: an estimate, not a
    proof, that enters the bounds of the computed levels in second order only.
    """
    if not system.rest:
        return []
    projector = 1 + float(np.linalg.norm(system.right, 2) * np.linalg.norm(system.left, 2))
    rim = truncation.rim_norm
    return [Block(np.array([system.rest]), rim, rim * projector, 1.0, projector, 0.0, around=True)]


def _stiff_clusters(system: EigenSystem, levels: int) -> list[list[int]]:
    """Groups of levels that nearly coalesce: large κ, joined to their nearest neighbour."""
    values, condition = system.values, system.condition
    partner: dict[int, set[int]] = {}
    # levels far below the ones asked for are harmless however ill-conditioned
    relevant = np.flatnonzero(condition[: levels + 2] > STIFF)
    for level in relevant:
        distance = np.abs(values - values[level])
        distance[level] = np.inf
        nearest = int(np.argmin(distance))
        group = partner.get(level, {int(level)}) | partner.get(nearest, {nearest})
        for member in group:
            partner[member] = group
    groups = {id(group): sorted(group) for group in partner.values()}
    return list(groups.values())


def _orthonormal_cluster(
    truncation: Truncation, system: EigenSystem, members: list[int]
) -> tuple[NDArray[Any], NDArray[Any], NDArray[Any]]:
    """Right basis (orthonormal), dual left basis and Schur block of a cluster, from ordered Schur forms."""
    matrix = truncation.dense.astype(complex)
    basis, schur = _leading_schur(matrix, system.values[members])
    dual, _ = _leading_schur(matrix.T, system.values[members])
    dual = dual @ np.linalg.inv(basis.T @ dual)
    return basis, dual, schur


def _leading_schur(matrix: NDArray[Any], values: NDArray[Any]) -> tuple[NDArray[Any], NDArray[Any]]:
    from scipy.linalg import schur

    size = len(values)
    ranks = np.abs(np.linalg.eigvals(matrix)[:, None] - values).min(axis=1)
    reach = np.sort(ranks)[size - 1 : size + 1].mean()
    form, vectors, _ = schur(matrix, output="complex", sort=lambda x: bool(np.abs(x - values).min() < reach))
    return vectors[:, :size], form[:size, :size]


def eigenvalue_errors(
    truncation: Truncation, system: EigenSystem, levels: int, noise: float | None = None
) -> NDArray[np.float64]:
    """Radius around each of the first ``levels`` eigenvalues that holds one of the untruncated T.

    Infinite where the bound does not close: |λ| is not above ‖D‖, or the coupling is too strong.

    Parameters
    ----------
    noise
        η; the truncation's own bound for rounding and input errors when left out, 0 for what the
        cutoff alone does.

    Returns
    -------
    Shape (levels,).
    """
    blocks = [*spectral_blocks(truncation, system, levels), *_left_over(truncation, system)]
    values = np.concatenate([block.values for block in blocks])
    owner = np.repeat(np.arange(len(blocks)), [len(block.values) for block in blocks])
    up, down, right, left = np.array(
        [(block.upwards, block.downwards, block.right, block.left) for block in blocks]
    ).T[:, :, None]
    departure = np.array([block.departure for block in blocks])
    order = np.array([len(block.values) for block in blocks])
    around = np.repeat([block.around for block in blocks], order)
    noise = truncation.noise if noise is None else noise
    beyond = truncation.outer_norm
    errors = np.full(levels, np.inf)
    for level, centre in enumerate(system.values[:levels]):
        room = abs(centre) - beyond
        if room <= 0:
            continue
        radii = _candidate_radii(room, abs(centre), noise)
        margin = room - radii
        distance = np.where(around, np.maximum(abs(centre) - values.real, 0.0), np.abs(values - centre))
        inverse = _resolvent_bound(distance, owner, order, departure, radii)
        inverse[:, radii >= np.min(distance[around], initial=np.inf)] = np.inf
        # one row and one column for coupling and rounding together, by Cauchy and Schwarz
        load = np.sqrt((up**2 / margin + right**2 * noise) * (down**2 / margin + left**2 * noise)) * inverse
        closed = np.flatnonzero(load.sum(axis=0) < 1)
        if closed.size:
            errors[level] = radii[closed[0]]
    return errors


def _candidate_radii(room: float, size: float, noise: float) -> NDArray[np.float64]:
    smallest = max(noise, EPS * size, 1e-300)
    if room <= smallest:
        return np.array([room / 2])
    return np.geomspace(smallest, room, max(int(np.log(room / smallest) / np.log(1.05)), 3))[:-1]


def _resolvent_bound(
    distance: NDArray[np.float64],
    owner: NDArray[np.int64],
    order: NDArray[np.int64],
    departure: NDArray[np.float64],
    radii: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Bound of ‖(λ − S)⁻¹‖ for each block, |λ − centre| = radius: shape (blocks, radii)."""
    apart = np.abs(distance[:, None] - radii)
    nearest = np.full((len(order), len(radii)), np.inf)
    np.minimum.at(nearest, owner, apart)
    with np.errstate(divide="ignore", over="ignore"):
        step = departure[:, None] / nearest
        bound = 1 / nearest
        total = bound.copy()
        for power in range(1, int(order.max())):
            bound = bound * step
            total = total + np.where(order[:, None] > power, bound, 0.0)
    return total


def mass_errors(values: NDArray[Any], errors: NDArray[np.float64]) -> NDArray[np.float64]:
    """Bound of |δm| for m_n = −ln(λ_n/λ_0) from the radii of the eigenvalues; last axis the level.

    |ln(1 + x)| ≤ −ln(1 − |x|), and infinite where a radius reaches zero.
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        relative = np.minimum(errors / np.abs(values), 1.0)
        shifts = -np.log1p(-np.where(np.isfinite(relative), relative, 1.0))
    return np.asarray(shifts[..., 1:] + shifts[..., :1])
