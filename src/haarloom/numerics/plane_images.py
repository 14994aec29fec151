"""T on interpolated vectors at the points of a plane.

Where the link coefficients vary with the first axis alone, T V = Σ_{c,a} w_c ℓ_a (S N_c S Φ V_a) is one
matrix product for a whole row; otherwise T is stacked point by point.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.numerics.batch import truncate_batch
from haarloom.numerics.group_levels import Margins, purge
from haarloom.numerics.labels import conjugation
from haarloom.numerics.link_numbers import link_coefficients_at
from haarloom.numerics.plane import Plane
from haarloom.numerics.site_components import SiteComponents, outward_reach, site_components
from haarloom.numerics.truncation import EPS, character_errors, input_errors, phase_of

__all__ = ["PlanePart", "plane_parts", "point_parts"]

FEW_COMPONENTS = 16
"""Most irreps in W for which images of all components are worth preparing."""

POINTS = 1024
"""Points that are evaluated together."""


@dataclass(frozen=True, eq=False)
class PlanePart:
    """Some points p of a plane, counted row by row.

    Attributes
    ----------
    points
        Which.
    vectors, images, beyond
        V, T V inside and beyond the basis; one row for each vector: shapes (p, m, n), (p, m, n), (p, m, ·).
    dual
        (Φ, J): the left partner of a row v is Φ · v[J]; Φ of shape (p, 1, n), or None where it is 1.
    margins, hermitian, real
        What bound and verdicts need.
    """

    points: slice
    vectors: NDArray[Any]
    images: NDArray[Any]
    beyond: NDArray[Any]
    dual: tuple[NDArray[Any] | None, NDArray[np.int64]]
    margins: Margins
    hermitian: NDArray[np.bool_]
    real: bool


def plane_parts(
    plane: Plane, frames: NDArray[Any], weights: tuple[NDArray[np.float64], NDArray[np.float64]]
) -> Iterator[PlanePart]:
    """All points of a plane, some at a time.

    Parameters
    ----------
    frames
        Vectors at the nodes, shape (first nodes, second nodes, m, n).
    weights
        Interpolation weights along both axes, shapes (R, first nodes) and (C, second nodes).
    """
    link_names = {symbol.name for symbol in plane.model.link.parameters}
    site_names = {symbol.name for symbol in plane.model.site.parameters}
    separate = plane.names[1] not in link_names and plane.names[0] not in site_names
    few = plane.model.site.finite and len(plane.model.site.support()) <= FEW_COMPONENTS
    if separate and few:
        return _by_rows(plane, frames, weights)
    rows, columns = np.divmod(np.arange(plane.shape[0] * plane.shape[1]), plane.shape[1])
    return point_parts(plane, frames, weights, (rows, columns))


def point_parts(
    plane: Plane,
    frames: NDArray[Any],
    weights: tuple[NDArray[np.float64], NDArray[np.float64]],
    places: tuple[NDArray[np.int64], NDArray[np.int64]],
    purged: Sequence[slice] = (),
) -> Iterator[PlanePart]:
    """A list of points of a plane, some at a time.

    Parameters
    ----------
    places
        Rows and columns of the points.
    purged
        Groups of vectors. Where they are given, T is applied once to the interpolated vectors, which
        damps what they hold of the levels left out, and each group is rid of what it holds of those
        before it, which that makes larger.
    """
    count, size = frames.shape[2:]
    flat = frames.reshape(-1, count * size)
    mirror = conjugation(plane.model.group.rank, plane.cutoff)
    for part in plane.stacks(len(places[0])):
        row, column = places[0][part], places[1][part]
        share = (weights[0][row][:, :, None] * weights[1][column][:, None, :]).reshape(len(row), -1)
        upright = np.swapaxes((share @ flat).reshape(-1, count, size), 1, 2)
        batch = truncate_batch(
            plane.model, plane.cutoff, plane.values(plane.axes[0][row], plane.axes[1][column])
        )
        dual = (batch.phase[:, None, :size], mirror)
        if purged:
            applied = np.swapaxes(batch.matrix @ upright, 1, 2)
            upright = np.swapaxes(purge(applied, dual, purged), 1, 2)
        inside, beyond = (np.swapaxes(matrix @ upright, 1, 2) for matrix in (batch.matrix, batch.upwards))
        margins = Margins(batch.norm * batch.outside, batch.rest, batch.rim, batch.noise)
        vectors = np.swapaxes(upright, 1, 2)
        yield PlanePart(part, vectors, inside, beyond, dual, margins, batch.hermitian, batch.real)


def _by_rows(
    plane: Plane, frames: NDArray[Any], weights: tuple[NDArray[np.float64], NDArray[np.float64]]
) -> Iterator[PlanePart]:
    rows, columns = plane.shape
    table = _Table.of(plane)
    count, size = frames.shape[2:]
    factors = (table.site[:, :, None] * weights[1][:, None, :]).reshape(columns, -1)
    step = max(1, POINTS // columns)
    for start in range(0, rows, step):
        some = slice(start, min(start + step, rows))
        across = np.tensordot(weights[0][some], frames, axes=1)
        number = len(across)
        vectors = np.matmul(weights[1], across.reshape(number, -1, count * size))
        images = np.matmul(factors, table.images(across, some)).reshape(number * columns, count, -1)
        yield PlanePart(
            slice(start * columns, some.stop * columns),
            vectors.reshape(-1, count, size),
            images[:, :, :size],
            images[:, :, size:],
            (
                None if table.positive else np.repeat(table.phase[some, None, :size], columns, axis=0),
                table.mirror,
            ),
            table.margins(some),
            np.tile(table.hermitian, number) & np.repeat((table.phase[some] > 0).all(axis=1), columns),
            table.real,
        )


@dataclass(frozen=True, eq=False)
class _Table:
    """Numbers of a plane whose first axis moves the link and whose second moves the site weight.

    ``root`` and ``phase`` have shape (R, bras), ``site`` (C, components), the rest (R,) or (C,).
    """

    components: SiteComponents
    matrices: tuple[Any, ...]
    root: NDArray[np.float64]
    phase: NDArray[Any]
    site: NDArray[Any]
    mirror: NDArray[np.int64]
    norm: NDArray[np.float64]
    outside: NDArray[np.float64]
    edge: NDArray[np.float64]
    k_errors: NDArray[np.float64]
    site_errors: NDArray[np.float64]
    hermitian: NDArray[np.bool_]

    @classmethod
    def of(cls, plane: Plane) -> _Table:
        model, rank = plane.model, plane.model.group.rank
        values = plane.values(*plane.axes)
        outer = plane.cutoff + outward_reach(model.site, plane.cutoff, values)
        components = site_components(model.site, plane.cutoff, outer)
        k, k_errors = link_coefficients_at(model.link, outer, values)
        weights, errors = (np.atleast_2d(array) for array in components.coefficients(values))
        root = np.sqrt(np.abs(k))
        rim = slice(count_up_to(rank, 2 * plane.cutoff - outer), count_up_to(rank, plane.cutoff))
        rows, columns = np.ones((plane.shape[0], 1)), np.ones((plane.shape[1], 1))
        return cls(
            components,
            _component_matrices(components),
            root * rows,
            phase_of(k) * rows,
            weights * columns,
            conjugation(rank, plane.cutoff),
            np.asarray(model.site.norm_bound(values), dtype=float).reshape(-1) * columns[:, 0],
            np.asarray(model.link.largest_outside(plane.cutoff, values)).reshape(-1) * rows[:, 0],
            root[:, rim].max(axis=1) * rows[:, 0],
            k_errors * rows,
            errors * columns,
            _hermitian(components, weights, errors) & (columns[:, 0] > 0),
        )

    @cached_property
    def positive(self) -> bool:
        return not np.iscomplexobj(self.phase) and bool((self.phase > 0).all())

    @property
    def real(self) -> bool:
        return not (np.iscomplexobj(self.site) or np.iscomplexobj(self.phase))

    def images(self, across: NDArray[Any], some: slice) -> NDArray[Any]:
        """S N_c S Φ V: frames (r, q, m, n) of some rows to (r, components · q, m · bras)."""
        rows, nodes, count, size = across.shape
        root, phase = self.root[some, None, None], self.phase[some, None, None]
        dressed = (across * (root * phase)[..., :size]).reshape(-1, size).T
        found = [(matrix @ dressed).T.reshape(rows, nodes, count, -1) * root for matrix in self.matrices]
        return np.stack(found, axis=1).reshape(rows, len(self.matrices) * nodes, -1)

    def margins(self, some: slice) -> Margins:
        norm, outside, edge = self.norm[None, :], self.outside[some, None], self.edge[some, None]
        root = self.root[some, None]
        noise = 16 * EPS * norm * root.max(axis=2) ** 2 + input_errors(
            character_errors(self.components.support, self.site_errors[None]),
            norm,
            root,
            self.k_errors[some, None],
        )
        flat = (norm * outside, 0 * norm * outside, norm * edge * np.sqrt(outside), noise)
        return Margins(*(array.reshape(-1) for array in flat))


def _component_matrices(components: SiteComponents) -> tuple[Any, ...]:
    """N_c as SciPy CSR arrays, shape (bras, n) each."""
    from scipy import sparse

    pattern = components.pattern
    found = []
    for row in range(pattern.components.shape[0]):
        start, stop = pattern.components.indptr[row : row + 2]
        places = pattern.components.indices[start:stop]
        entries = (pattern.components.data[start:stop], (pattern.rows[places], pattern.columns[places]))
        found.append(sparse.csr_array(entries, shape=(pattern.outer_size, pattern.size)))
    return tuple(found)


def _hermitian(
    components: SiteComponents, weights: NDArray[Any], errors: NDArray[np.float64]
) -> NDArray[np.bool_]:
    """Whether w_c̄ is the complex conjugate of w_c, point by point."""
    place = {irrep: number for number, irrep in enumerate(components.support)}
    mirror = np.array([place.get(irrep.conjugate, -1) for irrep in components.support])
    partner = np.where(mirror >= 0, weights[:, mirror], 0.0).conj()
    return np.asarray((np.abs(partner - weights) <= 8 * EPS * np.abs(weights) + 2 * errors).all(axis=1))
