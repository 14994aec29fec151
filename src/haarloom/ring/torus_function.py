"""A class function known only by its values on the maximal torus, and its overlaps with characters."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from itertools import pairwise
from math import comb
from typing import TYPE_CHECKING, Any

import numpy as np

from haarloom.exceptions import ConvergenceError
from haarloom.torus.alcove import alcove_grid, alcove_size
from haarloom.torus.alcove_gauss import alcove_nodes
from haarloom.torus.characters import character
from haarloom.torus.determinant_forms import DeterminantForm, EigenvalueProduct

if TYPE_CHECKING:
    from haarloom.algebra.group import SU
    from haarloom.algebra.irrep import Irrep

__all__ = ["TorusFunction", "double_overlap", "form_scale"]

SETTLED = 1e-13
"""Largest change on refining the grid that counts as converged, against ∫|f| and the two dimensions."""

AFFORDABLE = 250_000
"""Largest grid, in tuples looked through, on which a function of unknown reach is sampled."""

AFFORDABLE_NODES = 400_000
"""Most Gauss nodes for a weight with creases."""

AFFORDABLE_ORDER = 1_000
"""Most Gauss nodes a direction: their computation takes time that grows with the square."""

AFFORDABLE_PAIRS = 1_500
"""Most nodes for each of the two loops of a kernel, which is sampled on pairs."""


SAMPLES = 7
"""Random eigenphases at which a determinant form has to agree with the function before it is used."""

FORM_TOLERANCE = 1e-6
"""A wrong form misses by order one; windings may cancel to nine digits."""


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
    creased
        Whether f is smooth inside the alcove only; then Gauss's rule takes the place of the periodic grid.
    form
        f as a product over eigenvalues, whose determinants are taken where no grid is fine enough.
    """

    group: SU
    function: Callable[[np.ndarray], Any]
    reach: int | None = None
    creased: bool = False
    form: EigenvalueProduct | None = None
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
        size = bra.dimension * ket.dimension
        grids = self._grids(degree + 8)
        for coarse, fine in pairwise(grids):
            value = self._integral(bra, ket, fine)
            change = abs(value - self._integral(bra, ket, coarse))
            if change <= SETTLED * size * self._scale(fine):
                return value
        return self._by_form(bra, ket, grids[-1])

    def _by_form(self, bra: Irrep, ket: Irrep, points: int) -> complex:
        scale = None if self.form is None else form_scale(self.form, self.function)
        if self.form is not None and scale is not None:
            return scale * self.form.matrix_element(bra, ket)
        raise ConvergenceError(
            f"⟨{bra.name}|f|{ket.name}⟩ on {self.group} does not settle on {points} points an angle, "
            "the largest grid that fits: take smaller irreps, a smaller N or a smoother weight."
        )

    def _grids(self, points: int) -> tuple[int, ...]:
        """Points an angle of the first grid, and of each refinement of it that fits."""
        grids = [points]
        while self._affordable(grids[-1] + grids[-1] // 2):
            grids.append(grids[-1] + grids[-1] // 2)
        return tuple(grids)

    def _affordable(self, points: int) -> bool:
        if self.creased:
            return points <= AFFORDABLE_ORDER and points**self.group.rank <= AFFORDABLE_NODES
        return alcove_size(self.group, points) <= AFFORDABLE

    def _grid(self, points: int) -> tuple[np.ndarray, np.ndarray]:
        if self.creased:
            return alcove_nodes(self.group.n, points)
        return alcove_grid(self.group, points)

    def _integral(self, bra: Irrep, ket: Irrep, points: int) -> complex:
        angles, weights = self._grid(points)
        sampled = self._sampled(points) * weights
        return complex(np.sum(np.conj(character(bra, angles)) * sampled * character(ket, angles)))

    def _sampled(self, points: int) -> np.ndarray:
        if points not in self._samples:
            self._samples[points] = np.asarray(self.function(self._grid(points)[0]))
        return self._samples[points]

    def _scale(self, points: int) -> float:
        """∫dP |f|: what rounding errors are measured against."""
        weights = self._grid(points)[1]
        return max(float(np.sum(np.abs(self._sampled(points)) * weights)), 1e-300)


def form_scale(form: DeterminantForm, function: Callable[[np.ndarray], Any]) -> complex | None:
    """The constant c with f = c · form, seen at random eigenphases; None if there is none."""
    angles = np.random.default_rng(7).uniform(-np.pi, np.pi, (SAMPLES, form.group.n))
    angles[:, -1] = -angles[:, :-1].sum(axis=1)
    stated, found = np.asarray(form.at(angles)), np.asarray(function(angles))
    largest = int(np.argmax(np.abs(found)))
    scale = found[largest] / stated[largest]
    misses = np.max(np.abs(scale * stated - found))
    return complex(scale) if misses <= FORM_TOLERANCE * np.abs(found[largest]) else None


def double_overlap(
    group: SU,
    kernel: Callable[[np.ndarray, np.ndarray], Any],
    bra: Irrep,
    ket: Irrep,
    reach: int | None = None,
) -> complex:
    """∫dP ∫dP′ χ_bra(P)* K(P, P′) χ_ket(P′).

    Parameters
    ----------
    kernel
        Takes two arrays of eigenphases that broadcast, shapes (M, 1, N) and (1, M, N).
    reach
        Largest Σ a_i of the irreps in K on either side where K is finite; then one grid is exact. Left out,
        the grid is refined until the result settles.
    """
    points = max(sum(bra.labels), sum(ket.labels)) + 2 * group.rank + 1 + (8 if reach is None else reach)
    before = None
    while _nodes(group, points) <= AFFORDABLE_PAIRS:
        value, scale = _on_pairs(group, kernel, bra, ket, points)
        tolerance = SETTLED * bra.dimension * ket.dimension * scale
        if reach is not None or (before is not None and abs(value - before) <= tolerance):
            return value
        points, before = points + points // 2, value
    raise ConvergenceError(
        f"⟨{bra.name}|K|{ket.name}⟩ on {group} does not settle on pairs of grids of {AFFORDABLE_PAIRS:,} "
        "nodes, the most that fit: take smaller irreps, a smaller N or a smoother weight."
    )


def _nodes(group: SU, points: int) -> int:
    """About as many nodes as :func:`alcove_grid` keeps: C(points, N) sets of phases, one sum in `points`."""
    return comb(points, group.n) // points


def _on_pairs(
    group: SU, kernel: Callable[[np.ndarray, np.ndarray], Any], bra: Irrep, ket: Irrep, points: int
) -> tuple[complex, float]:
    """The overlap on one grid, and ∫∫ |K|."""
    angles, weights = alcove_grid(group, points)
    left, right = np.conj(character(bra, angles)) * weights, character(ket, angles) * weights
    values = np.asarray(kernel(angles[:, None, :], angles[None, :, :]))
    return complex(left @ values @ right), float(weights @ np.abs(values) @ weights)
