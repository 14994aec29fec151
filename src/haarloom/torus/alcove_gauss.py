"""Gauss quadrature over one alcove of eigenphases, for class functions with creases on its walls.

The alcove θ_1 ≥ … ≥ θ_N ≥ θ_1 − 2π, Σ θ = 0, is a simplex that holds every conjugacy class once; its
corners are the elements of the centre. A function of the geodesic distance is smooth inside and creased on
its images' walls, so a product Gauss rule on the collapsed simplex converges exponentially where a periodic
grid does not.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from haarloom.exceptions import SizeError

__all__ = ["alcove_nodes"]

Floats = NDArray[np.float64]

_MOST_NODES = 400_000


@lru_cache(maxsize=16)
def alcove_nodes(n: int, order: int) -> tuple[Floats, Floats]:
    """Nodes and weights for ∫ dP f(P), f a class function.

    Parameters
    ----------
    n : int
        N of SU(N).
    order : int
        Gauss points for each of the N − 1 directions.

    Returns
    -------
    angles : ndarray, shape (order^(N−1), N)
        All N eigenphases, sum 0.
    weights : ndarray, shape (order^(N−1),)
        Weyl measure included; they add up to 1.

    Raises
    ------
    SizeError
        If there would be more than some hundred thousand nodes.

    References
    ----------
    A. H. Stroud, Approximate Calculation of Multiple Integrals (1971), §2.4: collapsed simplex.
    """
    if order ** (n - 1) > _MOST_NODES:
        raise SizeError(
            f"{order} Gauss points in each of {n - 1} directions make {order ** (n - 1):,} nodes, "
            f"more than {_MOST_NODES:,}: take fewer."
        )
    barycentric, weights = _simplex(n - 1, order)
    angles = barycentric @ _corners(n)
    first, second = np.triu_indices(n, 1)
    weights = weights * (4 * np.sin((angles[:, first] - angles[:, second]) / 2) ** 2).prod(axis=1)
    weights /= weights.sum()
    for array in (angles, weights):
        array.flags.writeable = False
    return angles, weights


def _corners(n: int) -> Floats:
    """Corner k: the first k eigenphases 2π(1 − k/N), the others −2πk/N; the centre element e^{−2πik/N}."""
    k = np.arange(n)[:, None]
    return 2 * np.pi * ((np.arange(n) < k) - k / n)


def _simplex(dimension: int, order: int) -> tuple[Floats, Floats]:
    """Barycentric nodes (M, dimension + 1) and weights of the collapsed product rule."""
    from scipy.special import roots_jacobi

    nodes, weights = np.ones((1, 1)), np.ones(1)
    for step in range(dimension):
        # splitting the last coordinate s into s·u and s·(1 − u) has the Jacobian (1 − u)^(dimension − 1 −
        # step)
        u, factor = roots_jacobi(order, dimension - 1 - step, 0)
        u = (u + 1) / 2
        rest = nodes[:, None, -1:] * np.stack([u, 1 - u], axis=-1)[None]
        nodes = np.concatenate([np.repeat(nodes[:, None, :-1], order, axis=1), rest], axis=-1).reshape(
            -1, step + 2
        )
        weights = (weights[:, None] * factor).ravel()
    return nodes, weights
