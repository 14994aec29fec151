"""Exact factors: their product is the weight on the torus, and what has none says why."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest
from sympy import Expr, Rational

import haarloom as hl
from haarloom.actions.character_factors import (
    BosonFactor,
    CharacterFactor,
    ExponentialFactor,
    FiniteFactor,
    merged_factors,
    written_factors,
)
from haarloom.actions.class_expression import class_expression
from haarloom.actions.potentials import logarithmic_potential, polynomial_potential
from haarloom.actions.reduced_measure import haar_power
from haarloom.actions.torus_site import TorusSite
from haarloom.exceptions import ConvergenceError
from haarloom.torus.characters import character

SU3 = hl.SU(3)


def value(factor: CharacterFactor, angles: np.ndarray) -> np.ndarray:
    """One factor on the torus; bosons from the characters of symmetric powers, as a geometric series."""
    if isinstance(factor, FiniteFactor):
        return factor.function.at(angles)
    if isinstance(factor, ExponentialFactor):
        return np.exp(factor.exponent.at(angles))
    z = float(factor.fugacity)
    series = sum(
        z**k * count * character(irrep, angles)
        for k in range(24)
        for irrep, count in factor.irrep.symmetric_power(k).items()
    )
    return series**factor.copies


@pytest.mark.parametrize(
    "site",
    [
        hl.static_fermions(SU3, 0.3, 0.1, copies=2),
        hl.static_bosons(SU3, 0.2, 0.1, copies=2),
        hl.loop_field(SU3, {"3": 0.3, "3bar": 0.1, "8": -0.2}),
        hl.static_fermions(SU3, 0.3) * hl.loop_field(SU3, {"3": 0.2}) * hl.static_bosons(SU3, 0.15),
        polynomial_potential(SU3, 1.2, 0.75, 7.5, volume=2),
        polynomial_potential(hl.SU(4), 1, 1, 1),
        logarithmic_potential(SU3, 2, -1, volume=2),
        haar_power(SU3, 2),
        hl.site_from(SU3, "(1 + L/3)*exp(chi(1,1)/7)*exp(conj(L)/9)"),
    ],
    ids=lambda site: site.kind,
)
def test_the_product_of_the_factors_is_the_weight(site, rng):
    angles = rng.uniform(-3, 3, (6, site.group.rank))
    product = np.prod([value(factor, angles) for factor in site.character_factors()], axis=0)
    assert np.allclose(product, site.density_at(angles, {}), rtol=1e-11, atol=0)


def test_finite_and_exponential_factors_are_merged():
    both = hl.static_fermions(SU3, "z") * hl.loop_field(SU3, {"3": "h"}) * hl.loop_field(SU3, {"3bar": "g"})
    factors = (both * hl.static_fermions(SU3, "y")).character_factors()
    assert [type(factor) for factor in factors] == [FiniteFactor, ExponentialFactor]
    assert merged_factors(factors) == factors
    bosons = (hl.static_bosons(SU3, "y", "x") * both).character_factors()
    assert [type(factor) for factor in bosons] == [FiniteFactor, ExponentialFactor, BosonFactor, BosonFactor]


@pytest.mark.parametrize("text", ["1/(4 - L)", "1 + exp(L)", "exp(1/(4 - L))", "cosh(L)"])
def test_expressions_without_factors(text):
    assert written_factors(class_expression(SU3, text)) is None
    with pytest.raises(ConvergenceError, match=r"no proven bound exists for the site weight written site"):
        hl.site_from(SU3, text).character_factors()


@pytest.mark.parametrize(
    "site",
    [logarithmic_potential(SU3, 1, "b"), logarithmic_potential(SU3, 1, -1.75), haar_power(SU3, 1.5)],
)
def test_creased_weights_say_why(site):
    with pytest.raises(ConvergenceError, match=f"{site.kind}: .*creased where eigenphases meet"):
        site.character_factors()
    with pytest.raises(ConvergenceError, match="creased"):
        (hl.static_fermions(SU3, "z") * site).character_factors()


@dataclass(frozen=True)
class Own(TorusSite):
    """A class of a user's own: exp(c |L|²), with and without its factor stated."""

    group: hl.SU
    c: Expr

    kind = "own"

    def density_at(self, angles, values):
        return np.exp(float(self.c) * np.abs(self.group.loop.at(angles)) ** 2)


@dataclass(frozen=True)
class OwnWithFactors(Own):
    def character_factors(self):
        return (ExponentialFactor(self.group.loop * self.group.loop.conjugate() * self.c),)


def test_a_weight_of_the_users_own_is_proven_once_it_states_its_factors():
    c = Rational(1, 10)
    link = hl.heat_kernel(SU3, 1)
    with pytest.raises(ConvergenceError, match="own: its characters come from values"):
        hl.RingModel(link, Own(SU3, c)).certify(digits=6, levels=2)
    proven = hl.RingModel(link, OwnWithFactors(SU3, c)).certify(digits=6, levels=2)
    written = hl.RingModel(link, hl.site_from(SU3, "exp(L*conj(L)/10)")).certify(digits=6, levels=2)
    assert proven.digits >= 6
    assert proven.masses[0].overlaps(written.masses[0])
