"""Perturbation series with exact coefficients, against numbers and against laws."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
import sympy
from mpmath import mp

import haarloom as hl
from haarloom.exceptions import ConvergenceError, MissingValueError, ParameterError
from numerics import referees
from numerics.models import EMBER, SU2, SU3, TINTED

t, z = sympy.symbols("t z")


def high_precision_masses(value: str, time: str, count: int):
    mp.dps = 60
    site = referees.fermions(3, 6, mp.mpf(value))
    return referees.masses(referees.levels(referees.transfer(referees.heat(3, 6, time), site), count))


def test_the_ground_level_at_lowest_order():
    """By hand, q = k/(1 − k), k = e^{−4t/3}: baryon 1, by 3 or 3bar 2q (z · z²), by both q² (z³)."""
    level = EMBER.series("z", order=3, levels=1).levels[0]
    k = sympy.exp(-4 * t / 3)
    found = level.eigenvalue[Fraction(3)]
    for time in ("1/2", "1", "2"):
        difference = (found - (1 + k / (1 - k)) ** 2).subs(t, sympy.Rational(time))
        assert abs(sympy.N(difference, 30)) < 1e-25
    assert level.neglected == 4


def test_the_fundamental_and_its_conjugate_start_degenerate_with_half_integer_powers():
    found = EMBER.series("z", order=4, levels=3)
    up, down = found.levels[1:]
    assert {irrep.name for irrep in up.irreps} == {"3", "3bar"}
    assert (up.branch, down.branch) == (1, -1)
    assert Fraction(3, 2) in up.mass
    assert up.neglected.denominator == 2
    for power, coefficient in up.mass.items():
        other = down.mass[power]
        sign = -1 if power.denominator == 2 else 1
        assert sympy.N((coefficient - sign * other).subs(t, 1), 20) == 0
    # a complex pair from the first order on: the root is imaginary for real t
    assert abs(sympy.im(sympy.N(up.mass[Fraction(3, 2)].subs(t, 1)))) > 1e-3
    assert sympy.simplify(up.mass[Fraction(0)] - 4 * t / 3) == 0


@pytest.mark.parametrize("order", [3, 4, 6])
def test_the_first_neglected_term_shows_in_numbers(order):
    """Halving z shrinks the difference to mpmath's masses (60 digits) by 2^(first neglected power)."""
    found = EMBER.series("z", order=order, levels=3, t=1)
    mp.dps = 60
    differences = []
    for value in ("0.002", "0.001"):
        exact = high_precision_masses(value, "1", 3)
        series = [mp.mpmathify(sympy.N(mass.subs(z, sympy.Rational(value)), 60)) for mass in found.masses]
        differences.append(min(abs(series[0] - mass) for mass in exact))
    measured = float(mp.log(differences[0] / differences[1], 2))
    expected = float(found.levels[1].neglected)
    assert measured > expected - 0.1
    # the promise is not empty either: the next term that can appear is at most 3/2 powers later
    assert measured < expected + 1.6


def test_symbolic_and_numeric_couplings_agree():
    symbolic = EMBER.series("z", order=3, levels=3)
    numeric = EMBER.series("z", order=3, levels=3, t="4/5")
    for one, other in zip(symbolic.masses, numeric.masses, strict=True):
        values = {t: sympy.Rational(4, 5), z: sympy.Rational(1, 10)}
        assert abs(sympy.N(one.subs(values) - other.subs(values), 30)) < 1e-25


@pytest.mark.parametrize("fixed", [{}, {"t": 1}], ids=["symbolic t", "t = 1"])
def test_compared_with_numbers_on_request(fixed):
    compared = EMBER.series("z", order=4, levels=3, **fixed).compare(z=0.1, t=1)
    assert "which falls like the power" in compared._repr_html_()
    assert np.abs(compared.difference).max() < 2e-3
    assert np.isfinite(compared.measured_order).all()
    assert (compared.measured_order > np.array([float(p) for p in compared.expected_order]) - 0.3).all()


def test_a_level_that_starts_alone_has_integer_powers():
    two = hl.RingModel(hl.heat_kernel(SU2, "t"), hl.static_fermions(SU2, "z"))
    found = two.series("z", order=4, levels=3, t=1)
    for level in found.levels:
        assert level.branch == 0
        assert all(power.denominator == 1 for power in level.eigenvalue)
    value = found.at(z=0.05, t=1)
    numbers = two.spectrum(levels=3, z=0.05, t=1).masses
    assert np.abs(value - numbers).max() < 1e-5


def test_a_series_in_another_parameter():
    """zbar with z = 0 is the conjugate problem: the same coefficients."""
    both = hl.RingModel(hl.heat_kernel(SU3, "t"), hl.static_fermions(SU3, "z", "zbar"))
    one = both.series("z", order=3, levels=1, t=1, zbar=0).levels[0].eigenvalue
    other = both.series("zbar", order=3, levels=1, t=1, z=0).levels[0].eigenvalue
    assert one.keys() == other.keys()
    assert all(sympy.N(one[power] - other[power], 20) == 0 for power in one)


def test_faces():
    found = EMBER.series("z", order=3, levels=3, t=1)
    latex = found._repr_latex_()
    assert latex.startswith("$")
    assert r"O\left(" in latex
    assert isinstance(found.levels[0].expression("eigenvalue"), sympy.Expr)


@pytest.mark.parametrize(
    ("parameter", "given_", "error", "message"),
    [
        ("q", {}, ParameterError, "'q' is no parameter"),
        ("z", {"order": 0}, ParameterError, "order = 0"),
        ("z", {"order": 1.5}, ParameterError, "order"),
        ("z", {"levels": 0}, ParameterError, "levels 0 given"),
        ("z", {"t": ("1", "2")}, ParameterError, "single exact numbers"),
        ("t", {"z": "0.3"}, ConvergenceError, "not diagonal"),
    ],
)
def test_bad_input(parameter, given_, error, message):
    with pytest.raises(error, match=message):
        EMBER.series(parameter, **given_)


def test_an_infinite_site_weight_is_refused():
    with pytest.raises((ConvergenceError, MissingValueError), match="infinitely many characters"):
        TINTED.series("h", t=1)
