"""The matrix grid: which elements are zero, how large the others are, which one is chosen."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import anywidget
import numpy as np
import traitlets

from haarloom.widgets.head import FRONT
from haarloom.widgets.stills import grid_svg

if TYPE_CHECKING:
    from haarloom.algebra.irrep import Irrep

__all__ = ["MatrixGrid"]


class MatrixGrid(anywidget.AnyWidget):
    """A square matrix on a basis of irreps, as a grid that mouse and keyboard choose from.

    Attributes
    ----------
    rows
        For each irrep: name, labels, dimension, nality.
    order
        N of SU(N), the modulus of N-ality.
    pattern
        n² bytes, 1 where an element is not identically zero.
    re, im
        n² float64 each, row by row; empty while there are no numbers (``im`` also where T is real).
    selected
        (row, column), or (-1, -1).
    """

    _esm = FRONT / "grid.js"
    _css = FRONT / "grid.css"

    rows = traitlets.List(traitlets.Dict()).tag(sync=True)
    order = traitlets.Int(1).tag(sync=True)
    pattern = traitlets.Bytes(b"").tag(sync=True)
    re = traitlets.Bytes(b"").tag(sync=True)
    im = traitlets.Bytes(b"").tag(sync=True)
    selected = traitlets.Tuple(traitlets.Int(), traitlets.Int(), default_value=(-1, -1)).tag(sync=True)

    def show_pattern(self, basis: Sequence[Irrep], pattern: Sequence[Sequence[bool]]) -> None:
        """Lay out a new basis; the numbers of the old one are dropped."""
        with self.hold_sync():
            self.rows = [_row(irrep) for irrep in basis]
            self.order = basis[0].group.n
            self.pattern = np.asarray(pattern, dtype=np.uint8).tobytes()
            self.re = self.im = b""

    def show_numbers(self, matrix: np.ndarray) -> None:
        """Show the elements of an (n, n) real or complex matrix."""
        imaginary = np.imag(matrix)
        with self.hold_sync():
            self.re = np.ascontiguousarray(np.real(matrix), dtype=np.float64).tobytes()
            self.im = imaginary.astype(np.float64).tobytes() if np.any(imaginary) else b""

    def still(self) -> str:
        """The grid as a static picture."""
        size = len(self.rows)
        pattern = np.frombuffer(self.pattern, dtype=np.uint8).reshape(size, size)
        parts = [np.frombuffer(part) for part in (self.re, self.im) if part]
        magnitudes = np.hypot.reduce(parts).reshape(size, size) if parts else pattern.astype(float)
        nality = np.array([row["nality"] for row in self.rows])
        steps = (nality[:, None] - nality[None, :]) % self.order
        return grid_svg([row["name"] for row in self.rows], steps, pattern, magnitudes, self.order)


def _row(irrep: Irrep) -> dict[str, Any]:
    return {
        "name": irrep.name,
        "labels": list(irrep.labels),
        "dimension": irrep.dimension,
        "nality": irrep.nality,
    }
