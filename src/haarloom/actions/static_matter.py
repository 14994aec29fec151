"""What static fermions and static bosons share: det_R(1 ± zP)^{±n} det_R(1 ± z̄P†)^{±n}."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, ClassVar, Literal

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr

from haarloom.actions.base import Site, refuse_group
from haarloom.actions.fugacities import fugacities, known_inputs
from haarloom.actions.irrep_words import irrep_of
from haarloom.actions.multiplicative import Factor
from haarloom.actions.parameters import Field, Parameter, Values
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.whole_numbers import whole_number
from haarloom.exceptions import SizeError
from haarloom.torus.angles import full_angles

__all__ = ["COPIES", "IRREP", "StaticMatter", "static_arguments"]

MOST_COPIES = 100
"""With antiparticles one SU(3) coefficient has 30,197 terms here, and the number grows with the square."""

COPIES = Field("copies", "positive integer", "1", "copies n = spin states × flavours", True)
IRREP = Field("irrep", "irrep", "fundamental", "irrep R of the particles", True)


def static_arguments(
    name: str,
    group: SU,
    fields: tuple[Field, Field],
    given: tuple[Parameter | None, Parameter, int, Irrep | str | tuple[int, ...]],
    physical: Mapping[str, Any],
) -> tuple[SU, Expr, Expr, int, Irrep]:
    """The fields of a `StaticMatter` from what the user gave: z, z̄, copies and R, or physical inputs."""
    refuse_group(name, group)
    z, zbar, copies, irrep = given
    return (
        group,
        *fugacities(z, zbar, fields, **known_inputs(physical)),
        _copies(copies),
        irrep_of(group, irrep),
    )


def _copies(copies: int) -> int:
    number = whole_number("copies", copies, 1, "spin states × flavours")
    if number > MOST_COPIES:
        raise SizeError(
            f"copies {number:,} given; at most {MOST_COPIES} are taken, because every coefficient is a "
            "polynomial of a degree that grows with them: take fewer, or split the matter into factors."
        )
    return number


@dataclass(frozen=True)
class StaticMatter(Site):
    """det_R(1 + szP)^{sn} det_R(1 + sz̄P†)^{sn} with s = 1 for fermions and −1 for bosons."""

    group: SU
    z: Expr
    zbar: Expr
    copies: int
    irrep: Irrep

    sign: ClassVar[Literal[1, -1]]
    statistics: ClassVar[Literal["fermion", "boson"]]

    @property
    def factors(self) -> tuple[Factor, ...] | None:
        """Factors over the eigenvalues of P, if R is the fundamental or its conjugate."""
        if self.irrep not in (self.group.fundamental, self.group.antifundamental):
            return None
        sense = 1 if self.irrep == self.group.fundamental else -1
        forward = Factor(self.statistics, self.z, self.copies, sense)
        backward = Factor(self.statistics, self.zbar, self.copies, -sense)
        return (forward, backward) if self.zbar != 0 else (forward,)

    def density_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """∏ over the weights of R of (1 + sz e^{iw·θ})^{sn} (1 + sz̄ e^{−iw·θ})^{sn}."""
        z, zbar = (self.sign * self._value(name, values) for name in ("z", "zbar"))
        phases, multiplicities = _eigenphases(self.irrep, angles)
        eigenvalues = np.exp(1j * phases)
        factors = (1 + z[..., None] * eigenvalues) * (1 + zbar[..., None] / eigenvalues)
        return np.asarray((factors ** (self.sign * self.copies * multiplicities)).prod(axis=-1))

    def latex(self) -> str:
        """Both determinants; a fugacity of zero leaves its factor out."""
        irrep = "" if self.irrep == self.group.fundamental else f"_{{{self.irrep.latex()}}}"
        power = self.sign * self.copies
        exponent = "" if power == 1 else f"^{{{power}}}"
        sign = "+" if self.sign > 0 else "-"
        text = ""
        for fugacity, loop in ((self.z, "P"), (self.zbar, r"P^\dagger")):
            if fugacity != 0:
                factor = sympy.latex(fugacity)
                factor = rf"\left({factor}\right)" if fugacity.is_Add else factor
                text += rf"\det{irrep}\left(1{sign}{factor}{loop}\right){exponent}"
        return f"W(P)={text or '1'}"


def _eigenphases(irrep: Irrep, angles: NDArray[Any]) -> tuple[NDArray[np.float64], NDArray[np.int_]]:
    """Eigenphases of P in the irrep, shape (..., number of weights), and their multiplicities."""
    phases = full_angles(irrep.group.n, angles)
    weights = irrep.weights()
    labels = np.array(list(weights), dtype=float)
    # w·θ = Σ_i labels_i (θ_1 + … + θ_i), because the fundamental weight i is e_1 + … + e_i
    partial = np.cumsum(phases[..., :-1], axis=-1)
    return partial @ labels.T, np.array(list(weights.values()))
