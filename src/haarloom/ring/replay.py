"""Replay the statements of a derivation on the maximal torus, independently of the algebra."""

from __future__ import annotations

import cmath
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property, singledispatch
from typing import TYPE_CHECKING

import numpy as np
import sympy

from haarloom.exceptions import ConvergenceError, SizeError
from haarloom.ring.claims import (
    Claim,
    ElementClaim,
    ExpansionClaim,
    KernelClaim,
    LinkFactorClaim,
    OverlapClaim,
    ProductClaim,
    RowClaim,
    SelectionClaim,
    SiteElementClaim,
)
from haarloom.ring.link_on_torus import LinkOnTorus, NotReplayable
from haarloom.ring.torus_function import TorusFunction
from haarloom.torus.characters import character, weyl_ratio

if TYPE_CHECKING:
    from haarloom.algebra.irrep import Irrep
    from haarloom.ring.derivation import Derivation
    from haarloom.ring.model import RingModel

__all__ = ["ReplayedStep", "Verification", "replay"]

VISIBLE = 0.02
"""Link coefficients are checked at couplings where they are at least this large, if there are any."""

SAMPLES = 7
"""Random torus points per pointwise statement: a false finite identity survives none of them."""

LINK_SCALES = (1, *(2.0**power for power in (-6, -4, -3, -2, -1, 1, 2, 3, 4)))
"""Factors on the link parameters, to find couplings where the coefficients at hand can be seen."""


@dataclass(frozen=True)
class ReplayedStep:
    """The outcome of one step: its largest residual, and what could not be replayed."""

    title: str
    residual: float
    passed: bool
    not_replayed: tuple[str, ...] = ()


@dataclass(frozen=True)
class Verification:
    """The outcome of a whole derivation; true when every step passed and none was left out."""

    steps: tuple[ReplayedStep, ...]
    values: Mapping[str, float]
    tolerance: float

    @property
    def passed(self) -> bool:
        """Every statement was replayed and holds to the tolerance."""
        return all(step.passed and not step.not_replayed for step in self.steps)

    def __bool__(self) -> bool:
        return self.passed

    def __repr__(self) -> str:
        lines = [f"Verification: {'passed' if self.passed else 'NOT passed'} (tolerance {self.tolerance:g})"]
        for step in self.steps:
            mark = "ok  " if step.passed else "FAIL"
            left = f"; not replayed: {', '.join(step.not_replayed)}" if step.not_replayed else ""
            lines.append(f"  {mark} {step.title}: residual {step.residual:.1e}{left}")
        lines.append("  at " + ", ".join(f"{name} = {value:.6g}" for name, value in self.values.items()))
        return "\n".join(lines)


@dataclass(frozen=True, eq=False)
class Torus:
    """The model at fixed random values, seen on the maximal torus only."""

    model: RingModel
    values: Mapping[str, float]
    angles: np.ndarray

    @cached_property
    def site(self) -> TorusFunction:
        """W, with its reach where W is a finite combination of characters."""
        site = self.model.site
        return TorusFunction(
            self.model.group,
            lambda angles: site.density_at(angles, self.values),
            reach=site.reach(self.values) if site.finite else None,
            form=None if site.finite else getattr(site, "determinant_form", lambda values: None)(self.values),
        )

    @cached_property
    def link(self) -> LinkOnTorus:
        """The link weight, through its plaquette weight or its kernel."""
        return LinkOnTorus(self.model.link, self.values)

    def number(self, expression: sympy.Expr) -> complex:
        """A stated expression at the random values."""
        numbers = {symbol: self.values[symbol.name] for symbol in expression.free_symbols}
        return complex(sympy.sympify(expression).subs(numbers).evalf(20))


def replay(derivation: Derivation, seed: int, tolerance: float) -> Verification:
    """Replay each step; see :meth:`haarloom.ring.derivation.Derivation.verify`."""
    torus = _random_torus(derivation, np.random.default_rng(seed))
    steps = tuple(_replay_step(step.title, step.claims, torus, tolerance) for step in derivation.steps)
    return Verification(steps, torus.values, tolerance)


def _random_torus(derivation: Derivation, rng: np.random.Generator) -> Torus:
    """Random values, with the link parameters scaled to where the two link coefficients can be seen.

    Of the scales at which both exceed VISIBLE the one with the smallest is taken, where the plaquette
    weight is smoothest and its quadrature cheapest; a tiny coefficient would hide any error in it.
    """
    model = derivation.model
    values = {symbol.name: float(rng.uniform(0.2, 0.8)) for symbol in model.parameters}
    angles = rng.uniform(-np.pi, np.pi, size=(SAMPLES, model.group.rank))
    links = {symbol.name for symbol in model.link.parameters}
    draws = (
        Torus(model, {name: v * scale if name in links else v for name, v in values.items()}, angles)
        for scale in LINK_SCALES
        if model.link.diagonal or scale <= 1
    )
    sizes = {draw: _smallest_coefficient(draw, derivation) for draw in draws}
    return min(sizes, key=lambda draw: (sizes[draw] < VISIBLE, abs(np.log(sizes[draw] / VISIBLE))))


def _smallest_coefficient(torus: Torus, derivation: Derivation) -> float:
    """The least of the link coefficients or link elements at hand, 1e-300 if one is zero or has no value."""
    link = torus.model.link
    try:
        stated = [
            claim.value
            for step in derivation.steps
            for claim in step.claims
            if isinstance(claim, KernelClaim)
        ]
        ends = (derivation.bra, derivation.ket) if link.diagonal else ()
        at_hand = [*stated, *(link.coefficient(irrep) for irrep in ends)]
        return max(min((abs(torus.number(value)) for value in at_hand), default=VISIBLE), 1e-300)
    except (ConvergenceError, SizeError):
        return 1e-300


def _replay_step(title: str, claims: tuple[Claim, ...], torus: Torus, tolerance: float) -> ReplayedStep:
    worst, reasons = 0.0, []
    for claim in claims:
        try:
            worst = max(worst, residual(claim, torus))
        except (NotReplayable, ConvergenceError, SizeError) as reason:
            reasons.append(str(reason))
    return ReplayedStep(title, worst, worst <= tolerance, tuple(dict.fromkeys(reasons)))


def _distance(stated: np.ndarray | complex, found: np.ndarray | complex) -> float:
    """Largest difference, relative to the larger side where that exceeds 1; nan counts as infinite."""
    scale = max(1.0, float(np.max(np.abs(stated))), float(np.max(np.abs(found))))
    difference = float(np.max(np.abs(np.asarray(stated) - np.asarray(found)))) / scale
    return difference if np.isfinite(difference) else float("inf")


@singledispatch
def residual(claim: object, torus: Torus) -> float:
    """How far the two sides of a claim are apart, seen on the torus."""
    raise TypeError(f"no replay for {type(claim).__name__}")


@residual.register
def _(claim: ExpansionClaim, torus: Torus) -> float:
    if not claim.complete:
        return max(
            (_distance(torus.number(w), torus.site.coefficient(c)) for c, w in claim.terms), default=0.0
        )
    stated = sum(
        (torus.number(w) * weyl_ratio(c, torus.angles) for c, w in claim.terms),
        start=np.zeros(len(torus.angles), dtype=complex),
    )
    return _distance(stated, torus.model.site.density_at(torus.angles, torus.values))


@residual.register
def _(claim: SelectionClaim, torus: Torus) -> float:
    named = sum(
        torus.site.coefficient(c) * _character_function(torus, c).matrix_element(claim.bra, claim.ket)
        for c in claim.components
    )
    return _distance(complex(named), torus.site.matrix_element(claim.bra, claim.ket))


@residual.register
def _(claim: ProductClaim, torus: Torus) -> float:
    left = weyl_ratio(claim.factor, torus.angles) * weyl_ratio(claim.ket, torus.angles)
    right = sum(n * weyl_ratio(irrep, torus.angles) for irrep, n in claim.terms)
    return _distance(right, left)


@residual.register
def _(claim: OverlapClaim, torus: Torus) -> float:
    found = _character_function(torus, claim.factor).matrix_element(claim.bra, claim.ket)
    return _distance(claim.value, complex(found))


@residual.register
def _(claim: SiteElementClaim, torus: Torus) -> float:
    return _distance(torus.number(claim.value), torus.site.matrix_element(claim.bra, claim.ket))


@residual.register
def _(claim: LinkFactorClaim, torus: Torus) -> float:
    value = torus.number(claim.value)
    stated = _distance(value, torus.link.coefficient(claim.irrep))
    return max(stated, _distance(torus.number(claim.root) ** 2, value))


@residual.register
def _(claim: ElementClaim, torus: Torus) -> float:
    # Squares: the quadrature's rounding error of 1e-16 in a small k_r would be 1e-8 in its root.
    stated = torus.number(claim.value)
    bra, ket = (torus.link.coefficient(irrep) for irrep in (claim.bra, claim.ket))
    site = torus.site.matrix_element(claim.bra, claim.ket)
    along = stated * np.conj(cmath.sqrt(bra) * site * cmath.sqrt(ket))
    return max(_distance(stated**2, bra * site**2 * ket), _distance(abs(along), along))


@residual.register
def _(claim: KernelClaim, torus: Torus) -> float:
    return _distance(torus.number(claim.value), torus.link.kernel_element(claim.bra, claim.middle))


@residual.register
def _(claim: RowClaim, torus: Torus) -> float:
    found = sum(
        torus.link.kernel_element(claim.bra, q) * torus.site.matrix_element(q, claim.ket)
        for q in claim.through
    )
    return _distance(torus.number(claim.value), found)


def _character_function(torus: Torus, irrep: Irrep) -> TorusFunction:
    return TorusFunction(torus.model.group, lambda angles: character(irrep, angles), reach=sum(irrep.labels))
