"""Numbers for the Wilson action of SU(N): sums of Bessel determinants, with their error.

exp[(β/N) Re tr U] is a product over eigenvalues of exp[x cos θ] = Σ_k I_k(x) e^{ikθ}, x = β/N (NIST DLMF
10.35.2), so W_λ(x) = Σ_m det[I_{λ_j − j + i + m}(x)] and k_λ = W_λ/(d_λ W_0).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from fractions import Fraction
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from haarloom.actions.bessel import bessel_integers, margin_of
from haarloom.actions.toeplitz import Rows, difference_rows, toeplitz_integers, toeplitz_sums
from haarloom.algebra.irrep import Irrep

__all__ = ["wilson_floats", "wilson_fraction", "wilson_shell_bound"]

Floats = NDArray[np.float64]

_EPS = float(np.finfo(float).eps)
_OMITTED = 2.0**-58  # what is left out of the sum over m, relative to its value, by the choice of margin
_GOOD_ENOUGH = 1e-9  # relative error above which integers of any length take over
_NEGLIGIBLE = 1e-17  # absolute error below which they do not, because k_0 = 1


def wilson_floats(irreps: Sequence[Irrep], x: Floats) -> tuple[Floats, Floats]:
    """k_r of one plaquette and a bound on the error of each.

    Parameters
    ----------
    irreps : sequence of Irrep
        At least one, all of the same group SU(N).
    x : ndarray, shape (points,)
        β/N ≥ 0.

    Returns
    -------
    k, error : ndarray, shape (points, n_irreps)
    """
    n = irreps[0].group.n
    if n == 2:
        return _two(irreps, x)
    partitions = np.array([(0,) * n, *(r.partition for r in irreps)])
    margin = _margin(n, float(x.max()))
    reach = int(partitions.max()) + margin + n
    w, bound = toeplitz_sums(partitions, [_rows(float(value), n, reach) for value in x], margin)
    w, bound = w / w[:, :1], bound / w[:, :1]
    dimensions = np.array([float(r.dimension) for r in irreps])
    k = w[:, 1:] / dimensions
    error = (bound[:, 1:] + w[:, 1:] * bound[:, :1]) / dimensions + (4 * _EPS + _OMITTED) * np.abs(k)
    return _repaired(irreps, x, k, error)


def _two(irreps: Sequence[Irrep], x: Floats) -> tuple[Floats, Floats]:
    """SU(2): k_j = I_{2j+1}(β)/I_1(β), β = 2x."""
    orders = [r.labels[0] + 1 for r in irreps]
    k = np.array([_ratios_two(2 * float(value), orders) for value in x])
    return k, 2 * _EPS * k


def _ratios_two(beta: float, orders: list[int]) -> list[float]:
    if beta == 0:
        return [float(order == 1) for order in orders]
    table = bessel_integers(Fraction(beta), max(orders), 80)
    return [table[order] / table[1] for order in orders]


def _margin(n: int, x: float) -> int:
    """Shifts beyond ±margin contribute less than `_OMITTED` of the sum.

    I_ν is log-concave in ν (Turán-type inequality, DLMF §10.37), so a shift by m costs at least (I_m/I_0)^N
    against ∏ I_{λ_j}; the sum is smaller than that product by what the determinants cancel.
    """
    cancelled = n * (n - 1) / 2 * math.log2(x + 2) + math.lgamma(n + 1) / math.log(2)
    return margin_of(x, math.ceil((60 + cancelled) / n)) + n


def _rows(x: float, n: int, reach: int) -> Rows:
    half = bessel_integers(Fraction(x), reach + n, 128 + int(n * math.log2(x + 2)))
    return difference_rows(half[:0:-1] + half, n)


def _repaired(irreps: Sequence[Irrep], x: Floats, k: Floats, error: Floats) -> tuple[Floats, Floats]:
    """Replace the entries that lost too many digits by exact integer determinants."""
    lost = (error > _GOOD_ENOUGH * np.abs(k)) & (error > _NEGLIGIBLE)
    for p, r in np.argwhere(lost):
        value = float(wilson_fraction(irreps[r], Fraction(float(x[p])), 60))
        k[p, r], error[p, r] = value, 2 * _EPS * abs(value)
    return k, error


def wilson_fraction(irrep: Irrep, x: Fraction, bits: int) -> Fraction:
    """k_r of one plaquette to relative accuracy 2^−bits, from integer determinants.

    The number of bits carried is doubled until the bound on rounding and on the omitted shifts, both
    computed along, is small enough.
    """
    if x == 0:
        return Fraction(int(not any(irrep.labels)))
    working = bits + 32 + irrep.group.n**2
    while True:
        top, top_error = _integer_sum(irrep.partition, x, working)
        bottom, bottom_error = _integer_sum((0,) * irrep.group.n, x, working, irrep.partition[0])
        if (top_error << (bits + 2)) < top and (bottom_error << (bits + 2)) < bottom:
            return Fraction(top, bottom * irrep.dimension)
        working = 2 * working


@lru_cache(maxsize=256)
def _integer_sum(rows: tuple[int, ...], x: Fraction, bits: int, longest: int = 0) -> tuple[int, int]:
    """Σ_m det in the units of the table up to order `longest`, and a bound on its error."""
    n = len(rows)
    margin = margin_of(float(x), bits // n + n * n) + 2 * n
    order = max(rows[0], longest) + margin + 2 * n
    half = _table(x, order, bits)
    shifts = range(-rows[0] - margin, margin + 1)
    total, sizes = toeplitz_integers(rows, half[:0:-1] + half, order, shifts)
    ratio = _step_ratio(float(x), margin - n) ** n
    omitted = (sizes[0] + sizes[-1]) * math.ceil(ratio / (1 - ratio))
    return total, (2 * n * sum(sizes) >> bits) + omitted + 1


@lru_cache(maxsize=16)
def _table(x: Fraction, order: int, bits: int) -> list[int]:
    return bessel_integers(x, order, bits)


def _step_ratio(x: float, nu: int) -> float:
    """Upper bound of I_{ν+1}(x)/I_ν(x) (D. E. Amos, Math. Comp. 28 (1974) 239)."""
    return x / (nu + 0.5 + math.hypot(nu + 0.5, x))


def wilson_shell_bound(n: int, shell: int, x: Floats) -> Floats:
    """Proven upper bound of k_r for every irrep whose labels sum to the shell D or more.

    d_r k_r W_0 counts walks from 0 to λ inside the Weyl chamber (expand the exponential in powers of
    tr U + tr U†), which are at most all walks, so W_λ ≤ Σ_m ∏_j I_{λ_j + m} ≤ I_0^{N−2} I_D(2x) with
    Neumann's addition theorem (DLMF 10.44.3), D = λ_1 − λ_N. I_D falls and the least dimension grows with D.
    W_0 is bounded below by its Toeplitz sum minus its error.
    """
    from scipy.special import ive

    smallest = math.comb(shell + n - 1, n - 1)
    bottom = np.array([_scaled_w0(n, float(value)) for value in x])
    return np.asarray(ive(0, x) ** (n - 2) * ive(shell, 2 * x) * (1 + 1e-12) / (smallest * bottom))


@lru_cache(maxsize=4096)
def _scaled_w0(n: int, x: float) -> float:
    """e^{−Nx} W_0(x)."""
    from scipy.special import ive

    if x == 0:
        return 1.0
    exact = Fraction(x)
    bits = 96 + int(n * n * math.log2(x + 2))
    total, error = _integer_sum((0,) * n, exact, bits)
    margin = margin_of(x, bits // n + n * n) + 2 * n
    unit = _table(exact, margin + 2 * n, bits)[0]
    return float(Fraction(total - error, unit**n)) * float(ive(0, x)) ** n
