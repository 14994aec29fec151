"""What kind of kernel a link weight makes, and what kind of transfer matrix with a site weight."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.actions.base import Link, Site
from haarloom.actions.convergence import convergence_radius
from haarloom.actions.heat_kernel import HeatKernel
from haarloom.actions.parameters import Values, named_values
from haarloom.actions.site_analysis import analyse_site
from haarloom.actions.statements import ROUNDING, Statement, WeightAnalysis, accuracy_statement, numbers_for
from haarloom.actions.torus_picture import plaquette_picture
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ClassFunctionError, ConvergenceError, SizeError

__all__ = ["analyse_link", "analyse_transfer"]

_CUTOFF = {2: 12, 3: 6, 4: 4, 5: 3, 6: 2, 7: 2, 8: 2}


def analyse_link(link: Link, **values: complex) -> WeightAnalysis:
    """What a link weight is: real, non-negative, decreasing, Hermitian, with which string tensions and
    series.

    Parameters
    ----------
    link : Link
    **values
        One number for every parameter.
    """
    point = numbers_for(link, values)
    irreps = link.group.irreps(_CUTOFF[link.group.n])
    k, error = link.kernel_at(irreps, point)
    statements = (
        _kernel_hermitian(k, error),
        _kernel_positive(link, k, error),
        _kernel_mixing(irreps, k, error),
        _decay(link, irreps, point),
        _casimir_scaling(link, point),
        _strong_radius(link),
        accuracy_statement(link),
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
    return WeightAnalysis(
        f"T from {link.kind} and {site.kind}",
        {name: value.item() for name, value in named_values(values).items()},
        statements,
    )


def _names(weight: Any) -> set[str]:
    return {symbol.name for symbol in weight.parameters}


def _transfer_statement(name: str, holds: bool, premise: str) -> Statement:
    return Statement(name, holds, premise if holds else f"Fails: {premise}", "measured")


def _kernel_hermitian(k: NDArray[Any], error: NDArray[np.float64]) -> Statement:
    holds = bool(np.all(np.abs(k - k.conj().T) <= error + error.T + ROUNDING * np.abs(k).max()))
    words = "K(P, P′) = K(P′, P)*." if holds else "k_rs ≠ k_sr* for some pair."
    return Statement("Hermitian kernel", holds, words, "measured")


def _kernel_positive(link: Link, k: NDArray[Any], error: NDArray[np.float64]) -> Statement:
    if not _kernel_hermitian(k, error).holds:
        return Statement("positive kernel", False, "K is not Hermitian.", "measured")
    levels = np.linalg.eigvalsh((k + k.conj().T) / 2)
    holds = bool(levels.min() >= -float(error.sum()) - ROUNDING * float(np.abs(k).max()))
    what = "every k_r ≥ 0" if link.diagonal else "no eigenvalue of K is negative"
    found = f"On the lowest irreps {what}: K has a real square root."
    lacking = f"K has the negative eigenvalue {levels.min():.4g}: its square root is imaginary there."
    return Statement("positive kernel", holds, found if holds else lacking, "measured")


def _kernel_mixing(irreps: Sequence[Irrep], k: NDArray[Any], error: NDArray[np.float64]) -> Statement:
    rows, columns = np.nonzero(np.abs(k) > error + ROUNDING * np.abs(k).max())
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
