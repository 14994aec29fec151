"""Link weights given by a plaquette weight w(U) without closed coefficients, and their numbers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray
from sympy import Expr, S

from haarloom.actions.base import Link
from haarloom.actions.named_coefficient import NamedCoefficient
from haarloom.actions.parameters import Values
from haarloom.actions.torus_coefficients import sampled_function
from haarloom.actions.torus_site import Point, each_point
from haarloom.actions.wilson import power_of
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ConvergenceError
from haarloom.torus.alcove_gauss import alcove_nodes
from haarloom.torus.characters import characters

__all__ = ["PlaquetteLink"]

_ORDERS = {
    2: (48, 96, 192, 384, 768),
    3: (32, 48, 72, 108, 160, 240),
    4: (16, 24, 36, 54, 72),
    5: (10, 15, 20),
}
_ORDERS |= {6: (7, 10, 13), 7: (5, 7, 8), 8: (4, 5, 6)}
_EPS = float(np.finfo(float).eps)


class PlaquetteLink(Link):
    """Base of link weights defined by `plaquette_at`: k_r = (w_r/w_0)^{N_t}, w_r = ∫dU χ_r(U)* w(U)/d_r.

    A class that sets ``creased`` has a weight that is smooth inside the alcove of eigenphases only, and is
    integrated by Gauss's rule there; the others are transformed on a periodic grid.
    """

    creased: ClassVar[bool] = False
    accuracy: ClassVar[str] = (
        "Integrals over the torus of eigenphases; the error is measured by refining the grid."
    )
    letter: ClassVar[str] = "k"

    def coefficient(self, irrep: Irrep) -> Expr:
        """A named coefficient, to the power N_t."""
        if not any(irrep.labels):
            return S.One
        one = replace(self, plaquettes=1)  # type: ignore[type-var]
        return NamedCoefficient.of(one, irrep) ** self.plaquettes

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """k_r by integration over the torus of eigenphases; the error is the change on refining the grid."""
        shape, points = each_point(self, values)
        pairs = [self._one_plaquette(irreps, point) for point in points]
        k = np.array([k for k, _ in pairs]).reshape((*shape, len(irreps)))
        error = np.array([error for _, error in pairs]).reshape((*shape, len(irreps)))
        if np.all(np.abs(k.imag) <= error):
            k = k.real
        return power_of(k, error, self.plaquettes)

    def _one_plaquette(
        self, irreps: Sequence[Irrep], point: Point
    ) -> tuple[NDArray[Any], NDArray[np.float64]]:
        wanted = [self.group.trivial, *irreps]
        dimensions = np.array([float(irrep.dimension) for irrep in wanted])
        w, error = self._integrals(wanted, point)
        w, error = w / dimensions, error / dimensions
        if abs(w[0]) <= 2 * error[0]:
            raise ConvergenceError(
                f"∫dU w(U) is zero within its error at {dict(point)}, so that k_r = w_r/w_0 has no meaning: "
                f"the "
                "weight averages to nothing, or it is too narrow for the finest grid. Change the couplings."
            )
        k = w[1:] / w[0]
        return k, (error[1:] + np.abs(k) * error[0]) / (np.abs(w[0]) - error[0]) + 4 * _EPS * np.abs(k)

    def _integrals(self, irreps: Sequence[Irrep], point: Point) -> tuple[NDArray[Any], NDArray[np.float64]]:
        if not self.creased:
            return sampled_function(self, "plaquette_at", point).coefficients(irreps)
        before = None
        for order in _ORDERS[self.group.n]:
            result, size = self._gauss(irreps, point, order)
            if before is not None:
                change = np.abs(result - before) + 32 * _EPS * size
                if change.max() <= 4096 * _EPS * size:
                    break
            before = result
        return result, change

    def _gauss(self, irreps: Sequence[Irrep], point: Point, order: int) -> tuple[NDArray[Any], float]:
        angles, weights = alcove_nodes(self.group.n, order)
        weighted = np.asarray(self.plaquette_at(angles, dict(point))) * weights
        return weighted @ characters(irreps, angles).conj(), float(np.abs(weighted).sum())
