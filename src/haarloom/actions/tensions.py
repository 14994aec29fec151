"""String tensions of a link weight beside Casimir scaling."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from html import escape
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from haarloom.actions.parameters import Values
from haarloom.algebra.irrep import Irrep

if TYPE_CHECKING:
    from haarloom.actions.base import Link

__all__ = ["Tensions", "string_tensions"]


@dataclass(frozen=True, eq=False)
class Tensions:
    """String tensions of several irreps at one point of parameter space.

    Attributes
    ----------
    irreps : tuple of Irrep
    tension : ndarray, shape (n,)
        σ_r = −ln(k_r)/N_t in lattice units; infinite where k_r = 0, nan where k_r < 0 (no tension exists).
    error : ndarray, shape (n,)
    ratio : ndarray, shape (n,)
        σ_r/σ_F.
    casimir_ratio : ndarray, shape (n,)
        C₂(r)/C₂(F), what Casimir scaling says; exact for the heat kernel.
    """

    irreps: tuple[Irrep, ...]
    tension: NDArray[np.float64]
    error: NDArray[np.float64]
    ratio: NDArray[np.float64]
    casimir_ratio: NDArray[np.float64]

    @property
    def deviation(self) -> NDArray[np.float64]:
        """Relative deviation of the ratios from Casimir scaling."""
        with np.errstate(all="ignore"):
            return np.asarray(self.ratio / self.casimir_ratio - 1)

    def _rows(self) -> list[tuple[str, ...]]:
        columns = (self.tension, self.error, self.ratio, self.casimir_ratio)
        return [(r.name, *(f"{column[i]:.6g}" for column in columns)) for i, r in enumerate(self.irreps)]

    def __repr__(self) -> str:
        head = ("irrep", "σ_r", "error", "σ_r/σ_F", "C₂/C₂(F)")
        return "\n".join("  ".join(f"{cell:>10}" for cell in row) for row in (head, *self._rows()))

    def _repr_html_(self) -> str:
        head = "<tr><th>irrep</th><th>σ<sub>r</sub></th><th>error</th><th>σ<sub>r</sub>/σ<sub>F</sub></th>"
        head += "<th>C₂/C₂(F)</th></tr>"
        body = "".join(
            "<tr>" + "".join(f"<td>{escape(cell)}</td>" for cell in row) + "</tr>" for row in self._rows()
        )
        return f"<table>{head}{body}</table>"


def string_tensions(link: Link, irreps: Sequence[Irrep], values: Values) -> Tensions:
    """σ_r = −ln(k_r)/N_t for the irreps, with ratios to the fundamental.

    Parameters
    ----------
    link : Link
        A diagonal link weight.
    irreps : sequence of Irrep
    values : mapping
        One number for each parameter.
    """
    wanted = [link.group.fundamental, *irreps]
    k, error = link.coefficients_at(wanted, values)
    with np.errstate(all="ignore"):
        real = np.where(np.abs(np.imag(k)) <= error, np.real(k), np.nan)
        tension = -np.log(np.where(real >= 0, real, np.nan)) / link.plaquettes
        spread = error / (np.abs(real) * link.plaquettes)
        ratio = tension / tension[0]
    casimirs = np.array([float(irrep.casimir(2)) for irrep in wanted])
    return Tensions(tuple(irreps), tension[1:] + 0.0, spread[1:], ratio[1:], casimirs[1:] / casimirs[0])
