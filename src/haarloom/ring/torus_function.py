"""A class function known only by its values on the maximal torus, and its overlaps with characters."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np

from haarloom.exceptions import ConvergenceError
from haarloom.torus.alcove import alcove_grid, alcove_size
from haarloom.torus.characters import character

if TYPE_CHECKING:
    from haarloom.algebra.group import SU
    from haarloom.algebra.irrep import Irrep

__all__ = ["TorusFunction", "double_overlap"]

SETTLED = 1e-13
"""Largest change on refining the grid that counts as converged, against ∫|f| and the two dimensions."""

AFFORDABLE = 250_000
"""Largest grid, in tuples looked through, on which a function of unknown reach is sampled."""

AFFORDABLE_PAIRS = 4_000
"""The same for a kernel of two loops, which is sampled on pairs."""


@dataclass(frozen=True)
class TorusFunction:
    """f(θ), its character coefficients and its matrix elements, by quadrature alone.

    Parameters
    ----------
    group, function
        ``function`` takes all N eigenphases, shape (M, N), and returns shape (M,).
    reach
        Largest Σ a_i of the irreps in f where f is a finite combination; then one grid is exact.
        Left out, the grid is refined until the result settles.
    """

    group: SU
    function: Callable[[np.ndarray], Any]
    reach: int | None = None
    _samples: dict[int, np.ndarray] = field(default_factory=dict, repr=False, compare=False)

    def coefficient(self, irrep: Irrep) -> complex:
        """∫dP χ_r* f."""
        return self.matrix_element(irrep, self.group.trivial)

    def matrix_element(self, bra: Irrep, ket: Irrep) -> complex:
        """∫dP χ_bra* f χ_ket.

        Raises
        ------
        ConvergenceError
            If the largest affordable grid does not settle it.
        """
        degree = sum(bra.labels) + sum(ket.labels) + 2 * self.group.rank + 1
        if self.reach is not None:
            return self._integral(bra, ket, degree + self.reach)
        points, before, size = degree + 8, None, bra.dimension * ket.dimension
        while alcove_size(self.group, points) <= AFFORDABLE:
            value = self._integral(bra, ket, points)
            if before is not None and abs(value - before) <= SETTLED * size * self._scale(points):
                return value
            points, before = points + points // 2, value
        raise ConvergenceError(
            f"⟨{bra.name}|f|{ket.name}⟩ on {self.group} does not settle on {points} points an angle, "
            "the largest grid that fits: take smaller irreps, a smaller N or a smoother weight."
        )

    def _integral(self, bra: Irrep, ket: Irrep, points: int) -> complex:
        angles, weights = alcove_grid(self.group, points)
        sampled = self._sampled(points) * weights
        return complex(np.sum(np.conj(character(bra, angles)) * sampled * character(ket, angles)))

    def _sampled(self, points: int) -> np.ndarray:
        if points not in self._samples:
            self._samples[points] = np.asarray(self.function(alcove_grid(self.group, points)[0]))
        return self._samples[points]

    def _scale(self, points: int) -> float:
        """∫dP |f|: what rounding errors are measured against."""
        weights = alcove_grid(self.group, points)[1]
        return max(float(np.sum(np.abs(self._sampled(points)) * weights)), 1e-300)


def double_overlap(
    group: SU, kernel: Callable[[np.ndarray, np.ndarray], Any], bra: Irrep, ket: Irrep
) -> complex:
    """∫dP ∫dP′ χ_bra(P)* K(P, P′) χ_ket(P′), the grid refined until the result settles.

    ``kernel`` takes two arrays of eigenphases that broadcast, shapes (M, 1, N) and (1, M, N).
    """
    points = sum(bra.labels) + sum(ket.labels) + 2 * group.rank + 9
    before = None
    while alcove_size(group, points) <= AFFORDABLE_PAIRS:
        angles, weights = alcove_grid(group, points)
        left, right = np.conj(character(bra, angles)) * weights, character(ket, angles) * weights
        values = np.asarray(kernel(angles[:, None, :], angles[None, :, :]))
        value, scale = complex(left @ values @ right), float(weights @ np.abs(values) @ weights)
        if before is not None and abs(value - before) <= SETTLED * bra.dimension * ket.dimension * scale:
            return value
        points, before = points + points // 2, value
    raise ConvergenceError(
        f"⟨{bra.name}|K|{ket.name}⟩ on {group} does not settle on {points} points an angle, "
        "the largest grid that fits: take smaller irreps, a smaller N or a smoother weight."
    )
