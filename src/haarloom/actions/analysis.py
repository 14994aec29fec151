"""What kind of transfer matrix a weight makes, in words, and how each statement was found."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import reduce
from math import gcd
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from haarloom.actions.base import Link, Site
from haarloom.actions.bosons import StaticBosons
from haarloom.actions.coefficient_table import CoefficientTable
from haarloom.actions.fermions import StaticFermions
from haarloom.actions.heat_kernel import HeatKernel
from haarloom.actions.parameters import Values, named_values
from haarloom.actions.pictures import table_html
from haarloom.actions.product import SiteProduct
from haarloom.actions.torus_picture import torus_picture
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ClassFunctionError, ConvergenceError, MissingValueError, SizeError
from haarloom.torus.alcove import alcove_grid

__all__ = ["Statement", "WeightAnalysis", "analyse_link", "analyse_site", "analyse_transfer"]

Basis = Literal["exact", "measured", "not known"]

_CUTOFF = {2: 12, 3: 6, 4: 4, 5: 3, 6: 2, 7: 2, 8: 2}
_GRID = {2: 400, 3: 60, 4: 24, 5: 18, 6: 16, 7: 16, 8: 17}
_ROUNDING = 1e-11
_MOST_EXACT = 60


@dataclass(frozen=True)
class Statement:
    """One property of a weight.

    Attributes
    ----------
    name : str
        Short key, such as ``"positive"``.
    holds : bool or None
        None where the question does not apply or was not decided.
    words : str
        What was found, in a sentence.
    basis : {"exact", "measured", "not known"}
        Proven from the exact expressions, or seen in numbers at the given point.
    """

    name: str
    holds: bool | None
    words: str
    basis: Basis


@dataclass(frozen=True)
class WeightAnalysis:
    """Statements about one weight or one pair, at one point of parameter space.

    ``analysis["positive"]`` is the statement of that name; in a notebook the analysis shows a table and the
    picture.
    """

    title: str
    values: Mapping[str, complex]
    statements: tuple[Statement, ...]
    picture: str = ""

    def __getitem__(self, name: str) -> Statement:
        for statement in self.statements:
            if statement.name == name:
                return statement
        raise KeyError(f"{name!r}: known are {', '.join(s.name for s in self.statements)}")

    def __repr__(self) -> str:
        given = ", ".join(f"{name} = {value:g}" for name, value in self.values.items())
        lines = [f"{self.title}" + (f" at {given}" if given else "")]
        return "\n".join(
            lines + [f"  {s.name}: {_answer(s)} ({s.basis}). {s.words}" for s in self.statements]
        )

    def _repr_html_(self) -> str:
        rows = [[s.name, _answer(s), s.words, s.basis] for s in self.statements]
        return self.picture + table_html(
            ["property", "holds", "what was found", "how"], rows, self.title, words=True
        )


def _answer(statement: Statement) -> str:
    return {True: "yes", False: "no", None: "—"}[statement.holds]


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
    point = _point(site, values)
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
        _accuracy(site),
    )
    return WeightAnalysis(f"site weight: {site.kind}", point, statements, torus_picture(site, point))


def analyse_link(link: Link, **values: complex) -> WeightAnalysis:
    """What a link weight is: real, non-negative, decreasing, Hermitian, with which string tensions and
    series.

    Parameters
    ----------
    link : Link
    **values
        One number for every parameter.
    """
    from haarloom.actions.torus_picture import plaquette_picture

    point = _point(link, values)
    irreps = link.group.irreps(_CUTOFF[link.group.n])
    k, error = link.kernel_at(irreps, point)
    statements = (
        _kernel_hermitian(k, error),
        _kernel_positive(link, k, error),
        _kernel_mixing(irreps, k, error),
        _decay(link, irreps, point),
        _casimir_scaling(link, point),
        _strong_radius(link),
        _accuracy(link),
    )
    return WeightAnalysis(f"link weight: {link.kind}", point, statements, plaquette_picture(link, point))


def analyse_transfer(link: Link, site: Site, **values: complex) -> WeightAnalysis:
    """Whether T comes out real, non-negative and Hermitian, and which N-alities it joins."""
    own = analyse_link(link, **{n: v for n, v in values.items() if n in _names(link)})
    matter = analyse_site(site, **{n: v for n, v in values.items() if n in _names(site)})
    positive = own["positive kernel"].holds
    real = bool(positive and matter["CK symmetric"].holds)
    hermitian = bool(positive and matter["real"].holds)
    nonnegative = bool(positive and link.diagonal and matter["non-negative coefficients"].holds)
    statements = (
        _transfer_statement("T real", real, "K has a real square root and every w_c is real."),
        _transfer_statement("T Hermitian", hermitian, "K is positive and W real: the spectrum is real."),
        _transfer_statement("T non-negative", nonnegative, "All k_r and w_c are ≥ 0 (Perron and Frobenius)."),
        matter["N-alities"],
    )
    return WeightAnalysis(f"T from {link.kind} and {site.kind}", _numbers(values), statements)


def _transfer_statement(name: str, holds: bool, premise: str) -> Statement:
    return Statement(name, holds, premise if holds else f"Fails: {premise}", "measured")


@dataclass(frozen=True, eq=False)
class _Coefficients:
    """w_c with errors, and where the conjugate of each irrep stands."""

    n: int
    irreps: tuple[Irrep, ...]
    w: NDArray[Any]
    error: NDArray[np.float64]

    @property
    def allowance(self) -> NDArray[np.float64]:
        return np.asarray(self.error + _ROUNDING * np.abs(self.w).max(initial=0.0))

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


def _names(weight: Any) -> set[str]:
    return {symbol.name for symbol in weight.parameters}


def _numbers(values: Values) -> dict[str, complex]:
    return {name: array.item() for name, array in named_values(values).items()}


def _point(weight: Any, values: Values) -> dict[str, complex]:
    missing = sorted(_names(weight) - set(values))
    if missing:
        raise MissingValueError(
            f"No value for {', '.join(missing)}: an analysis needs a number for each, {missing[0]}=0.5."
        )
    return {name: value for name, value in _numbers(values).items() if name in _names(weight)}


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
    if np.any(np.abs(sampled.imag) > _ROUNDING * scale):
        return Statement("positive", False, "W(P) is complex on the torus.", "measured")
    least = sampled.real.argmin()
    place = ", ".join(f"{angle:.3f}" for angle in angles[least])
    lowest = float(sampled.real[least])
    holds = lowest >= -_ROUNDING * scale
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


def _accuracy(weight: Link | Site) -> Statement:
    bounds = (
        "Bounds on what a cutoff leaves out are proven."
        if weight.bounds_proven
        else ("Bounds on what a cutoff leaves out are estimates.")
    )
    words = " ".join(
        [weight.accuracy, bounds, *([weight.note] if isinstance(weight, CoefficientTable) else [])]
    )
    return Statement("proven bounds", weight.bounds_proven, words, "exact")


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


def _kernel_hermitian(k: NDArray[Any], error: NDArray[np.float64]) -> Statement:
    holds = bool(np.all(np.abs(k - k.conj().T) <= error + error.T + _ROUNDING * np.abs(k).max()))
    words = "K(P, P′) = K(P′, P)*." if holds else "k_rs ≠ k_sr* for some pair."
    return Statement("Hermitian kernel", holds, words, "measured")


def _kernel_positive(link: Link, k: NDArray[Any], error: NDArray[np.float64]) -> Statement:
    if not _kernel_hermitian(k, error).holds:
        return Statement("positive kernel", False, "K is not Hermitian.", "measured")
    levels = np.linalg.eigvalsh((k + k.conj().T) / 2)
    holds = bool(levels.min() >= -float(error.sum()) - _ROUNDING * float(np.abs(k).max()))
    what = "every k_r ≥ 0" if link.diagonal else "no eigenvalue of K is negative"
    found = f"On the lowest irreps {what}: K has a real square root."
    lacking = f"K has the negative eigenvalue {levels.min():.4g}: its square root is imaginary there."
    return Statement("positive kernel", holds, found if holds else lacking, "measured")


def _kernel_mixing(irreps: Sequence[Irrep], k: NDArray[Any], error: NDArray[np.float64]) -> Statement:
    rows, columns = np.nonzero(np.abs(k) > error + _ROUNDING * np.abs(k).max())
    mixed = any(
        irreps[i].nality != irreps[j].nality for i, j in zip(rows.tolist(), columns.tolist(), strict=True)
    )
    diagonal = bool(np.all(rows == columns))
    words = "Diagonal in the irreps." if diagonal else (
        "Mixes irreps of different N-ality." if mixed else "Mixes irreps of the same N-ality only."
    )  # fmt: skip
    return Statement("diagonal", diagonal, words, "measured")


def _decay(link: Link, irreps: Sequence[Irrep], point: Values) -> Statement:
    cutoff = max(sum(irrep.labels) for irrep in irreps)
    try:
        rest = float(np.max(link.largest_outside(cutoff, point)))
    except (ConvergenceError, SizeError) as problem:
        return Statement("decay", None, str(problem), "not known")
    words = f"Beyond Σ a_i = {cutoff} no |k_r| exceeds {rest:.3g}."
    return Statement("decay", rest < 1, words, "measured")


def _casimir_scaling(link: Link, point: Values) -> Statement:
    if not link.diagonal:
        return Statement("Casimir scaling", None, "String tensions need a diagonal kernel.", "not known")
    irreps = [link.group.irrep(*labels) for labels in _lowest(link)]
    found = link.string_tensions(irreps, point)
    if not np.all(np.isfinite(found.deviation)):
        return Statement("Casimir scaling", None, "Some k_r is not positive: no string tension.", "measured")
    worst = int(np.abs(found.deviation).argmax())
    words = f"σ_r/σ_F against C₂(r)/C₂(F): off by {found.deviation[worst]:+.2%} for {irreps[worst].name}."
    return Statement("Casimir scaling", bool(np.abs(found.deviation).max() < 1e-9), words, "measured")


def _lowest(link: Link) -> list[tuple[int, ...]]:
    return [irrep.labels for irrep in link.group.irreps(2) if any(irrep.labels)]


def _strong_radius(link: Link) -> Statement:
    from haarloom.actions.convergence import convergence_radius

    if isinstance(link, HeatKernel):
        return Statement(
            "strong-coupling series", True, "One exact term q^{C₂}, q = e^{−t}; nothing to converge.", "exact"
        )
    try:
        found = convergence_radius(link)
    except (ClassFunctionError, ConvergenceError) as problem:
        return Statement("strong-coupling series", None, str(problem), "not known")
    words = f"Converges for couplings of modulus below {found.radius:.8g}, the nearest zero of w_0."
    return Statement("strong-coupling series", True, words, "measured")
