"""What a site weight is: real, positive, CK- and charge-symmetric, which N-alities it mixes."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import reduce
from math import gcd
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.actions.base import Site
from haarloom.actions.bosons import StaticBosons
from haarloom.actions.fermions import StaticFermions
from haarloom.actions.parameters import Values
from haarloom.actions.product import SiteProduct
from haarloom.actions.statements import ROUNDING, Statement, WeightAnalysis, accuracy_statement, numbers_for
from haarloom.actions.torus_picture import torus_picture
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import SizeError
from haarloom.torus.alcove import alcove_grid

__all__ = ["analyse_site"]

_CUTOFF = {2: 12, 3: 6, 4: 4, 5: 3, 6: 2, 7: 2, 8: 2}
_GRID = {2: 400, 3: 60, 4: 24, 5: 18, 6: 16, 7: 16, 8: 17}
_MOST_EXACT = 60


def analyse_site(site: Site, **values: complex) -> WeightAnalysis:
    """What a site weight is: real, positive, CK- and charge-symmetric, which N-alities it mixes, and more.

    Parameters
    ----------
    site : Site
    **values
        One number for every parameter.

    Raises
    ------
    MissingValueError
        If a parameter has no value.

    Notes
    -----
    W is real if w_c̄ = w_c*, CK-symmetric (T real in the character basis) if every w_c is real,
    charge-symmetric if w_c̄ = w_c, and makes T non-negative if every w_c is.
    """
    point = numbers_for(site, values)
    irreps = site.support() if site.finite else site.group.irreps(_CUTOFF[site.group.n])
    w, error = site.coefficients_at(irreps, point)
    table = _Coefficients(site.group.n, tuple(irreps), np.asarray(w), np.asarray(error))
    statements = (
        _proven(site, point, _reality(table), lambda w: w.conjugate(real=True) == w),
        _positivity(site, point),
        _proven(site, point, _ck(table), lambda w: w.conjugate(real=True) == _mirrored(w)),
        _proven(site, point, _charge(table), lambda w: _mirrored(w) == w),
        _nonnegative(table),
        _nalities(table),
        _particle_hole(site),
        _series(site),
        accuracy_statement(site),
    )
    return WeightAnalysis(f"site weight: {site.kind}", point, statements, torus_picture(site, point))


@dataclass(frozen=True, eq=False)
class _Coefficients:
    """w_c with errors, and where the conjugate of each irrep stands."""

    n: int
    irreps: tuple[Irrep, ...]
    w: NDArray[Any]
    error: NDArray[np.float64]

    @property
    def allowance(self) -> NDArray[np.float64]:
        return np.asarray(self.error + ROUNDING * np.abs(self.w).max(initial=0.0))

    @property
    def mirrored(self) -> NDArray[Any]:
        place = {irrep: i for i, irrep in enumerate(self.irreps)}
        return np.array([self.w[place[r.conjugate]] if r.conjugate in place else 0.0 for r in self.irreps])


def _proven(
    site: Site, point: Values, measured: Statement, law: Callable[[ClassFunction], bool]
) -> Statement:
    """The statement lifted to "exact" where the law holds for the class function at all real parameters."""
    small = site.finite and len(site.support()) <= _MOST_EXACT
    real = not any(np.iscomplexobj(value) for value in point.values())
    if not (measured.holds and small and real and law(site.class_function())):
        return measured
    return replace(measured, words=measured.words + " So for all real parameters.", basis="exact")


def _mirrored(function: ClassFunction) -> ClassFunction:
    """The same coefficients on the conjugate irreps: W(P†) as a function of P."""
    return ClassFunction(function.group, {r.conjugate: value for r, value in function.coefficients.items()})


def _reality(table: _Coefficients) -> Statement:
    holds = bool(np.all(np.abs(table.mirrored.conj() - table.w) <= 2 * table.allowance))
    words = "w_c̄ = w_c*: W(P) is a real number for every P." if holds else (
        "w_c̄ ≠ w_c* for some c: W(P) is complex (a sign problem in the ordinary basis)."
    )  # fmt: skip
    return Statement("real", holds, words, "measured")


def _positivity(site: Site, point: Values) -> Statement:
    angles, _ = alcove_grid(site.group, _GRID[site.group.n])
    try:
        sampled = np.asarray(site.density_at(angles, point))
    except SizeError as problem:
        return Statement("positive", None, str(problem), "not known")
    scale = np.abs(sampled).max()
    if np.any(np.abs(sampled.imag) > ROUNDING * scale):
        return Statement("positive", False, "W(P) is complex on the torus.", "measured")
    least = sampled.real.argmin()
    place = ", ".join(f"{angle:.3f}" for angle in angles[least])
    lowest = float(sampled.real[least])
    holds = lowest >= -ROUNDING * scale
    return Statement(
        "positive", bool(holds), f"Smallest W on a grid: {lowest:.4g}, at eigenphases ({place}).", "measured"
    )


def _ck(table: _Coefficients) -> Statement:
    holds = bool(np.all(np.abs(np.imag(table.w)) <= table.allowance))
    words = (
        "Every w_c is real: W(P) = W(P*)*, T is real in the character basis."
        if holds
        else "Some w_c is complex."
    )
    return Statement("CK symmetric", holds, words, "measured")


def _charge(table: _Coefficients) -> Statement:
    holds = bool(np.all(np.abs(table.mirrored - table.w) <= 2 * table.allowance))
    words = (
        "w_c̄ = w_c: W(P) = W(P†), particles and antiparticles weigh the same."
        if holds
        else "w_c̄ ≠ w_c for some c."
    )
    return Statement("charge symmetric", holds, words, "measured")


def _nonnegative(table: _Coefficients) -> Statement:
    real = np.abs(np.imag(table.w)) <= table.allowance
    holds = bool(np.all(real & (np.real(table.w) >= -table.allowance)))
    negative = [
        r.name for r, w in zip(table.irreps, table.w, strict=True) if np.real(w) < -table.allowance.max()
    ]
    words = (
        "No w_c is negative."
        if holds
        else f"Negative or complex w_c: {', '.join(negative[:6]) or 'complex ones'}."
    )
    return Statement("non-negative coefficients", holds, words, "measured")


def _nalities(table: _Coefficients) -> Statement:
    present = sorted(
        {r.nality for r, w, a in zip(table.irreps, table.w, table.allowance, strict=True) if abs(w) > a}
    )
    step = reduce(gcd, present, table.n)
    listed = ", ".join(map(str, present))
    if step == table.n:
        return Statement("N-alities", False, "Only N-ality 0 occurs: T does not mix N-alities.", "measured")
    rest = "all N-alities are mixed" if step == 1 else f"N-alities are mixed in steps of {step}"
    return Statement("N-alities", True, f"Components of N-ality {listed}: {rest}.", "measured")


def _particle_hole(site: Site) -> Statement:
    factors = site.sites if isinstance(site, SiteProduct) else (site,)
    if not all(isinstance(factor, StaticFermions) for factor in factors):
        return Statement("particle–hole", None, "Stated for static fermions alone.", "not known")
    words = []
    for fermions in (factor for factor in factors if isinstance(factor, StaticFermions)):
        power = fermions.copies * fermions.irrep.dimension
        if fermions.zbar == 0:
            words.append(f"W at z equals z^{power} times W at 1/z with P → P†")
        else:
            words.append(f"W at (z, z̄) equals (z z̄)^{power} times W at (1/z̄, 1/z)")
    return Statement("particle–hole", True, "; ".join(words) + ", since det_R P = 1.", "exact")


def _series(site: Site) -> Statement:
    factors = site.sites if isinstance(site, SiteProduct) else (site,)
    if any(isinstance(factor, StaticBosons) for factor in factors):
        words = "The sum over boson occupation converges for |z| < 1 and |z̄| < 1: radius 1."
        return Statement("series", True, words, "exact")
    if site.finite:
        return Statement("series", True, "A finite sum of characters; no series is cut off.", "exact")
    if all(hasattr(factor, "factors") or factor.finite for factor in factors):
        return Statement(
            "series", True, "Entire in its couplings: the radius of convergence is infinite.", "exact"
        )
    return Statement(
        "series", None, "Coefficients come from a transform on the torus, not from a series.", "exact"
    )
