"""Proof: enclosures of leading eigenvalues and masses of the untruncated T; what is real, what complex."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from functools import reduce
from math import ceil, log
from typing import TYPE_CHECKING, Any

import flint
import numpy as np

from haarloom.algebra.labels import count_up_to
from haarloom.exceptions import ParameterError
from haarloom.numerics.ball_truncation import BallTruncation, ball_truncation, refuse_unproven
from haarloom.numerics.ball_vectors import approximate_vectors
from haarloom.numerics.balls import Interval, as_exact, exact_text, precision
from haarloom.numerics.cutoff import automatic_truncation, checked_levels
from haarloom.numerics.enclosures import Disc, Enclosure, enclose
from haarloom.numerics.parameters import checked_values
from haarloom.numerics.threads import single_threaded

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = [
    "UNDECIDED",
    "Certificate",
    "CertifiedLevel",
    "attempt",
    "certify",
    "checked_digits",
    "prepared",
    "values_text",
]

IRREP_LIMIT = 150
"""Most irreps in a certified basis: eigenvectors at 40 digits then take about ten seconds."""

PRECISION_LIMIT = 2000
"""Most bits of working precision."""

PIECE_LIMIT = 64
"""Most pieces that an interval is cut into."""

UNDECIDED = "undecided at this precision"


@dataclass(frozen=True, eq=False)
class CertifiedLevel:
    """What is proven about one level of the untruncated T.

    Attributes
    ----------
    eigenvalue
        Ball (flint.acb) that contains λ_n; None where no disc could be shown.
    mass
        Ball that contains m_n = −ln(λ_n/λ_0); None for the ground level.
    verdict
        ``"real"``, ``"complex pair"``, ``"complex"`` or ``"undecided at this precision"``.
    reason
        The sentence behind the verdict.
    count
        How many eigenvalues, with multiplicity, the disc holds.
    """

    eigenvalue: Any
    mass: Any
    verdict: str
    reason: str
    count: int


@dataclass(frozen=True, eq=False)
class Certificate:
    """Proven enclosures of leading levels.

    Attributes
    ----------
    values
        The exact parameter values: fractions or intervals.
    levels
        λ_0 first.
    leading
        Whether these are proven to be the levels of largest modulus.
    digits
        Decimal places to which every mass is enclosed.
    cutoff, bits
        Basis and working precision that did it.
    """

    model: RingModel
    values: Mapping[str, Any]
    levels: tuple[CertifiedLevel, ...]
    leading: bool
    digits: int
    cutoff: int
    bits: int

    @property
    def masses(self) -> tuple[Any, ...]:
        """Balls of m_1, m_2, …"""
        return tuple(level.mass for level in self.levels[1:])

    @property
    def verdicts(self) -> tuple[str, ...]:
        """One for each mass."""
        return tuple(level.verdict for level in self.levels[1:])

    def statement(self) -> str:
        """The theorem in words."""
        from haarloom.numerics.faces import certificate_text

        return certificate_text(self)

    def __repr__(self) -> str:
        return self.statement()

    def _repr_html_(self) -> str:
        from haarloom.numerics.faces import certificate_html

        return certificate_html(self)


@single_threaded
def certify(
    model: RingModel,
    digits: int = 20,
    levels: int = 6,
    irrep_limit: int = IRREP_LIMIT,
    precision_limit: int = PRECISION_LIMIT,
    **values: Any,
) -> Certificate:
    """Enclose the leading levels of the untruncated T in proven balls.

    Site weights need exact factors (`character_factors`): finite ones, bosons, loop fields, polynomial
    potentials, written polynomials times exponentials of polynomials, and products of all these. Links need
    to be diagonal with a proven tail: heat kernel, Wilson, plaquette weights with exact factors, tables,
    and strips stacked of such.

    Parameters
    ----------
    digits
        Decimal places wanted of every mass, 1 to 200. With an interval among the values the masses
        themselves vary; then one attempt is made and what it proves is returned.
    levels
        Number of eigenvalues, the leading one included.
    irrep_limit, precision_limit
        Where cutoff and precision stop rising.
    **values
        Exact numbers: int, Fraction, a decimal string, a float (taken as the decimal that Python
        prints: 0.3 is 3/10), a pair of such as an interval, or an :class:`Interval`.

    Returns
    -------
    Certificate
        Where the limits come first, with fewer digits or with levels left undecided, and the reason.

    Raises
    ------
    ConvergenceError
        If a weight has no proven bound, with the reason, before anything is computed; if the parameters are
        too close to the edge of their domain.
    ParameterError, MissingValueError
        For values as :func:`haarloom.numerics.spectrum.spectrum`.
    """
    wanted = checked_digits(digits)
    count = checked_levels(levels)
    exact, cutoff = prepared(model, count, values)
    if any(isinstance(value, Interval) for value in exact.values()):
        return _over_pieces(model, exact, count, cutoff)
    bits = ceil(wanted * log(10, 2)) + 64
    best: Certificate | None = None
    while True:
        best = _better(best, attempt(model, exact, count, cutoff, bits))
        if best.digits >= wanted:
            return best
        step = ceil((wanted - best.digits) / max(2 * best.digits / cutoff, 2)) if best.digits else 1
        bits += 64
        cutoff += min(step, 4)
        if count_up_to(model.group.rank, cutoff) > irrep_limit or bits > precision_limit:
            return best


def prepared(model: RingModel, levels: int, values: Mapping[str, Any]) -> tuple[dict[str, Any], int]:
    """Exact values, checked, and a cutoff at which the truncation error is below 1e-8 by the float bound."""
    exact = {name: as_exact(name, value) for name, value in values.items()}
    points = {name: _middle(value) for name, value in exact.items()}
    checked_values(model, points)
    refuse_unproven(model, exact)
    return exact, automatic_truncation(model, levels, points, 1e-8)[0].cutoff + 1


def checked_digits(digits: object) -> int:
    if not isinstance(digits, int) or isinstance(digits, bool) or not 1 <= digits <= 200:
        raise ParameterError(f"digits = {digits!r}: give a whole number of decimal places from 1 to 200.")
    return digits


def _middle(value: Any) -> Any:
    if isinstance(value, Interval):
        value = value.middle
    return float(value) if isinstance(value, Fraction) else complex(value)


def _better(first: Certificate | None, second: Certificate) -> Certificate:
    if first is None or second.digits >= first.digits:
        return second
    return first


def attempt(model: RingModel, values: Mapping[str, Any], levels: int, cutoff: int, bits: int) -> Certificate:
    """One enclosure at a given cutoff and precision, whatever it proves."""
    with precision(bits):
        truncation = ball_truncation(model, cutoff, values)
        try:
            enclosure = enclose(truncation, approximate_vectors(truncation.matrix), levels)
        except ZeroDivisionError:
            enclosure = Enclosure((None,) * levels, False)
        found = _levels(truncation, enclosure)
        return Certificate(model, dict(values), found, enclosure.leading, _digits(found), cutoff, bits)


def _over_pieces(model: RingModel, values: Mapping[str, Any], levels: int, cutoff: int) -> Certificate:
    """Certificate for all points of a box: cut into pieces until every level is decided on each."""
    open_boxes: list[dict[str, Any]] = [dict(values)]
    closed: list[Certificate] = []
    while open_boxes:
        box = open_boxes.pop()
        found = attempt(model, box, levels, cutoff, 64)
        decided = UNDECIDED not in (level.verdict for level in found.levels)
        if decided or len(open_boxes) + len(closed) >= PIECE_LIMIT:
            closed.append(found)
        else:
            open_boxes += _halved(box)
    hull = tuple(_hull(parts) for parts in zip(*(piece.levels for piece in closed), strict=True))
    leading = all(piece.leading for piece in closed)
    return Certificate(model, dict(values), hull, leading, _digits(hull), cutoff, 64)


def _halved(box: dict[str, Any]) -> list[dict[str, Any]]:
    """The box cut across its longest side."""
    sides = {name: value.width for name, value in box.items() if isinstance(value, Interval)}
    longest = max(sides, key=lambda name: sides[name])
    return [{**box, longest: half} for half in box[longest].halves()]


def _hull(parts: tuple[CertifiedLevel, ...]) -> CertifiedLevel:
    """What holds on every piece."""
    verdicts = {part.verdict for part in parts}
    same = len(verdicts) == 1
    reason = parts[0].reason if same else "it differs between parts of the interval"
    balls = [[getattr(part, name) for part in parts] for name in ("eigenvalue", "mass")]
    eigenvalue, mass = (
        None if any(one is None for one in group) else reduce(lambda a, b: a.union(b), group)
        for group in balls
    )
    counts = max(part.count for part in parts)
    return CertifiedLevel(eigenvalue, mass, parts[0].verdict if same else UNDECIDED, reason, counts)


def _levels(truncation: BallTruncation, enclosure: Enclosure) -> tuple[CertifiedLevel, ...]:
    ground = enclosure.discs[0]
    found = []
    for number, disc in enumerate(enclosure.discs):
        if disc is None:
            reason = "no circle around this level could be shown to be free of eigenvalues"
            found.append(CertifiedLevel(None, None, UNDECIDED, reason, 0))
            continue
        verdict, reason = _verdict(disc, truncation)
        eigenvalue = _ball(disc, verdict)
        mass = None
        if number and ground is not None:
            mass = -(eigenvalue / _ball(ground, _verdict(ground, truncation)[0])).log()
        found.append(CertifiedLevel(eigenvalue, mass, verdict, reason, disc.count))
    return tuple(found)


def _ball(disc: Disc, verdict: str) -> Any:
    spread = flint.arb(0, disc.radius)
    imaginary = flint.arb(0) if verdict == "real" else disc.centre.imag + spread
    return flint.acb(disc.centre.real + spread, imaginary)


def _verdict(disc: Disc, truncation: BallTruncation) -> tuple[str, str]:
    if truncation.hermitian:
        return "real", "T is Hermitian"
    off_axis = bool(abs(disc.centre.imag) > disc.radius)
    if not truncation.real:
        if off_axis:
            return "complex", "its disc does not meet the real axis (T is not real, so it needs no partner)"
        return UNDECIDED, "its disc meets the real axis and T is not real"
    if off_axis:
        return "complex pair", "T is real and the disc does not meet the real axis"
    if disc.count == 1 and disc.centre.imag == 0:
        return "real", "T is real and the disc, centred on the real axis, holds one eigenvalue"
    return UNDECIDED, f"its disc meets the real axis and holds {disc.count} eigenvalues"


def _digits(levels: tuple[CertifiedLevel, ...]) -> int:
    """Decimal places that every mass has for certain; 0 where one is missing."""
    if any(level.eigenvalue is None for level in levels):
        return 0
    radii = [float(level.mass.rad()) for level in levels[1:]]
    largest = max([*radii, 1e-300])
    return max(0, int(-np.log10(2 * largest))) if np.isfinite(largest) else 0


def values_text(values: Mapping[str, Any]) -> str:
    """Exact values for print."""
    return ", ".join(
        f"{name} ∈ {value}" if isinstance(value, Interval) else f"{name} = {exact_text(value)}"
        for name, value in values.items()
    )
