"""Class functions whose overlaps with characters are determinants of one-dimensional integrals.

For N ≥ 7 no grid of eigenphases is fine enough for a weight of unknown reach. Where the weight has one of
these two forms, Andréief's identity (the continuous form of Cauchy and Binet's) turns its N-fold integral
into determinants, and each entry is a sum over one regular grid.

References
----------
C. Andréief, Mém. Soc. Sci. Bordeaux 2 (1883) 1; for products over eigenvalues also E. Heine and G. Szegő
(M. L. Mehta, *Random Matrices*). The sum over windings: P. Menotti, E. Onofri, Nucl. Phys. B 190 (1981) 288.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.polynomial.hermite_e import hermevander
from numpy.typing import NDArray

from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ConvergenceError
from haarloom.torus.angles import full_angles

__all__ = ["DeterminantForm", "EigenvalueProduct", "WindingGaussian"]

_MOST_POINTS = 1 << 14
_SETTLED = 1e-15
_FAR = 9.0  # standard deviations of a Gaussian; e^{−40} is left out


@dataclass(frozen=True, eq=False)
class EigenvalueProduct:
    """f(P) = ∏_j φ(θ_j) over the eigenphases of P.

    Parameters
    ----------
    group : SU
    factor : callable
        φ, elementwise on an array of phases, 2π-periodic.
    """

    group: SU
    factor: Callable[[NDArray[np.float64]], NDArray[Any]]

    def at(self, angles: NDArray[Any]) -> NDArray[Any]:
        """f at eigenphases, last axis N − 1 or N."""
        return np.asarray(self.factor(full_angles(self.group.n, angles)).prod(axis=-1))

    def coefficient(self, irrep: Irrep) -> complex:
        """∫dP χ_r* f."""
        return self.matrix_element(irrep, self.group.trivial)

    def matrix_element(self, bra: Irrep, ket: Irrep) -> complex:
        """∫dP χ_bra* f χ_ket = Σ_m det φ̂(l_j − k_i + m), l and k the rows λ_j + N − j of bra and ket."""
        fourier, reach = self._fourier()
        gaps = _rows(bra)[:, None] - _rows(ket)[None, :]
        last = reach + int(np.abs(gaps).max())
        places = gaps + np.arange(-last, last + 1)[:, None, None]
        entries = np.where(np.abs(places) <= reach, fourier[places % len(fourier)], 0)
        return complex(np.linalg.det(entries).sum())

    def _fourier(self) -> tuple[NDArray[np.complex128], int]:
        """φ̂(k), and the largest |k| where it counts; the grid is doubled until the upper half is noise."""
        points = 64
        while points <= _MOST_POINTS:
            samples = np.asarray(self.factor(2 * np.pi * np.arange(points) / points))
            fourier = np.fft.fft(samples) / points
            counts = np.abs(fourier) > _SETTLED * np.abs(fourier).max()
            reach = int(np.abs(np.fft.fftfreq(points, 1 / points)[counts]).max())
            if reach < points // 4:
                return fourier, reach
            points *= 2
        raise ConvergenceError(
            f"The factor of one eigenvalue does not settle on {_MOST_POINTS:,} points of the circle: it "
            "has a singularity too near to |x| = 1. Keep the parameters away from there."
        )


@dataclass(frozen=True, eq=False)
class WindingGaussian:
    """f(P) = Σ_m ∏_{i<j} (θ_i^m − θ_j^m)/2 sin(½(θ_i − θ_j)) · exp(−Σ_j (θ_j^m)²/2τ), θ^m = θ + 2πm, Σ m = 0.

    The sum over windings m unrolls the torus to the hyperplane Σ θ = 0, and the Gaussian of Σ θ factorises
    there, so that one integral over all of R^N is left.
    """

    group: SU
    tau: float

    def at(self, angles: NDArray[Any]) -> NDArray[np.float64]:
        """f at eigenphases; Σ m = 0 is picked by a Fourier sum over a phase conjugate to it."""
        phases = full_angles(self.group.n, angles)
        phases = phases - 2 * np.pi * np.round(phases / (2 * np.pi))
        excess = np.round(phases.sum(axis=-1) / (2 * np.pi))
        most = int(np.ceil(_FAR * np.sqrt(self.tau) / (2 * np.pi))) + self.group.n
        turns = np.arange(-most, most + 1)
        nodes = self.group.n * len(turns)
        phi = 2 * np.pi * np.arange(nodes) / nodes
        columns = self._columns(phases[..., None] + 2 * np.pi * turns)
        summed = np.einsum("...jtk,tf->...fjk", columns, np.exp(1j * np.outer(turns, phi)))
        picked = np.linalg.det(summed) * np.exp(1j * phi * excess[..., None])
        first, second = np.triu_indices(self.group.n, 1)
        sines = (2 * np.sin((phases[..., first] - phases[..., second]) / 2)).prod(axis=-1)
        # a phase moved by 2π turns the sign of N − 1 sines
        sign = (-1.0) ** ((self.group.n - 1) * excess)
        return np.asarray(picked.mean(axis=-1).real * sign / sines)

    def coefficient(self, irrep: Irrep) -> complex:
        """∫dP χ_r* f, up to a constant common to all r.

        It is det ∫dθ e^{−i l_j θ} He_k(θ/√τ) e^{−θ²/2τ} with l = λ + ρ, Σ l = 0.
        """
        rows = _rows(irrep)
        exponents = rows - rows.mean()
        width = np.sqrt(self.tau)
        # the rule with step h misses what lies above the frequency 2π/h
        highest = float(np.abs(exponents).max()) + _FAR / width
        steps = int(np.ceil(2 * _FAR * width * highest / np.pi)) + 8
        theta = width * np.linspace(-_FAR, _FAR, steps)
        waves = np.exp(-1j * np.outer(exponents, theta))
        return complex(np.linalg.det(waves @ self._columns(theta)) * (theta[1] - theta[0]) ** self.group.n)

    def _columns(self, theta: NDArray[np.float64]) -> NDArray[np.float64]:
        """He_k(θ/√τ) e^{−θ²/2τ}, k = 0 … N − 1 last: unitriangular in the powers of θ/√τ."""
        scaled = theta / np.sqrt(self.tau)
        return np.asarray(hermevander(scaled, self.group.n - 1) * np.exp(-(scaled**2) / 2)[..., None])


DeterminantForm = EigenvalueProduct | WindingGaussian


def _rows(irrep: Irrep) -> NDArray[np.int_]:
    """λ_j + N − j."""
    return np.array(irrep.partition) + np.arange(irrep.group.n - 1, -1, -1)
