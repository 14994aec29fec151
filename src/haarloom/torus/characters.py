"""Characters of SU(N) at given eigenphases, in floating point.

Two routes: :func:`character` and :func:`characters` work at every point, coinciding eigenvalues included;
:func:`weyl_ratio` divides Weyl's determinants, needs distinct eigenvalues and serves as a referee.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import chain
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import rows_from_labels
from haarloom.algebra.weights import contents
from haarloom.exceptions import GroupError
from haarloom.torus.angles import full_angles

__all__ = ["character", "characters", "weyl_ratio"]

_CHUNK = 1 << 22


def character(irrep: Irrep, angles: Any) -> NDArray[np.complex128]:
    """χ_r(P) for P with the given eigenphases.

    Parameters
    ----------
    irrep : Irrep
    angles : array of shape (..., N − 1) or (..., N), radians

    Returns
    -------
    complex ndarray of shape (...)
    """
    return characters((irrep,), angles)[..., 0]


def characters(irreps: Sequence[Irrep], angles: Any) -> NDArray[np.complex128]:
    """χ_r(P) for several irreps of one group at once, work shared.

    Returns
    -------
    complex ndarray of shape (..., number of irreps)

    Notes
    -----
    For N ≤ 3, Jacobi and Trudi's determinant of complete symmetric functions, which are sums without
    cancellation. For N ≥ 4, the sum over weights, which has none either, as one matrix product of monomials
    and multiplicities.
    """
    if not irreps:
        raise GroupError("no irreps given; give at least one.")
    group = irreps[0].group
    if any(irrep.group is not group for irrep in irreps):
        raise GroupError("irreps of different groups given; characters are taken for one group at a time.")
    phases = full_angles(group.n, angles)
    flat = phases.reshape(-1, group.n)
    values = _by_complete(irreps, flat) if group.n <= 3 else _by_weights(irreps, flat)
    return values.reshape(*phases.shape[:-1], len(irreps))


def weyl_ratio(irrep: Irrep, angles: Any) -> NDArray[np.complex128]:
    """χ_r(P) as Weyl's quotient det x_i^{λ_j + N − j} / det x_i^{N − j}, for distinct eigenvalues only."""
    phases = full_angles(irrep.group.n, angles)
    staircase = np.arange(irrep.group.n - 1, -1, -1)
    upper = np.exp(1j * phases[..., :, None] * (np.array(irrep.partition) + staircase))
    lower = np.exp(1j * phases[..., :, None] * staircase)
    ratio: NDArray[np.complex128] = np.linalg.det(upper) / np.linalg.det(lower)
    return ratio


def _by_complete(irreps: Sequence[Irrep], phases: NDArray[np.float64]) -> NDArray[np.complex128]:
    rows = [irrep.partition for irrep in irreps]
    ladder = _complete(phases, max(row[0] for row in rows) + 1)
    if phases.shape[1] == 2:
        return ladder[:, [row[0] for row in rows]]
    first, second = np.array([row[0] for row in rows]), np.array([row[1] for row in rows])
    below = np.where(second > 0, ladder[:, np.maximum(second - 1, 0)], 0)
    return ladder[:, first] * ladder[:, second] - ladder[:, first + 1] * below


def _complete(phases: NDArray[np.float64], degree: int) -> NDArray[np.complex128]:
    """h_0 … h_degree of the eigenvalues, shape (points, degree + 1), one eigenvalue after the other."""
    eigenvalues = np.exp(1j * phases)
    ladder = np.zeros((len(phases), degree + 1), dtype=np.complex128)
    ladder[:, 0] = 1
    for k in range(phases.shape[1]):
        for m in range(1, degree + 1):
            ladder[:, m] += eigenvalues[:, k] * ladder[:, m - 1]
    return ladder


def _by_weights(irreps: Sequence[Irrep], phases: NDArray[np.float64]) -> NDArray[np.complex128]:
    n = phases.shape[1]
    systems = [contents(rows_from_labels(irrep.labels)) for irrep in irreps]
    reduced = [{_reduced(content): count for content, count in system.items()} for system in systems]
    place = {weight: row for row, weight in enumerate(dict.fromkeys(chain.from_iterable(reduced)))}
    multiplicities = np.zeros((len(place), len(irreps)))
    for column, system in enumerate(reduced):
        multiplicities[[place[weight] for weight in system], column] = list(system.values())
    exponents = np.array(list(place), dtype=np.float64).reshape(len(place), n - 1)
    values = np.empty((len(phases), len(irreps)), dtype=np.complex128)
    step = max(1, _CHUNK // max(1, len(place)))
    for start in range(0, len(phases), step):
        block = phases[start : start + step, : n - 1] @ exponents.T
        values[start : start + step] = np.cos(block) @ multiplicities + 1j * (np.sin(block) @ multiplicities)
    return values


def _reduced(content: tuple[int, ...]) -> tuple[int, ...]:
    """Exponents of the first N − 1 eigenvalues when x_N = 1/(x_1 ⋯ x_{N−1})."""
    return tuple([exponent - content[-1] for exponent in content[:-1]])
