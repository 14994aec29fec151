"""Character coefficients of products of exact factors as balls: one way for finite and infinite weights.

W is built by letting its factors act on a vector of coefficients. A finite factor F is the vector to start
from, exp[Σ h_r χ_r] acts by its Taylor series, and bosons act through

    det_R(1 − zP)^{−n} = ∏_{i ≥ 0} det_R(1 + z^q P^q)^n,    q = 2^i,

finite factors of non-negative weights whose number of orders doubles at each step. A weight ω acts by
reflection: s + ρ goes to s + ω + ρ (G. Racah and D. Speiser, *Fortschr. Phys.* 12 (1964) 1). Each such
step shifts Σ a_i by no more than its order in the majorant m(y) of :mod:`haarloom.numerics.majorant`, and
none enlarges Σ |w_c|. Three things are left out, and bounded in that norm:

* Irreps with Σ c > R. What went there and came back to Σ c ≤ L took more than 2R + 1 − L orders:
  at most Σ_{k > 2R + 1 − L} m_k (each path is counted where it leaves first).
* Taylor terms beyond M: m(1) e^{−x} x^{M+1}/(M + 1)! / (1 − x/(M + 2)), x = Σ |h_r| d_r.
* Boson factors from q on: m(1) [1 − (1 − |z|^q)^{n d_R}].

Rounding, and the width of parameters given as intervals, are in the radii.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from math import gcd
from typing import Any

import flint
import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import count_up_to
from haarloom.numerics.balls import precision
from haarloom.numerics.fusion import reflection_signs, strict_rows, weight_orbit
from haarloom.numerics.labels import label_array, positions
from haarloom.numerics.majorant import BallFactor, BosonBalls, ExponentialBalls, FiniteBalls, Majorant

__all__ = ["CharacterBalls", "character_balls"]

MOST_IRREPS = 50_000
"""Most coefficients carried along; where more would be needed, the radii grow instead."""

GUARD = 24
"""Bits of working precision that rounding may use up."""

Vector = NDArray[Any]
Weight = tuple[int, ...]


@dataclass(frozen=True, eq=False)
class CharacterBalls:
    """Coefficients of a class function and what lies beyond them.

    Attributes
    ----------
    rank, reach
        N − 1; the coefficients are those of all irreps with Σ c ≤ reach, in basis order.
    coefficients
        Balls w_c.
    majorant
        Bounds of the rest.
    """

    rank: int
    reach: int
    coefficients: list[Any]
    majorant: Majorant

    def beyond(self, order: int, dimensions: Sequence[int]) -> Any:
        """Upper bound of Σ |w_c| d_c over Σ c > order, from the balls as far as they go.

        Parameters
        ----------
        dimensions
            d_c in basis order, at least up to ``reach``.
        """
        whole = self.majorant.tail(order)
        if order >= self.reach:
            return whole
        start = count_up_to(self.rank, order)
        listed = zip(self.coefficients[start:], dimensions[start:], strict=False)
        summed = sum((abs(w) * d for w, d in listed), self.majorant.tail(self.reach)).upper()
        return summed if summed < whole else whole


def character_balls(
    factors: Sequence[BallFactor], majorant: Majorant, rank: int, reach: int
) -> CharacterBalls:
    """Balls w_c for Σ c ≤ reach, as good relative to m(1) as the precision of the majorant allows.

    Parameters
    ----------
    factors
        The first of them finite (:func:`haarloom.numerics.majorant.factor_balls`).
    majorant
        Of these factors.
    """
    with precision(majorant.bits):
        relative = flint.arb(2) ** (GUARD - majorant.bits)
        radius = _radius(majorant, rank, reach, majorant.total * relative)
        vector = _start(factors[0], rank, radius)
        missed = majorant.tail(2 * radius + 1 - reach)
        for factor in factors[1:]:
            if isinstance(factor, BosonBalls):
                vector, left_out = _with_bosons(vector, factor, rank, radius, relative)
            elif isinstance(factor, ExponentialBalls):
                vector, left_out = _exponentiated(vector, factor, rank, radius, relative)
            missed += majorant.total * left_out
        found = _widened(vector[: count_up_to(rank, reach)].tolist(), missed.upper(), factors, rank, reach)
    return CharacterBalls(rank, reach, found, majorant)


def _radius(majorant: Majorant, rank: int, reach: int, tolerance: Any) -> int:
    """R at which what leaves and comes back is below the tolerance, as far as memory allows."""
    orders = majorant.order_below(tolerance)
    radius = max(reach, (orders + reach) // 2)
    while radius > reach and count_up_to(rank, radius) > MOST_IRREPS:
        radius -= 1
    return radius


def _start(finite: BallFactor, rank: int, radius: int) -> Vector:
    assert isinstance(finite, FiniteBalls)
    vector = _zeros(rank, radius)
    labels = np.array([irrep.labels for irrep in finite.terms], dtype=np.int64).reshape(-1, rank)
    for place, value in zip(positions(labels, radius).tolist(), finite.terms.values(), strict=True):
        if place >= 0:
            vector[place] = value
    return vector


def _zeros(rank: int, radius: int) -> Vector:
    # the integer 0 marks what no path has reached
    return np.zeros(count_up_to(rank, radius), dtype=object)


def _exponentiated(
    vector: Vector, factor: ExponentialBalls, rank: int, radius: int, relative: Any
) -> tuple[Vector, Any]:
    """exp[Σ h_r χ_r] on a vector, and the part of the total that the Taylor series leaves out."""
    x = factor.strength
    weights = _weights_of(factor.terms)
    term, total, size, order = vector, vector, flint.arb(1), 0
    while True:
        order += 1
        size = size * x / order
        ratio = x / (order + 1)
        inverse = 1 / flint.arb(order)
        term = _acted(term, {w: value * inverse for w, value in weights.items()}, rank, radius)
        total = total + term
        following = size * ratio / (1 - x / (order + 2))
        if ratio < 0.5 and following < relative * x.exp():
            return total, following / x.exp()


def _weights_of(terms: Mapping[Irrep, Any]) -> dict[Weight, Any]:
    """Σ h_r χ_r by dominant weights: one coefficient for each Weyl orbit."""
    found: dict[Weight, Any] = {}
    for irrep, value in terms.items():
        for weight, count in irrep.dominant_weights().items():
            found[weight] = found.get(weight, 0) + value * count
    return found


def _with_bosons(
    vector: Vector, factor: BosonBalls, rank: int, radius: int, relative: Any
) -> tuple[Vector, Any]:
    """det_R(1 − zP)^{−n} on a vector, and the part of the total that its last factors are."""
    power = 1
    while True:
        left_out = 1 - (1 - factor.size**power) ** factor.power
        if left_out < relative:
            return vector, left_out.upper()
        weights = _powered_weights(factor, power)
        for _ in range(factor.copies):
            vector = _acted(vector, weights, rank, radius)
        power *= 2


def _powered_weights(factor: BosonBalls, power: int) -> dict[Weight, Any]:
    """det_R(1 + z^q P^q) by dominant weights, those of Λ^k R times q."""
    found: dict[Weight, Any] = {}
    for weight, counts in _antisymmetric_weights(factor.irrep).items():
        scaled = tuple(power * label for label in weight)
        found[scaled] = sum(
            (count * factor.fugacity ** (power * k) for k, count in counts.items()), flint.arb(0)
        )
    return found


@lru_cache(maxsize=32)
def _antisymmetric_weights(irrep: Irrep) -> dict[Weight, dict[int, int]]:
    """Multiplicity of each dominant weight in Λ^k R, by k."""
    found: dict[Weight, dict[int, int]] = {}
    for k in range(irrep.dimension + 1):
        for part, times in irrep.antisymmetric_power(k).items():
            for weight, count in part.dominant_weights().items():
                slot = found.setdefault(weight, {})
                slot[k] = slot.get(k, 0) + times * count
    return found


def _acted(vector: Vector, weights: Mapping[Weight, Any], rank: int, radius: int) -> Vector:
    """Σ_ω f_ω x^ω on a vector, cut at Σ a_i ≤ R; f by dominant weights."""
    present = _reached(vector)
    result = np.zeros(len(vector), dtype=object)
    for dominant, value in weights.items():
        if sum(dominant) > 2 * (radius + rank):
            continue  # no reflection of s + ω + ρ comes back to the basis
        moved = np.zeros(len(vector), dtype=object)
        for targets, sources, kept in _steps(dominant, rank, radius):
            alive = present[sources]
            here, there, split = targets[alive], sources[alive], int(alive[:kept].sum())
            moved[here[:split]] += vector[there[:split]]
            moved[here[split:]] -= vector[there[split:]]
        filled = np.flatnonzero(_reached(moved))
        result[filled] += moved[filled] * value
    return result


def _reached(vector: Vector) -> NDArray[np.bool_]:
    """Where a ball stands; comparing with 0 would miss balls that hold 0."""
    return np.array([type(entry) is not int for entry in vector], dtype=bool)


@lru_cache(maxsize=32)
def _steps(dominant: Weight, rank: int, radius: int) -> tuple[tuple[Any, Any, int], ...]:
    """For each weight of an orbit: targets, sources, and how many of them, listed first, have sign +1."""
    kets = strict_rows(label_array(rank, radius) + 1)
    found = []
    for weight in weight_orbit(dominant):
        moved = kets - weight
        signs = reflection_signs(moved)
        ordered = -np.sort(-moved, axis=1)
        sources = positions(ordered[:, :-1] - ordered[:, 1:] - 1, radius)
        sources[signs == 0] = -1
        plus = np.flatnonzero((sources >= 0) & (signs > 0))
        minus = np.flatnonzero((sources >= 0) & (signs < 0))
        targets = np.concatenate([plus, minus])
        found.append((targets.astype(np.int32), sources[targets].astype(np.int32), len(plus)))
    return tuple(found)


def _widened(
    numbers: list[Any], missed: Any, factors: Sequence[BallFactor], rank: int, reach: int
) -> list[Any]:
    """Balls with what was left out; exact zeros where no product of the factors' irreps arrives."""
    spread = flint.arb(0, missed)
    mixed = any(isinstance(number, flint.acb) for number in numbers)
    zero, extra = (flint.acb(0), flint.acb(spread, spread)) if mixed else (flint.arb(0), spread)
    step = gcd(rank + 1, *(irrep.nality for irrep in _irreps(factors)))
    forbidden = label_array(rank, reach) @ np.arange(1, rank + 1) % step != 0
    exact = all(factor.polynomial for factor in factors)
    return [
        zero + number + (0 if exact or absent else extra)
        for number, absent in zip(numbers, forbidden.tolist(), strict=True)
    ]


def _irreps(factors: Sequence[BallFactor]) -> Iterable[Irrep]:
    for factor in factors:
        yield from [factor.irrep] if isinstance(factor, BosonBalls) else factor.terms
