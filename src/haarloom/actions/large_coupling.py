"""Large couplings: how k_r approaches 1, exactly through second order in the width τ of the plaquette weight.

With ln w = −p₂/2τ + a p₄ + b p₂² + O(θ⁶), p_k = Σ_j θ_j^k, the eigenphases of U are those of a traceless
Gaussian Hermitian matrix times corrections, and

    k_r = 1 − C₂(r) τ + c_r τ² + O(τ³).

a and b count as 1/τ times a number: the couplings grow together.
"""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
import sympy
from sympy import Expr, Integer, Rational

from haarloom.algebra.irrep import Irrep

if TYPE_CHECKING:
    from haarloom.actions.base import Link

__all__ = ["approach_to_one", "diffusion_time", "quartic_moments"]


def diffusion_time(link: Link) -> Expr:
    """The heat-kernel time t = N_t τ that the strip approaches at large coupling, 1/τ = −∂² ln w at U = 1.

    For the Wilson and the Manton action τ = N/β.
    """
    return link.plaquettes / link.inverse_width()[0]


def approach_to_one(link: Link, irrep: Irrep) -> Expr:
    """k_r through second order in the width, for N_t plaquettes.

    Parameters
    ----------
    link : a link weight with ``inverse_width``
        Wilson, mixed Wilson, Manton.
    irrep : Irrep

    Returns
    -------
    Expr
        1 − N_t C₂ τ + N_t c_r τ² + N_t(N_t − 1)/2 C₂² τ².

    Notes
    -----
    χ_r/d_r = 1 − T p₂/d + (A p₄ + B p₂²)/24d, and ∏ 4 sin²(θ_ij/2) = ∏ θ_ij² (1 − N p₂/12 + …). In the
    traceless Gaussian ensemble with D = N² − 1: ⟨p₂⟩ = Dτ, ⟨p₂²⟩ = D(D + 2)τ², ⟨p₄⟩ = (2N³ − 5N + 3/N)τ²; a
    homogeneous p of degree k has ⟨p₂ p⟩ = (D + k)τ⟨p⟩. So the covariances with p₂ are 2Dτ², 4τ⟨p₄⟩, 4τ⟨p₂²⟩.
    """
    inverse, a, b = link.inverse_width()
    tau, n = 1 / inverse, link.group.n
    big = n * n - 1
    fourth = (2 * n**3 - 5 * n + Rational(3, n)) * tau**2
    square = big * (big + 2) * tau**2
    moved = -Rational(n, 12) * 2 * big * tau**2 + a * 4 * tau * fourth + b * 4 * tau * square
    first, second = quartic_moments(irrep)
    ratio = irrep.index / irrep.dimension
    curvature = (first * fourth + second * square) / (24 * irrep.dimension) - ratio * moved
    casimir = irrep.casimir(2)
    count = Integer(link.plaquettes)
    strip = count * curvature + count * (count - 1) / 2 * casimir**2 * tau**2
    return 1 - count * casimir * tau + sympy.simplify(strip)


@lru_cache(maxsize=512)
def quartic_moments(irrep: Irrep) -> tuple[Rational, Rational]:
    """(A, B) with Σ_w (w·θ)⁴ = A p₄ + B p₂² on Σ θ = 0; for N ≤ 3, where p₄ = p₂²/2, A = 0.

    Solved exactly from integer values at two points.
    """
    n = irrep.group.n
    weights = irrep.weights()
    labels = np.array(list(weights), dtype=object)
    counts = list(weights.values())
    rows = []
    for phases in ([1, -1] + [0] * (n - 2), [n - 1] + [-1] * (n - 1)):
        partial = np.cumsum(np.array(phases[:-1], dtype=object))
        total = sum(c * int(v) ** 4 for c, v in zip(counts, labels @ partial, strict=True))
        p2, p4 = (sum(p**k for p in phases) for k in (2, 4))
        rows.append((Integer(p4), Integer(p2) ** 2, Integer(total)))
    (a1, b1, t1), (a2, b2, t2) = rows
    if n <= 3:
        return Rational(0), Rational(t1, b1)
    determinant = a1 * b2 - a2 * b1
    return Rational(t1 * b2 - t2 * b1, determinant), Rational(a1 * t2 - a2 * t1, determinant)
