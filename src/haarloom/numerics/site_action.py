"""Applying W to vectors in the character basis, two ways.

By fusion: a sparse matrix, banded in the labels, cheap where W has few weights. By fast transforms:
with vectors spread antisymmetrically over the weight lattice, multiplication by W(θ) on a grid of
the maximal torus, cheap where W has many. Both take kets with Σ s ≤ cutoff to bras with Σ r ≤ outer.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property, lru_cache
from itertools import permutations
from math import factorial
from typing import TYPE_CHECKING, Any, Protocol

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.numerics.fusion import reflection_signs, strict_rows
from haarloom.numerics.labels import label_array

if TYPE_CHECKING:
    from haarloom.actions.protocols import SiteWeight

__all__ = ["FusionAction", "SiteAction", "TorusAction", "torus_action"]

MANY = 0.25
"""Columns, as a part of n, from which on the matrix of W is worth more than a transform for each."""

MOST_ELEMENTS = 20_000_000
"""Most elements of the matrix of a dense W: it bounds memory to 160 MB."""


class SiteAction(Protocol):
    """W as a linear map from n kets to the bras up to a wider cutoff."""

    @property
    def size(self) -> int:
        """Number n of kets."""

    @property
    def outer_size(self) -> int:
        """Number of bras."""

    def apply(self, kets: NDArray[Any]) -> NDArray[Any]:
        """W on columns: (n, m) to (outer size, m)."""


@dataclass(frozen=True, eq=False)
class FusionAction:
    """⟨r|W|s⟩ at given places, as a SciPy CSR array."""

    size: int
    outer_size: int
    rows: NDArray[np.int64]
    columns: NDArray[np.int64]
    elements: NDArray[Any]

    @cached_property
    def matrix(self) -> Any:
        """Shape (outer size, n)."""
        from scipy import sparse

        shape = (self.outer_size, self.size)
        return sparse.csr_array((self.elements, (self.rows, self.columns)), shape=shape)

    def apply(self, kets: NDArray[Any]) -> NDArray[Any]:
        """W on columns: (n, m) to (outer size, m)."""
        return np.asarray(self.matrix @ kets)


@dataclass(frozen=True, eq=False)
class TorusAction:
    """W by fast Fourier transforms.

    χ_r times the Weyl denominator is Σ_σ sgn(σ) e^{iσ(r + ρ)·θ}; multiplying by W(θ) keeps that form.

    Attributes
    ----------
    density
        W on the grid; for real coefficients of W(−θ), half the grid, as the real transform wants it.
    scatter, signs
        Grid places of all images σ(s + ρ) of each ket, shape (N!, n), and sgn(σ), shape (N!,).
    gather
        Grid places of r + ρ, shape (outer size,).
    points, real
        Grid points an angle; whether W has real coefficients.
    """

    size: int
    outer_size: int
    density: NDArray[np.complex128]
    scatter: NDArray[np.int64]
    signs: NDArray[np.float64]
    gather: NDArray[np.int64]
    shape: tuple[int, ...]
    real: bool

    def apply(self, kets: NDArray[Any]) -> NDArray[Any]:
        """W on columns: (n, m) to (outer size, m)."""
        if not kets.size:
            return np.zeros((self.outer_size, *kets.shape[1:]), dtype=kets.dtype)
        if kets.size >= MANY * self.size**2 and self.size * self.outer_size <= MOST_ELEMENTS:
            return np.asarray(self.matrix @ kets)
        columns = kets.reshape(self.size, -1).T
        if self.real and np.iscomplexobj(columns):
            parts = [self._one(column.real) + 1j * self._one(column.imag) for column in columns]
        else:
            parts = [self._one(column) for column in columns]
        return np.stack(parts, axis=1).reshape(self.outer_size, *kets.shape[1:])

    @cached_property
    def matrix(self) -> NDArray[Any]:
        """⟨r|W|s⟩ = Σ_σ sgn(σ) Ŵ(r + ρ − σ(s + ρ)) from one transform, shape (outer size, n)."""
        from scipy import fft

        if self.real:
            fourier = fft.irfftn(self.density, s=self.shape)
        else:
            fourier = fft.fftn(self.density) / self.density.size
        bras = np.array(np.unravel_index(self.gather, self.shape))
        total = np.zeros((self.outer_size, self.size), dtype=fourier.dtype)
        for places, sign in zip(self.scatter, self.signs, strict=True):
            kets = np.array(np.unravel_index(places, self.shape))
            # negative places count from the end: the grid is periodic
            total += sign * fourier[tuple(bra[:, None] - ket for bra, ket in zip(bras, kets, strict=True))]
        return np.asarray(total)

    def _one(self, ket: NDArray[Any]) -> NDArray[Any]:
        from scipy import fft

        field = np.zeros(int(np.prod(self.shape)), dtype=float if self.real else complex)
        for places, sign in zip(self.scatter, self.signs, strict=True):
            field[places] = sign * ket
        field = field.reshape(self.shape)
        if self.real:
            product = fft.irfftn(self.density * fft.rfftn(field), s=self.shape)
        else:
            product = fft.fftn(self.density * fft.ifftn(field))
        return np.asarray(product.reshape(-1)[self.gather])


def torus_action(
    site: SiteWeight, values: Mapping[str, Any], cutoff: int, outer: int, real: bool, reach: int
) -> TorusAction:
    """W by transforms, from its closed form on the torus.

    Parameters
    ----------
    real
        Whether all w_c are real.
    reach
        Σ c beyond which the characters of W are negligible; the grid keeps them from wrapping around.
    """
    from scipy import fft

    from haarloom.torus.quadrature import grid_angles

    group = site.group
    points = int(
        fft.next_fast_len(cutoff + outer + 2 * group.rank + max(reach, outer - cutoff) + 1, real=True)
    )
    density = np.asarray(site.density_at(grid_angles(group, points), values), dtype=complex)
    shape = (points,) * group.rank
    density = np.broadcast_to(density, shape)
    if real:
        # W(−θ) is the complex conjugate of W(θ) when all w_c are real
        density = density.conj()[..., : points // 2 + 1]
    scatter, signs, gather = _grid_places(group.rank, cutoff, outer, points)
    return TorusAction(
        count_up_to(group.rank, cutoff),
        count_up_to(group.rank, outer),
        np.ascontiguousarray(density),
        scatter,
        signs,
        gather,
        shape,
        real,
    )


@lru_cache(maxsize=4)
def _grid_places(
    rank: int, cutoff: int, outer: int, points: int
) -> tuple[NDArray[np.int64], NDArray[np.float64], NDArray[np.int64]]:
    kets = strict_rows(label_array(rank, cutoff) + 1)
    orders = list(permutations(range(rank + 1)))
    scatter = np.empty((factorial(rank + 1), len(kets)), dtype=np.int64)
    for row, order in enumerate(orders):
        scatter[row] = _flat_places(kets[:, list(order)], points)
    signs = reflection_signs(-np.array(orders)).astype(float)
    return scatter, signs, _flat_places(strict_rows(label_array(rank, outer) + 1), points)


def _flat_places(rows: NDArray[np.int64], points: int) -> NDArray[np.int64]:
    exponents = (rows[:, :-1] - rows[:, -1:]) % points
    return np.asarray(exponents @ points ** np.arange(exponents.shape[1] - 1, -1, -1))
