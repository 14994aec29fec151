"""Polynomial interpolation on Chebyshev nodes, in barycentric form.

J.-P. Berrut, L. N. Trefethen, *SIAM Rev.* 46 (2004) 501.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["chebyshev_decay", "chebyshev_nodes", "lagrange_matrix"]


def chebyshev_nodes(start: float, stop: float, count: int) -> NDArray[np.float64]:
    """Roots of the Chebyshev polynomial of degree ``count``, moved to an interval, in order."""
    angles = np.pi * (2 * np.arange(count) + 1) / (2 * count)
    return np.asarray((start + stop) / 2 - (stop - start) / 2 * np.cos(angles))


def lagrange_matrix(nodes: NDArray[np.float64], points: NDArray[np.float64]) -> NDArray[np.float64]:
    """Values of the Lagrange polynomials of the nodes: shape (points, nodes); rows add up to one."""
    count = len(nodes)
    apart = points[:, None] - nodes[None, :]
    hit = apart == 0
    angles = np.pi * (2 * np.arange(count) + 1) / (2 * count)
    weights = np.sin(angles) * (-1.0) ** np.arange(count)
    ratio = weights / np.where(hit, 1.0, apart)
    rows = ratio / ratio.sum(axis=1, keepdims=True)
    exact = hit.any(axis=1)
    rows[exact] = hit[exact]
    return np.asarray(rows)


def chebyshev_decay(values: NDArray[Any]) -> NDArray[np.float64]:
    """Largest Chebyshev coefficient from each order on, along the first axis, relative to the largest value.

    Entry q is about the interpolation error of a smooth function with q nodes.
    """
    count = len(values)
    angles = np.pi * (2 * np.arange(count) + 1) / (2 * count)
    waves = np.cos(np.outer(np.arange(count), np.pi - angles)) * (2 / count)
    sizes = np.abs(np.tensordot(waves, values, axes=1)).reshape(count, -1).max(axis=1) / np.abs(values).max()
    return np.asarray(np.maximum.accumulate(sizes[::-1])[::-1])
