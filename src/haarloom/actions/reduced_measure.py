"""Powers of the reduced Haar measure H = ∏_{i<j} |x_i − x_j|²/N^N, 0 ≤ H ≤ 1."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from itertools import permutations
from typing import Any, ClassVar

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr, Rational

from haarloom.actions.base import Site, refuse_group
from haarloom.actions.parameters import Field, Parameter, Values, as_parameter
from haarloom.actions.torus_site import TorusSite
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.weights import characters_in_contents
from haarloom.torus.angles import full_angles

__all__ = ["HaarPower", "haar_power", "reduced_measure_at"]

_POWER = Field("power", "nonnegative real", "1", "power p of the reduced Haar measure H, 0 ≤ H ≤ 1")
_EXACT_UP_TO = 5  # N! permutations of contents are expanded
_HIGHEST_EXACT = 8


def haar_power(group: SU, power: Parameter) -> HaarPower:
    """Site weight H^p, H the reduced Haar measure normalised to largest value 1.

    Parameters
    ----------
    group : SU
    power : number, expression or name
        p ≥ 0; negative powers have poles where eigenvalues coincide. Small whole numbers give an exact
        finite class function for N ≤ 5.

    Notes
    -----
    For SU(3) with ℓ = L/3, H = 1 − 6 ℓℓ* + 4(ℓ³ + ℓ*³) − 3(ℓℓ*)² (common practice in Polyakov-loop models).
    """
    refuse_group("haar_power", group)
    return HaarPower(group, as_parameter(power, _POWER))


@dataclass(frozen=True)
class HaarPower(TorusSite):
    """H^p; see `haar_power`."""

    group: SU
    power: Expr

    kind: ClassVar[str] = "Haar power"
    unproven: ClassVar[str] = (
        "H^p is creased where eigenphases meet, its characters fall by a power only, unless p is a whole "
        "number up to 8 and N ≤ 5;"
    )
    FIELDS: ClassVar[tuple[Field, ...]] = (_POWER,)

    @property
    def finite(self) -> bool:  # type: ignore[override]
        """True for small whole powers and N ≤ 5."""
        return bool(self.power.is_Integer and self.power <= _HIGHEST_EXACT and self.group.n <= _EXACT_UP_TO)

    @property
    def bounds_proven(self) -> bool:  # type: ignore[override]
        """True where the class function is exact."""
        return self.finite

    def class_function(self) -> ClassFunction:
        """H^p exactly, if finite."""
        return _reduced_measure(self.group) ** int(self.power) if self.finite else super().class_function()

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact w_c if finite, else a named coefficient."""
        return self.class_function()[irrep] if self.finite else super().coefficient(irrep)

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """w_c exactly if finite, else by transform; other powers are creased where eigenvalues meet."""
        self._value("power", values)
        return (
            Site.coefficients_at(self, irreps, values)
            if self.finite
            else super().coefficients_at(irreps, values)
        )

    def norm_bound(self, values: Values) -> NDArray[Any]:
        """1, the largest value of H^p."""
        return np.ones(self._value("power", values).shape)

    def tail_bound(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Exact if finite, else an *estimate*."""
        return Site.tail_bound(self, cutoff, values) if self.finite else super().tail_bound(cutoff, values)

    def density_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """H^p from the eigenphases."""
        return np.asarray(reduced_measure_at(self.group.n, angles) ** self._value("power", values))

    def latex(self) -> str:
        """The product over pairs of eigenvalues."""
        n, power = self.group.n, sympy.latex(self.power)
        return rf"W(P)=\left[\frac{{1}}{{{n}^{{{n}}}}}\prod_{{i<j}}|x_i-x_j|^2\right]^{{{power}}}"


def reduced_measure_at(n: int, angles: NDArray[Any]) -> NDArray[np.float64]:
    """H at the given eigenphases."""
    phases = full_angles(n, angles)
    first, second = np.triu_indices(n, 1)
    gaps = (phases[..., first] - phases[..., second]) / 2
    return np.asarray((4 * np.sin(gaps) ** 2).prod(axis=-1) / n**n)


@lru_cache(maxsize=4)
def _reduced_measure(group: SU) -> ClassFunction:
    """H in characters: |Δ|² = Σ_π sgn(π) Σ_σ x^{σ(ρ − πρ)}."""
    n = group.n
    contents: dict[tuple[int, ...], int] = {}
    for order in permutations(range(n)):
        sign = (-1) ** sum(order[i] > order[j] for i in range(n) for j in range(i + 1, n))
        difference = tuple(j - i for i, j in enumerate(order))
        for image in permutations(range(n)):
            moved = tuple(difference[i] for i in image)
            contents[moved] = contents.get(moved, 0) + sign
    terms = characters_in_contents({content: count for content, count in contents.items() if count})
    return ClassFunction(group, {labels: Rational(count, n**n) for labels, count in terms.items()})
