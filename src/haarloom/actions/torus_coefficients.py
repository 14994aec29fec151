"""Character coefficients of a class function given by its values on the torus, the grid refined until they
settle.

The trapezoidal rule over the nodes of one alcove (`haarloom.torus.alcove`) is exact up to aliasing, which
the last refinement measures. Its weights are positive, so rounding stays small against ∫dP |f|.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ClassFunctionError, ConvergenceError, SizeError
from haarloom.torus.alcove import alcove_grid, alcove_size
from haarloom.torus.characters import characters

__all__ = ["SampledFunction", "sampled_function"]

_MOST_TUPLES = 3_000_000  # sorted eigenphases looked through for one alcove
_MOST_CHARACTERS = 60_000_000  # numbers in one table of characters
_CHUNK = 1 << 22  # numbers at a time
_SAMPLES = 6
_ENOUGH = 64 * float(np.finfo(float).eps)

Density = Callable[[NDArray[np.float64]], NDArray[Any]]


class SampledFunction:
    """A class function on the torus whose values are kept, so that every grid is evaluated once.

    Parameters
    ----------
    group : SU
    density : callable
        Values of shape (points,) for angles of shape (points, N).
    """

    def __init__(self, group: SU, density: Density) -> None:
        self.group = group
        self.density = density
        self._values: dict[int, NDArray[Any]] = {}
        self._refuse_asymmetry()

    def coefficients(self, irreps: Sequence[Irrep]) -> tuple[NDArray[np.complex128], NDArray[np.float64]]:
        """∫dP χ_c* f for the irreps, and the change on the last refinement of the grid with rounding added.

        Raises
        ------
        ConvergenceError
            If the function is infinite or undefined at a node; the eigenphases are named.
        SizeError
            If the irreps need a finer grid than fits.
        """
        points = self._first_grid(irreps)
        coarse = self._sum(irreps, points)
        while True:
            points += points // 2
            fine = self._sum(irreps, points)
            change, rounding = np.abs(fine - coarse), _ENOUGH * self._size(points)
            if np.all(change <= rounding) or not self._fits(points + points // 2, len(irreps)):
                return fine, change + rounding
            coarse = fine

    def _refuse_asymmetry(self) -> None:
        """Raise unless the function is the same for eigenphases in another order and shifted by 2π.

        The alcove holds every conjugacy class once, so that nothing else would notice.
        """
        rng = np.random.default_rng(11)
        phases = rng.uniform(-np.pi, np.pi, (_SAMPLES, self.group.n))
        phases[:, -1] = -phases[:, :-1].sum(axis=1)
        shifted = np.roll(phases, 1, axis=1)
        shifted[:, :2] += [2 * np.pi, -2 * np.pi]
        with np.errstate(all="ignore"):
            one, other = (np.asarray(self.density(angles)) for angles in (phases, shifted))
        if not np.allclose(one, other, rtol=1e-8, atol=1e-10 * float(np.abs(one).max()), equal_nan=True):
            place = ", ".join(f"{angle:.4f}" for angle in phases[np.abs(one - other).argmax()])
            raise ClassFunctionError(
                f"The weight is no class function: at eigenphases ({place}) its value changes when they are "
                f"put in "
                "another order or shifted by 2π. Write it symmetric in all eigenphases and periodic in each."
            )

    def supremum(self) -> float:
        """Largest |f| on the nodes of a grid fine enough for the trivial coefficient."""
        self.coefficients([self.group.trivial])
        return max(float(np.abs(values).max()) for values in self._values.values())

    def _first_grid(self, irreps: Sequence[Irrep]) -> int:
        longest = max((sum(irrep.labels) for irrep in irreps), default=0)
        points = max(longest + 2 * self.group.n + 3, 16 if self.group.n < 4 else 10)
        if not self._fits(points + points // 2, len(irreps)):
            raise SizeError(
                f"Coefficients of {len(irreps):,} irreps of {self.group} with labels up to Σ a_i = "
                f"{longest} need "
                f"{points + points // 2} points for each of {self.group.rank} eigenphases, more than fit; "
                "ask for lower irreps, or for fewer at a time."
            )
        return points

    def _fits(self, points: int, count: int) -> bool:
        tuples = alcove_size(self.group, points)
        nodes = tuples * max(1, points - self.group.rank) // (self.group.n * points)
        return tuples <= _MOST_TUPLES and nodes * count <= _MOST_CHARACTERS

    def _sum(self, irreps: Sequence[Irrep], points: int) -> NDArray[np.complex128]:
        angles, weights = alcove_grid(self.group, points)
        values = self._kept(points) * weights
        total = np.zeros(len(irreps), dtype=complex)
        step = max(1, _CHUNK // (max(1, len(irreps)) * self.group.n))
        for start in range(0, len(angles) if len(irreps) else 0, step):
            piece = slice(start, start + step)
            total += values[piece] @ characters(irreps, angles[piece]).conj()
        return total

    def _size(self, points: int) -> float:
        """(∫dP |f|²)^½: rounding in ∫ χ_c* f stays below ε times this (Cauchy and Schwarz, ∫|χ_c|² = 1)."""
        sizes = np.abs(self._kept(points))
        largest = float(sizes.max()) or 1.0  # divided out, so that squares neither overflow nor vanish
        return largest * float(np.sqrt((sizes / largest) ** 2 @ alcove_grid(self.group, points)[1]))

    def _kept(self, points: int) -> NDArray[Any]:
        if points not in self._values:
            angles = alcove_grid(self.group, points)[0]
            step = _CHUNK // (16 * self.group.n)  # a density may build large intermediate arrays
            starts = range(0, len(angles), step)
            self._values[points] = np.concatenate([self._checked(angles[s : s + step]) for s in starts])
        return self._values[points]

    def _checked(self, angles: NDArray[np.float64]) -> NDArray[Any]:
        with np.errstate(all="ignore"):
            values = np.broadcast_to(self.density(angles), (len(angles),))
        bad = ~np.isfinite(values)
        if bad.any():
            place = ", ".join(f"{angle:.4f}" for angle in angles[bad][0])
            raise ConvergenceError(
                f"The weight is infinite or undefined at eigenphases ({place}): a pole or branch point on "
                f"the torus "
                "of eigenphases. Keep the parameters away from singular values."
            )
        return values


@lru_cache(maxsize=12)
def sampled_function(weight: Any, method: str, point: tuple[tuple[str, complex], ...]) -> SampledFunction:
    """The function ``weight.method(angles, values)`` at one point of parameter space, its values kept.

    Parameters
    ----------
    weight : hashable
        A weight with a ``group``.
    method : str
        ``"density_at"`` or ``"plaquette_at"``.
    point : tuple of (name, number)
    """
    values: Mapping[str, complex] = dict(point)
    return SampledFunction(weight.group, lambda angles: getattr(weight, method)(angles, values))
