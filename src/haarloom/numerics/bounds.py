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
common invariant subspace the block is S = D + N, N strictly triangular, and 1/|λ − Λᵢ| is replaced by
the bound Σ_k ‖N‖ᵏ / (δ_1 ⋯ δ_{k+1}) of its resolvent, δ the distances to D, nearest first (after
P. Henrici, *Numer. Math.* 4 (1962) 24; a path through N meets each level at most once).
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.blocks import Block, complete_blocks, leading_blocks
from haarloom.numerics.dense import EigenSystem
from haarloom.numerics.truncation import EPS, Truncation

__all__ = ["eigenvalue_errors", "mass_errors"]


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
    noise = truncation.noise if noise is None else noise
    errors = _radii(truncation, system.values[:levels], complete_blocks(truncation, system, levels), noise)
    reachable = np.abs(system.values[:levels]) > truncation.outer_norm
    if system.rest or np.isfinite(errors[reachable]).all():
        return errors
    again = _radii(truncation, system.values[:levels], leading_blocks(truncation, system, levels), noise)
    return np.minimum(errors, again)


def _radii(
    truncation: Truncation, centres: NDArray[Any], blocks: list[Block], noise: float
) -> NDArray[np.float64]:
    sizes = [(block.upwards, block.downwards, block.right, block.left) for block in blocks]
    up, down, right, left = np.array(sizes).T[:, :, None]
    errors = np.full(len(centres), np.inf)
    for level, centre in enumerate(centres):
        room = abs(centre) - truncation.outer_norm
        if room <= 0:
            continue
        radii = _candidate_radii(room, abs(centre), noise)
        margin = room - radii
        inverse = _resolvent_bounds(blocks, level, centre, radii)
        # one row and one column for coupling and rounding together, by Cauchy and Schwarz
        strength = np.sqrt((up**2 / margin + right**2 * noise) * (down**2 / margin + left**2 * noise))
        with np.errstate(invalid="ignore"):
            load = np.nan_to_num(strength * inverse, nan=np.inf)
        closed = np.flatnonzero(load.sum(axis=0) < 1)
        if closed.size:
            errors[level] = radii[closed[0]]
    return errors


def _candidate_radii(room: float, size: float, noise: float) -> NDArray[np.float64]:
    smallest = max(noise, EPS * size, 1e-300)
    if room <= smallest:
        return np.array([room / 2])
    return np.geomspace(smallest, room, max(int(np.log(room / smallest) / np.log(1.05)), 3))[:-1]


def _resolvent_bounds(
    blocks: list[Block], level: int, centre: complex, radii: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Bound of ‖(λ − S)⁻¹‖ on |λ − centre| = radius: shape (blocks, radii)."""
    found = np.empty((len(blocks), len(radii)))
    single = [place for place, block in enumerate(blocks) if len(block.values) == 1]
    values = np.array([blocks[place].values[0] for place in single])
    with np.errstate(divide="ignore", over="ignore"):
        found[single] = 1 / np.abs(np.abs(values - centre)[:, None] - radii)
        for place, block in enumerate(blocks):
            if block.clearance is not None:
                found[place] = 1 / np.maximum(block.clearance[level] - radii, 0.0)
            elif len(block.values) > 1:
                apart = np.sort(np.abs(np.abs(block.values - centre)[:, None] - radii), axis=0)
                factors = np.full(apart.shape, block.departure)
                factors[0] = 1.0
                found[place] = np.cumprod(factors / apart, axis=0).sum(axis=0)
    return found


def mass_errors(values: NDArray[Any], errors: NDArray[np.float64]) -> NDArray[np.float64]:
    """Bound of |δm| for m_n = −ln(λ_n/λ_0) from the radii of the eigenvalues; last axis the level.

    |ln(1 + x)| ≤ −ln(1 − |x|), and infinite where a radius reaches zero.
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        relative = np.minimum(errors / np.abs(values), 1.0)
        shifts = -np.log1p(-np.where(np.isfinite(relative), relative, 1.0))
    return np.asarray(shifts[..., 1:] + shifts[..., :1])
