"""What T is made of at all points of a plane, kept along those axes only that it varies with."""

from __future__ import annotations

from collections.abc import Set
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.numerics.group_levels import Margins
from haarloom.numerics.labels import conjugation
from haarloom.numerics.link_numbers import link_coefficients_at
from haarloom.numerics.plane import Plane
from haarloom.numerics.site_components import SiteComponents, outward_reach, site_components
from haarloom.numerics.truncation import EPS, character_errors, input_errors, phase_of

__all__ = ["PlaneNumbers", "plane_numbers"]


@dataclass(frozen=True, eq=False)
class PlaneNumbers:
    """Numbers at the points (row, column) of a plane; an axis that does not matter has length one.

    Attributes
    ----------
    matrix
        N_c of all irreps of W side by side, a SciPy CSR array of shape (bras, c · n).
    root, phase, k_errors
        S, Φ and errors of k, shape (bras, R or 1, C or 1).
    site, site_errors
        w_c and their errors, shape (c, R or 1, C or 1).
    mirror
        J inside the basis.
    norm, outside, edge
        ‖W‖, |k| beyond the basis, and largest S on the rim, shape (R or 1, C or 1).
    hermitian
        Whether W is, shape (R or 1, C or 1).
    """

    components: SiteComponents
    matrix: Any
    root: NDArray[np.float64]
    phase: NDArray[Any]
    k_errors: NDArray[np.float64]
    site: NDArray[Any]
    site_errors: NDArray[np.float64]
    mirror: NDArray[np.int64]
    norm: NDArray[np.float64]
    outside: NDArray[np.float64]
    edge: NDArray[np.float64]
    hermitian: NDArray[np.bool_]

    @property
    def size(self) -> int:
        """Number n of irreps inside."""
        return self.components.pattern.size

    @cached_property
    def positive(self) -> bool:
        """Whether Φ is 1 everywhere."""
        return not np.iscomplexobj(self.phase) and bool((self.phase > 0).all())

    @property
    def real(self) -> bool:
        """Whether T is real everywhere."""
        return not (np.iscomplexobj(self.site) or np.iscomplexobj(self.phase))

    def rows(self, some: slice) -> PlaneNumbers:
        """The numbers of some rows."""

        def part(array: NDArray[Any]) -> NDArray[Any]:
            return array if array.shape[-2] == 1 else array[..., some, :]

        names = ("root", "phase", "k_errors", "site", "site_errors", "norm", "outside", "edge", "hermitian")
        parts = {name: part(getattr(self, name)) for name in names}
        return PlaneNumbers(components=self.components, matrix=self.matrix, mirror=self.mirror, **parts)

    def images(self, vectors: NDArray[Any]) -> NDArray[Any]:
        """T V with all bras: (n, m, r, c) to (bras, m, r, c)."""
        size, root = self.size, self.root[:, None]
        dressed = vectors * (root[:size] if self.positive else (root * self.phase[:, None])[:size])
        weighted = dressed[None] * self.site[:, None, None]
        images = (self.matrix @ weighted.reshape(len(self.site) * size, -1)).reshape(-1, *vectors.shape[1:])
        images *= root
        return np.asarray(images)

    def margins(self, shape: tuple[int, int]) -> Margins:
        """What the bound needs at each point of (rows, columns), counted row by row."""
        root, k_errors = (np.moveaxis(array, 0, 2) for array in (self.root, self.k_errors))
        error = character_errors(self.components.support, np.moveaxis(self.site_errors, 0, 2))
        noise = 16 * EPS * self.norm * root.max(axis=2) ** 2 + input_errors(error, self.norm, root, k_errors)
        far = self.norm * self.outside
        rim = self.norm * self.edge * np.sqrt(self.outside)
        return Margins(*(np.broadcast_to(a, shape).reshape(-1) for a in (far, 0 * far, rim, noise)))

    def hermitian_at(self, shape: tuple[int, int]) -> NDArray[np.bool_]:
        """Whether T is Hermitian at each point of (rows, columns), counted row by row."""
        both = self.hermitian & (self.phase.real > 0).all(axis=0)
        return np.broadcast_to(both, shape).reshape(-1)


def plane_numbers(plane: Plane) -> PlaneNumbers:
    """The numbers of a plane, for a finite W."""
    model, rank = plane.model, plane.model.group.rank
    outer = plane.cutoff + outward_reach(model.site, plane.cutoff, {})
    components = site_components(model.site, plane.cutoff, outer)
    values, shape = _spread(plane, {symbol.name for symbol in model.link.parameters})
    k, k_errors = link_coefficients_at(model.link, outer, values)
    root = np.sqrt(np.abs(k))
    rim = slice(count_up_to(rank, 2 * plane.cutoff - outer), count_up_to(rank, plane.cutoff))
    outside = _column(model.link.largest_outside(plane.cutoff, values))
    link = [_over(array, shape) for array in (root, phase_of(k), k_errors, outside, root[:, rim])]
    values, shape = _spread(plane, {symbol.name for symbol in model.site.parameters})
    weights, errors = (np.atleast_2d(array) for array in components.coefficients(values))
    norm = _column(model.site.norm_bound(values))
    symmetric = _hermitian(components, weights, errors)[:, None]
    site = [_over(array, shape) for array in (weights, errors, norm, symmetric)]
    return PlaneNumbers(
        components=components,
        matrix=_component_matrices(components),
        root=link[0],
        phase=link[1],
        k_errors=link[2],
        site=site[0],
        site_errors=site[1],
        mirror=conjugation(rank, plane.cutoff),
        norm=site[2][0],
        outside=link[3][0],
        edge=link[4].max(axis=0),
        hermitian=site[3][0],
    )


def _spread(plane: Plane, names: Set[str]) -> tuple[dict[str, NDArray[Any]], tuple[int, int]]:
    """Parameter values along the axes that a weight depends on, and how many points they make."""
    axes = [axis if name in names else axis[:1] for name, axis in zip(plane.names, plane.axes, strict=True)]
    first, second = (grid.reshape(-1) for grid in np.meshgrid(*axes, indexing="ij"))
    return plane.values(first, second), (len(axes[0]), len(axes[1]))


def _column(numbers: Any) -> NDArray[np.float64]:
    return np.asarray(numbers, dtype=float).reshape(-1, 1)


def _over(array: NDArray[Any], shape: tuple[int, int]) -> NDArray[Any]:
    """Numbers (points or 1, ·) as (·, rows, columns)."""
    points = shape[0] * shape[1]
    full = np.broadcast_to(array, (points, array.shape[1]))
    return np.ascontiguousarray(full.T).reshape(-1, *shape)


def _component_matrices(components: SiteComponents) -> Any:
    """N_c of all irreps of W side by side, as a SciPy CSR array."""
    from scipy import sparse

    pattern = components.pattern
    found = []
    for row in range(pattern.components.shape[0]):
        start, stop = pattern.components.indptr[row : row + 2]
        places = pattern.components.indices[start:stop]
        entries = (pattern.components.data[start:stop], (pattern.rows[places], pattern.columns[places]))
        found.append(sparse.csr_array(entries, shape=(pattern.outer_size, pattern.size)))
    return sparse.hstack(found, format="csr")


def _hermitian(
    components: SiteComponents, weights: NDArray[Any], errors: NDArray[np.float64]
) -> NDArray[np.bool_]:
    """Whether w_c̄ is the complex conjugate of w_c, point by point."""
    place = {irrep: number for number, irrep in enumerate(components.support)}
    mirror = np.array([place.get(irrep.conjugate, -1) for irrep in components.support])
    partner = np.where(mirror >= 0, weights[:, mirror], 0.0).conj()
    return np.asarray((np.abs(partner - weights) <= 8 * EPS * np.abs(weights) + 2 * errors).all(axis=1))
