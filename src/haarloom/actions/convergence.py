"""Radius of convergence of the strong-coupling series."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from haarloom.actions.strong_coupling import finite_exponent
from haarloom.exceptions import ClassFunctionError, ConvergenceError
from haarloom.torus.alcove import alcove_grid, alcove_size

if TYPE_CHECKING:
    from haarloom.actions.base import Link

__all__ = ["Radius", "convergence_radius"]

_ORDERS = (120, 80, 56, 40, 28, 20)
_MOST_TUPLES = 3_000_000


@dataclass(frozen=True)
class Radius:
    """Radius of convergence of a series in one coupling.

    Attributes
    ----------
    radius : float
    error : float
        Change between two truncations.
    singularity : complex
        One of the nearest zeros of w_0, with Im ≥ 0.
    """

    radius: float
    error: float
    singularity: complex


def convergence_radius(link: Link) -> Radius:
    """Where the strong-coupling series of k_r stops converging: at the nearest complex zero of w_0.

    w_r and w_0 are entire in the coupling, so the quotient is singular only where w_0 vanishes. Zeros of
    the truncated Taylor polynomial of w_0 converge to those of w_0 (A. Hurwitz, Math. Ann. 33 (1889) 246).
    For SU(2) Wilson this is the first zero of the Bessel function J_1.

    Raises
    ------
    ClassFunctionError
        If there are several couplings, or no finite plaquette action.
    ConvergenceError
        If the truncations do not settle on a zero.
    """
    exponent = finite_exponent(link)
    if len(exponent.free_symbols) != 1:
        raise ClassFunctionError(
            f"A radius of convergence needs exactly one coupling left as a symbol; this weight has "
            f"{', '.join(sorted(map(str, exponent.free_symbols))) or 'none'}: give numbers for all but one."
        )
    [coupling] = exponent.free_symbols
    reach = max(sum(irrep.labels) for irrep in exponent)
    order = next(m for m in _ORDERS if m == _ORDERS[-1] or _fits(link, m * reach))
    angles, weights = alcove_grid(link.group, order * reach + 2 * link.group.n)
    action = exponent.at(angles, **{coupling.name: 1.0}).real
    shorter, longer = (_nearest_zero(action, weights, m) for m in (order - 6, order))
    change = abs(abs(shorter) - abs(longer))
    if change > 1e-4 * abs(longer):
        raise ConvergenceError(
            f"The nearest zero of w_0 does not settle by order {order}, the highest that fits for "
            f"{link.group}: take a smaller N, or couplings of irreps with smaller labels."
        )
    return Radius(abs(longer), change, longer)


def _fits(link: Link, degree: int) -> bool:
    return alcove_size(link.group, degree + 2 * link.group.n) <= _MOST_TUPLES


def _nearest_zero(action: NDArray[np.float64], weights: NDArray[np.float64], order: int) -> complex:
    """Smallest zero of Σ_M ⟨S^M⟩ x^M/M!, in units that make the coefficients of comparable size."""
    unit = order / math.e / np.abs(action).max()
    powers, term = [], weights.copy()
    for power in range(1, order + 2):
        powers.append(float(term.sum()))
        term = term * action * (unit / power)
    zeros: Sequence[complex] = np.roots(powers[::-1]) * unit
    nearest = min(zeros, key=abs)
    return complex(nearest.real, abs(nearest.imag))
