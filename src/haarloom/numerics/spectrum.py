"""The one door to numbers: leading eigenvalues and masses of a ring model, each with its error."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to, validated_cutoff
from haarloom.numerics.bounds import eigenvalue_errors, mass_errors
from haarloom.numerics.compile import check_memory
from haarloom.numerics.cutoff import automatic_truncation, checked_levels
from haarloom.numerics.dense import EigenSystem
from haarloom.numerics.ordering import masses_from
from haarloom.numerics.parameters import checked_values, plain_numbers
from haarloom.numerics.premises import perron_frobenius
from haarloom.numerics.solve import solve
from haarloom.numerics.threads import single_threaded
from haarloom.numerics.truncation import Truncation, truncate
from haarloom.numerics.verdicts import verdict_codes, verdict_words

if TYPE_CHECKING:
    from haarloom.algebra.irrep import Irrep
    from haarloom.ring.model import RingModel

__all__ = ["TOLERANCE", "Spectrum", "spectrum"]

TOLERANCE = 1e-11
"""Truncation error of the masses that an automatic cutoff aims at."""


@dataclass(frozen=True, eq=False)
class Spectrum:
    """Leading levels of T at one parameter point.

    Attributes
    ----------
    eigenvalues
        λ_0 … λ_{L−1}, shape (L,): |λ| falling; of a complex pair the one with Im m > 0 first.
    masses
        m_1 … m_{L−1}, shape (L − 1,): m_n = −ln(λ_n/λ_0) in units of the inverse spatial lattice
        spacing. Re m is an inverse decay length, Im m ∈ (−π, π] a wave number.
    error
        Bound of |δm| for each mass, truncation and rounding together, shape (L − 1,).
    eigenvalue_error
        Bound of |δλ|, shape (L,).
    condition
        κ = ‖x‖‖y‖ of each eigenvalue, shape (L,).
    cutoff
        K of the basis Σ a_i ≤ K.
    right, left
        Vectors in the basis, shape (n, L), yᵢᵀ xⱼ = δᵢⱼ.
    verdicts
        For each mass ``"real"``, ``"complex pair"``, ``"complex"`` (T is not real, so that levels
        need no partner) or ``"undecided"`` (the error does not tell), shape (L − 1,).
    solver, status
        What solved it; a sentence on premises and error, with what to change where it matters.
    values
        Parameter values by name.
    """

    model: RingModel
    eigenvalues: NDArray[np.complex128]
    masses: NDArray[np.complex128]
    error: NDArray[np.float64]
    eigenvalue_error: NDArray[np.float64]
    condition: NDArray[np.float64]
    cutoff: int
    right: NDArray[Any] = field(repr=False)
    left: NDArray[Any] = field(repr=False)
    verdicts: tuple[str, ...]
    solver: str
    status: str
    values: Mapping[str, float | complex]

    @cached_property
    def basis(self) -> tuple[Irrep, ...]:
        """The irreps of the rows of ``right`` and ``left``."""
        return tuple(self.model.group.irreps(self.cutoff))

    def certify(self, digits: int = 20, **limits: Any) -> Any:
        """Proven enclosures for the untruncated T; see :func:`haarloom.numerics.certify.certify`."""
        from haarloom.numerics.certify import certify

        values: dict[str, Any] = dict(self.values)
        return certify(self.model, digits=digits, levels=len(self.eigenvalues), **limits, **values)

    def __repr__(self) -> str:
        lines = [f"Spectrum at {_point(self.values)} ({self.solver}, cutoff {self.cutoff})"]
        lines += [
            f"  m_{level} = {_number(mass)} ± {error:.1e}  {verdict}"
            for level, (mass, error, verdict) in enumerate(
                zip(self.masses, self.error, self.verdicts, strict=True), start=1
            )
        ]
        return "\n".join([*lines, f"  {self.status}"])

    def _repr_html_(self) -> str:
        from haarloom.numerics.faces import spectrum_html

        return spectrum_html(self)


@single_threaded
def spectrum(model: RingModel, levels: int = 6, cutoff: int | None = None, **values: Any) -> Spectrum:
    """Leading eigenvalues, masses and vectors at one point.

    Parameters
    ----------
    model
        The ring model.
    levels
        Number of eigenvalues, the leading one included; one more than the number of masses.
    cutoff
        Keep the irreps with Σ a_i ≤ cutoff. Left out, it is raised until the truncation error of
        every mass is below 1e-11; the error that is reported holds rounding as well.
    **values
        A number for each parameter of the model, matched by name.

    Raises
    ------
    MissingValueError
        If a symbol is left without a value.
    ParameterError
        If a value lies outside its domain, or more levels are asked for than there are irreps.
    SizeError
        If the basis would not fit into memory; the message says the size first.

    Examples
    --------
    >>> import haarloom as hl
    >>> G = hl.SU(3)
    >>> model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    >>> model.spectrum(levels=4, t=1, z=0).masses.real.round(10).tolist()
    [1.3333333333, 1.3333333333, 3.0]
    """
    numbers = plain_numbers(checked_values(model, values))
    count = checked_levels(levels)
    if cutoff is None:
        check_memory(count * count, f"the vectors of {count:,} levels")
        truncation, system, errors = automatic_truncation(model, count, numbers, TOLERANCE)
    else:
        truncation = truncate(model, _checked_size(model, count, cutoff), numbers)
        system = solve(truncation, count)
        errors = eigenvalue_errors(truncation, system, count)
    return _result(model, numbers, truncation, system, errors, chosen=cutoff is None)


def _checked_size(model: RingModel, levels: int, cutoff: object) -> int:
    """A user's cutoff, refused before anything is built when its basis would not fit."""
    level = validated_cutoff(cutoff)
    size = count_up_to(model.group.rank, level)
    checked_levels(levels, size)
    per_irrep = size if not model.site.finite else 8 * sum(c.dimension for c in model.site.support())
    check_memory(size * min(per_irrep, size), f"{size:,} irreps (cutoff {level} on {model.group})")
    return level


def _result(
    model: RingModel,
    values: Mapping[str, float | complex],
    truncation: Truncation,
    system: EigenSystem,
    errors: NDArray[np.float64],
    chosen: bool,
) -> Spectrum:
    count = len(errors)
    leading = np.asarray(system.values[:count], dtype=complex)
    error = mass_errors(leading, errors)
    return Spectrum(
        model=model,
        eigenvalues=leading,
        masses=masses_from(leading),
        error=error,
        eigenvalue_error=errors,
        condition=system.condition[:count],
        cutoff=truncation.cutoff,
        right=system.right[:, :count],
        left=system.left[:, :count],
        verdicts=tuple(
            verdict_words(
                verdict_codes(leading, errors, system.values, truncation.real, truncation.hermitian)
            ).tolist()
        ),
        solver=system.solver,
        status=_status(truncation, errors, chosen),
        values=dict(values),
    )


def _status(truncation: Truncation, errors: NDArray[np.float64], chosen: bool) -> str:
    premise = perron_frobenius(truncation)[1]
    size = f"cutoff {truncation.cutoff} ({truncation.size:,} irreps)"
    if truncation.outside == 0 and not np.isfinite(errors).all():
        rank = int(np.argmin(np.isfinite(errors)))
        return (
            f"{premise} No irrep beyond {size} has k_r ≠ 0: T has rank {rank}, further masses are infinite."
        )
    if not np.isfinite(errors).all():
        level = int(np.argmin(np.isfinite(errors)))
        if chosen:
            return (
                f"{premise} With {size} truncation is negligible, but from level {level} on rounding and the "
                f"stated errors of k_r and w_c, up to {truncation.noise:.1e} in norm, leave the levels open: "
                "ask for fewer levels, or use certify(...)."
            )
        return (
            f"{premise} With {size} the bound does not close from level {level} on: what is cut off may have "
            f"norm up to {truncation.outer_norm:.1e}. These are eigenvalues of the truncated T only; "
            "leave cutoff out to have it chosen."
        )
    origin = f"chosen so that truncation shifts masses by less than {TOLERANCE:.0e}" if chosen else "as given"
    return f"{premise} {size[0].upper()}{size[1:]}, {origin}; eigenvalue errors up to {errors.max():.1e}."


def _point(values: Mapping[str, float | complex]) -> str:
    return ", ".join(f"{name} = {value:.6g}" for name, value in values.items()) or "no parameters"


def _number(mass: complex) -> str:
    return f"{mass.real:.12g}" if mass.imag == 0 else f"{mass.real:.12g} {mass.imag:+.12g}i"
