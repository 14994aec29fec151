"""Character coefficients of a Gaussian on the alcove, ∏_j exp(−x θ_j²/2), by determinants.

On the alcove θ_1 ≥ … ≥ θ_N ≥ θ_1 − 2π, Σ θ = 0, the weight χ_r* |Δ|² ∏ g(θ_j) is a product of two
determinants and of single-phase factors. Let Σ θ = S run free: the determinants do not notice, and the
Gaussian only gains exp(−x S²/2N), the same for all r. What is left, all phases in one window of length 2π
that begins at the least of them, is for each beginning a an integral of Andreief's kind,

    w_r d_r ∝ ∫ da [det(M + v uᵀ) − det M],  M_jk = ∫_a^{a+2π} dθ p_j(θ) e^{−i l_k θ} g(θ),

with v uᵀ the integrand of M at θ = a, l = λ + ρ, and p_j any functions that span e^{i ρ_k θ} with
determinant one. For p_j the powers of 2 sin(θ/2) are taken, which keep their size where g is narrow.

References
----------
C. Andréief, Mém. Soc. Sci. Bordeaux 2 (1883) 1; M. L. Mehta, Random Matrices, on ∏ over all eigenvalues.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep

__all__ = ["alcove_gaussian"]

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]

_EPS = float(np.finfo(float).eps)
_FAR = 9.0  # standard deviations; e^{−40} is left out
_STEP = 0.5  # of the beginnings a, in standard deviations of S/N
_SAFETY = 4.0
_CHUNK = 1_000_000  # matrix entries worked on at a time


def alcove_gaussian(group: SU, irreps: Sequence[Irrep], x: float) -> tuple[Floats, Floats]:
    """∫dP χ_r* w / ∫dP w of the class function w that is ∏_j exp(−x θ_j²/2) on the alcove.

    Parameters
    ----------
    group : SU
    irreps : sequence of Irrep
    x : float
        ≥ 0.

    Returns
    -------
    ratio, error : ndarray, shape (n_irreps,)
        The error is *measured*: two grids that share no node, of different order, are compared.
    """
    wanted = [group.trivial, *irreps]
    if x == 0:
        return np.array([float(not any(irrep.labels)) for irrep in irreps]), np.zeros(len(irreps))
    order = 48 + int(6 * np.sqrt(x)) + max(sum(irrep.labels) for irrep in wanted)
    one, other = _integral(wanted, x, order, 0.0), _integral(wanted, x, order + order // 2, 0.5)
    ratio = ((one + other) / (one + other)[0]).real
    change = np.abs(one / one[0] - other / other[0])
    return np.asarray(ratio[1:]), _SAFETY * np.maximum(change, change.max() * np.abs(ratio))[1:] + 32 * _EPS


def _integral(irreps: Sequence[Irrep], x: float, order: int, offset: float) -> Complexes:
    """∫da, by the trapezoidal rule, which converges exponentially for what is entire and dies away."""
    n = irreps[0].group.n
    rows = np.array([irrep.partition for irrep in irreps]) + np.arange(n - 1, -1, -1)
    in_nths = n * rows - rows.sum(axis=1, keepdims=True)  # Σ l = 0, so that l may be fractional
    distinct, place = np.unique(in_nths, return_inverse=True)
    exponents, place = distinct / n, place.reshape(rows.shape)
    total = np.zeros(len(irreps), dtype=complex)
    for begin in _beginnings(
        n, x, offset, max(1, _CHUNK // (n * max(n * len(irreps), order + len(exponents))))
    ):
        window, edge = _moments(n, exponents, x, begin, order)
        inner, outer = (m[:, :, place].transpose(0, 2, 1, 3) for m in (window, window + edge))
        total += (np.linalg.det(outer) - np.linalg.det(inner)).sum(axis=0)
    return total


def _beginnings(n: int, x: float, offset: float, step: int) -> Iterator[Floats]:
    """Where the window may begin: the Gaussian of the least phase a, of all if a > 0 or a < −2π."""
    all_of_them = _FAR / np.sqrt(n * x)
    lowest = -min(_FAR / np.sqrt(x), 2 * np.pi + all_of_them)
    width = _STEP / np.sqrt(n * x)
    first, last = np.floor(lowest / width), np.ceil(all_of_them / width)
    places = (np.arange(first, last + 1) + offset) * width
    for start in range(0, len(places), step):
        yield places[start : start + step]


def _moments(n: int, exponents: Floats, x: float, begin: Floats, order: int) -> tuple[Complexes, Complexes]:
    """M and v uᵀ for every beginning, shape (beginnings, N, exponents), p_j along the middle."""
    nodes, weights = np.polynomial.legendre.leggauss(order)
    theta = np.concatenate([begin[:, None] + np.pi * (nodes + 1), begin[:, None]], axis=1)[:, None, :]
    gauss = np.append(np.pi * weights, 1.0) * np.exp(-x * theta**2 / 2)
    j: Floats = np.arange(n, dtype=float)[:, None]
    # (x − 1)^j x^s, s centred, over x^{(N−1)/2}: unitriangular in the powers of x = e^{iθ}
    phase = j / 2 + (n - 1 - j) // 2 - (n - 1) / 2
    rows = gauss * np.exp(1j * theta * phase) * (2 * np.sin(theta / 2)) ** j
    waves = np.exp(-1j * theta[:, 0, :, None] * exponents)
    return np.asarray(rows[:, :, :-1] @ waves[:, :-1]), np.asarray(rows[:, :, -1:] * waves[:, -1:])
