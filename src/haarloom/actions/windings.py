"""The heat kernel of SU(N) on the torus of eigenphases: a sum over windings, at large τ over characters."""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache
from math import ceil, factorial, prod, sqrt
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["heat_kernel_at", "shortest_phases", "winding_vectors"]

_FEW = 3000  # windings summed one by one; more go through determinants
_DIRECT_PIECE, _DETERMINANT_PIECE, _CHARACTER_PIECE = 4096, 256, 32  # angles at a time
_NEGLIGIBLE = 80.0  # e^{−40} against the leading geodesic
_MOST_CANCELLED = 20.0  # windings cancel to e^{−20} of their size at most

Floats = NDArray[np.float64]


def heat_kernel_at(n: int, phases: Floats, tau: float) -> Floats:
    """Heat kernel Σ_r d_r e^{−τC₂(r)} χ_r of SU(N), by Poisson summation where that is the faster sum.

    With θ^m = θ + 2πm, Σ m_j = 0,

        w = √N (2π/τ)^{(N−1)/2} τ^{−N(N−1)/2} e^{τN(N²−1)/24} / ∏_{k<N} k!
            · Σ_m ∏_{i<j} (θ_i^m − θ_j^m) / (2 sin((θ_i − θ_j)/2)) · exp(−Σ_j (θ_j^m)²/2τ).

    The signs (−1)^{m_i − m_j} of the shifted sines multiply to (−1)^{(N−1) Σ m} = 1 for every N. For
    τN(N² − 1)/24 > 20 windings cancel to more than nine digits; there the few characters that matter are
    summed.

    Parameters
    ----------
    n : int
    phases : ndarray, shape (..., N)
        All eigenphases; their sum may be any multiple of 2π.
    tau : float
        > 0.

    References
    ----------
    P. Menotti, E. Onofri, Nucl. Phys. B 190 (1981) 288; J. S. Dowker, Ann. Phys. 62 (1971) 361.
    """
    flat = shortest_phases(np.asarray(phases, dtype=float).reshape(-1, n))
    numerator, step = _numerator(n, flat, tau)

    def kernel(theta: NDArray[Any]) -> NDArray[Any]:
        return np.asarray(numerator(theta) / _product(2 * np.sin(_gaps(theta) / 2)))

    starts = range(0, len(flat), step)
    pieces = [_with_limits(kernel, flat[start : start + step], tau) for start in starts]
    return np.concatenate([np.empty(0), *pieces]).reshape(np.shape(phases)[:-1])


def _numerator(n: int, flat: Floats, tau: float) -> tuple[Callable[[NDArray[Any]], NDArray[Any]], int]:
    """w ∏_{i<j} 2 sin((θ_i − θ_j)/2) by the sum that suits, and how many angles to take at a time."""
    if tau * n * (n * n - 1) / 24 > _MOST_CANCELLED:
        return _by_characters(n, tau), _CHARACTER_PIECE
    length = float(np.sqrt((flat**2).sum(axis=1)).max(initial=0.0))
    radius = (length + sqrt(length**2 + _NEGLIGIBLE * tau)) / (2 * np.pi)
    windings = winding_vectors(n, ceil(radius**2), _FEW)
    if windings is None:
        return _by_determinants(n, tau, ceil(radius)), _DETERMINANT_PIECE
    return _one_by_one(n, tau, windings), _DIRECT_PIECE


def shortest_phases(phases: Floats) -> Floats:
    """The same eigenvalues with phases of about π at most that add up to zero, shape (points, N)."""
    phases = phases - 2 * np.pi * np.round(phases / (2 * np.pi))
    excess = np.round(phases.sum(axis=1) / (2 * np.pi))[:, None]
    rank = np.argsort(np.argsort(-phases * np.sign(excess), axis=1), axis=1)
    return np.asarray(phases - 2 * np.pi * np.sign(excess) * (rank < np.abs(excess)))


@lru_cache(maxsize=64)
def winding_vectors(n: int, norm: int, most: int) -> NDArray[np.int_] | None:
    """Integer vectors of n entries with Σ m = 0 and m·m ≤ norm, or None if there are more than `most`."""
    found: list[tuple[int, ...]] = []
    heads: list[tuple[int, ...]] = [()]
    while heads:
        head = heads.pop()
        left, rest = norm - sum(m * m for m in head), n - len(head)
        if sum(head) ** 2 > left * rest:  # the rest cannot make up for the sum (Cauchy and Schwarz)
            continue
        if rest == 1:
            found.append((*head, -sum(head)))
            if len(found) > most:
                return None
            continue
        top = int(sqrt(left))
        heads.extend((*head, m) for m in range(-top, top + 1))
    return np.array(found)


def _gaps(theta: NDArray[Any]) -> NDArray[Any]:
    """θ_i − θ_j for i < j, shape (..., N(N−1)/2)."""
    first, second = np.triu_indices(theta.shape[-1], 1)
    return np.asarray(theta[..., first] - theta[..., second])


def _product(factors: NDArray[Any]) -> NDArray[Any]:
    return np.asarray(factors.prod(axis=-1))


def _constant(n: int, tau: float) -> float:
    volume = sqrt(n) * (2 * np.pi / tau) ** ((n - 1) / 2) * tau ** (-n * (n - 1) / 2)
    return float(volume * np.exp(tau * n * (n * n - 1) / 24) / prod(factorial(k) for k in range(n)))


def _one_by_one(n: int, tau: float, windings: NDArray[np.int_]) -> Callable[[NDArray[Any]], NDArray[Any]]:
    def numerator(theta: NDArray[Any]) -> NDArray[Any]:
        total = np.zeros(theta.shape[:-1], dtype=theta.dtype)
        for winding in windings:
            moved = theta + 2 * np.pi * winding
            total += _product(_gaps(moved)) * np.exp(-(moved**2).sum(axis=-1) / (2 * tau))
        return _constant(n, tau) * total

    return numerator


def _by_determinants(n: int, tau: float, most: int) -> Callable[[NDArray[Any]], NDArray[Any]]:
    """The same sum for many windings.

    The product over i < j is a Vandermonde determinant, so for a fixed phase φ conjugate to Σ m the sum
    factorises into an N×N determinant of one-dimensional sums; a finite Fourier average over φ picks Σ m = 0.
    """

    def numerator(theta: NDArray[Any]) -> NDArray[Any]:
        turns = np.arange(-most - 1, most + 2)
        moved = theta[..., None] + 2 * np.pi * turns
        gauss = np.exp(-(moved**2) / (2 * tau))
        powers = np.stack([gauss * moved**k for k in range(n - 1, -1, -1)], axis=-2)
        nodes = n * len(turns)
        fourier = np.exp(2j * np.pi * np.outer(turns, np.arange(nodes)) / nodes)
        summed = np.moveaxis(powers @ fourier, -1, -3)
        return _constant(n, tau) * np.asarray(np.linalg.det(summed).mean(axis=-1))

    return numerator


def _by_characters(n: int, tau: float) -> Callable[[NDArray[Any]], NDArray[Any]]:
    """Σ_r d_r e^{−τC₂(r)} det e^{i l_k θ_j}, divided by (−i)^{N(N−1)/2}; l = λ + ρ, ρ centred.

    d_r = det L_p(l_k) with L_p Lagrange's polynomials on the points ρ, so that by Cauchy and Binet's formula
    the sum over l is one N×N determinant of one-dimensional sums, dominated by l = ρ without cancellation.
    Each r is met once where Σ l is one of N consecutive numbers S; a finite Fourier sum picks S, and
    τC₂ = ½τ (Σ l² − S²/N − Σ ρ²).
    """
    rho: Floats = np.arange(n, dtype=float) - (n - 1) / 2
    far = ceil(rho[-1] + 3 + sqrt(90 / tau))
    exponents = np.arange(-far, far + 1) + (n - 1) % 2 / 2
    basis = _lagrange(rho, exponents) * np.exp(-tau / 2 * (exponents[:, None] ** 2 - rho**2))
    nodes = 2 * n * (far + 1)
    phi = 2 * np.pi * np.arange(nodes) / nodes
    sums = np.arange(-((n - 1) // 2), n // 2 + 1)
    # beyond e^{−45} the least irrep of that N-ality, k boxes in a column, leaves nothing
    sums = sums[tau * np.abs(sums) * (n - np.abs(sums)) * (n + 1) / (2 * n) < 45]
    picked = (np.exp(-1j * np.outer(phi, sums)) @ np.exp(tau * sums**2 / (2 * n))) / nodes
    turned = basis[:, :, None] * np.exp(1j * np.outer(exponents, phi))[:, None, :]

    def numerator(theta: NDArray[Any]) -> NDArray[Any]:
        waves = np.exp(1j * theta[..., None] * exponents)
        entries = np.einsum("...jl,lpf->...fjp", waves, turned, optimize=True)
        return np.asarray(np.linalg.det(entries) @ picked / (-1j) ** (n * (n - 1) // 2 % 4))

    return numerator


def _lagrange(points: Floats, places: Floats) -> Floats:
    """The polynomials that are 1 at one of the points and 0 at the others, shape (places, points)."""
    others = [np.delete(points, p) for p in range(len(points))]
    ratios = [
        (places[:, None] - other) / (point - other) for point, other in zip(points, others, strict=True)
    ]
    return np.stack([ratio.prod(axis=1) for ratio in ratios], axis=1)


def _with_limits(kernel: Callable[[NDArray[Any]], NDArray[Any]], phases: Floats, tau: float) -> Floats:
    """The kernel's values; where eigenvalues nearly coincide, its mean over a complex circle.

    0/0 is removable there. The circle moves every difference of eigenphases by a multiple of one
    complex number, so it meets no zero of the sines.
    """
    n = phases.shape[1]
    close = np.abs(np.sin(_gaps(phases) / 2)).min(axis=1) < min(0.1, 0.2 * sqrt(tau))
    result = np.empty(len(phases))
    result[~close] = kernel(phases[~close]).real
    # the Gaussian grows by e^{|shift|²/2τ} off the real axis; keep |shift|² = radius² n(n²−1)/12 near τ
    radius = min(2.4 / n, sqrt(16 * tau / (n * (n * n - 1))))
    nodes = radius * np.exp(2j * np.pi * (np.arange(40) + 0.5) / 40)
    moved = phases[close][:, None, :] + nodes[:, None] * (np.arange(n) - (n - 1) / 2)
    result[close] = kernel(moved).mean(axis=-1).real
    return result
