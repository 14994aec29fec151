"""T for a link weight that mixes irreps: K W, cut at Σ a_i ≤ K.

With P the basis and K = P K P + R, ‖R‖ ≤ ρ, all that K W adds to A = P K P W P is small but for what leads
from beyond the basis into it. Hence λ is an eigenvalue of A + E with ‖E‖ ≤ ε + ‖K‖‖W‖ ε/(|λ| − ε), ε = ρ‖W‖;
and because |λ| ≤ ‖K‖‖W‖ + ε, the whole is at most ε (2‖K‖‖W‖ + ε)/(|λ| − ε): the form of a coupling.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.numerics.site_components import site_components
from haarloom.numerics.truncation import EPS, Truncation, site_numbers

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["KernelTruncation", "truncate_kernel"]


@dataclass(frozen=True, eq=False)
class KernelTruncation(Truncation):
    """One point, one basis, for a kernel k_rs.

    Attributes
    ----------
    product
        P K W P, shape (n, n).
    kernel_norm
        Frobenius norm of P K P.
    """

    product: NDArray[Any] = field(default_factory=lambda: np.zeros((0, 0)))
    kernel_norm: float = 0.0

    @property
    def mirrored(self) -> bool:
        return False

    @property
    def hermitian(self) -> bool:
        return False

    @property
    def real(self) -> bool:
        return not np.iscomplexobj(self.product)

    @property
    def nonnegative(self) -> bool:
        return self.real and bool((self.product >= 0).all())

    @cached_property
    def dense(self) -> NDArray[Any]:
        return self.product

    def apply(self, vectors: NDArray[Any]) -> NDArray[Any]:
        return np.asarray(self.product @ vectors)

    @property
    def strength(self) -> float:
        return self.norm * self.kernel_norm

    @cached_property
    def noise(self) -> float:
        return 8 * EPS * float(np.linalg.norm(self.product)) + self.input_error

    def coupling(self, right: NDArray[Any], left: NDArray[Any]) -> tuple[NDArray[Any], NDArray[Any]]:
        """Norms of the vectors, times the square root of ε (2‖K‖‖W‖ + ε)."""
        share = np.sqrt(self.outer_norm * (2 * self.strength + self.outer_norm))
        return np.linalg.norm(right, axis=0) * share, np.linalg.norm(left, axis=0) * share

    @property
    def rim_norm(self) -> float:
        return self.outer_norm


def truncate_kernel(model: RingModel, cutoff: int, values: Mapping[str, Any]) -> KernelTruncation:
    """Numbers of K W at one point on the irreps with Σ a_i ≤ cutoff."""
    site, rank = model.site, model.group.rank
    size = count_up_to(rank, cutoff)
    kernel, errors = model.link.kernel_at(model.group.irreps(cutoff), values)
    kernel = np.asarray(kernel).reshape(size, size)
    components = site_components(site, cutoff, cutoff)
    weights, _ = components.coefficients(values)
    matrix = np.zeros((size, size), dtype=np.asarray(weights).dtype)
    pattern = components.pattern
    matrix[pattern.rows, pattern.columns] = components.elements(np.asarray(weights).reshape(-1))
    support, found, site_errors = site_numbers(site, values)
    dimensions = np.array([irrep.dimension for irrep in support], dtype=float)
    norm = float(np.max(site.norm_bound(values)))
    strength = float(np.linalg.norm(kernel))
    outside = float(np.max(model.link.largest_outside(cutoff, values)))
    ones = np.ones(size)
    return KernelTruncation(
        rank=rank,
        cutoff=cutoff,
        size=size,
        outer=cutoff,
        root=ones,
        phase=ones,
        action=_Matrix(size, size, matrix),
        site=(support, found, site_errors),
        norm=norm,
        outside=outside,
        tail=0.0,
        outside_far=outside,
        input_error=norm * float(np.linalg.norm(errors)) + strength * float(site_errors @ dimensions),
        product=kernel @ matrix,
        kernel_norm=strength,
    )


@dataclass(frozen=True, eq=False)
class _Matrix:
    """W inside the basis as a dense matrix."""

    size: int
    outer_size: int
    matrix: NDArray[Any]

    def apply(self, kets: NDArray[Any]) -> NDArray[Any]:
        return np.asarray(self.matrix @ kets)
