"""Proof: enclosures hold what mpmath finds at 50 digits on larger bases, verdicts hold on whole intervals."""

from __future__ import annotations

from fractions import Fraction
from itertools import pairwise

import flint
import mpmath
import numpy as np
import pytest
from mpmath import mp

import haarloom as hl
from haarloom.exceptions import ConvergenceError, MissingValueError, ParameterError
from haarloom.numerics.balls import Interval, precision
from haarloom.numerics.certify import UNDECIDED
from haarloom.numerics.stretches import certified_stretches
from numerics import referees
from numerics.models import EMBER, EMBER_BOTH, SU3


def text(number: mpmath.mpf) -> str:
    return mp.nstr(number, 45)


def contains(ball, number: mpmath.mpc, slack: str = "1e-40") -> bool:
    with precision(300):
        room = flint.arb(0, slack)
        target = flint.acb(flint.arb(text(number.real)) + room, flint.arb(text(number.imag)) + room)
        return bool(ball.overlaps(target))


def mpmath_masses(n, cutoff, link, z, zbar=0, copies=1, count=7):
    mp.dps = 50
    site = referees.fermions(n, cutoff, mp.mpf(z), mp.mpf(zbar), copies)
    return referees.masses(referees.levels(referees.transfer(link, site), count))


@pytest.mark.parametrize("z", ["0.3", "0.8"], ids=["in the complex region", "in the real region"])
def test_twenty_digits_of_six_masses_of_ember(z):
    """t = 1; mpmath on Σ a_i ≤ 8 by Pieri's rule is right to more than 28 digits."""
    certificate = EMBER.certify(digits=20, levels=7, t=1, z=z)
    assert certificate.digits >= 20
    assert certificate.leading
    mp.dps = 50
    expected = mpmath_masses(3, 8, referees.heat(3, 8, 1), z)
    # of a pair across the seventh level either member may be listed
    expected += [mp.conj(mass) for mass in expected]
    for ball in certificate.masses:
        assert any(contains(ball, mass, "1e-28") for mass in expected)
        assert float(ball.rad()) < 1e-20
    for mass in expected:
        both = [*certificate.masses, *(ball.conjugate() for ball in certificate.masses)]
        assert any(contains(ball, mass, "1e-28") for ball in both)


def test_the_statement_which_of_them_are_complex():
    certificate = EMBER.certify(digits=20, levels=7, t=1, z="0.3")
    assert certificate.verdicts == ("complex pair", "complex pair", "real", *["complex pair"] * 3)
    for ball, verdict in zip(certificate.masses, certificate.verdicts, strict=True):
        assert (0 in ball.imag) == (verdict == "real")
    statement = certificate.statement()
    assert "Proven for the untruncated T" in statement
    assert "complex pair (T is real and the disc does not meet the real axis)" in statement
    assert "<" in certificate._repr_html_()


def test_antiparticles_and_wilson_links_are_certified_too():
    mp.dps = 50
    both = EMBER_BOTH.certify(digits=15, levels=4, t=1, z="0.3", zbar="0.2")
    expected = mpmath_masses(3, 7, referees.heat(3, 7, 1), "0.3", "0.2", count=4)
    assert all(any(contains(ball, mass, "1e-18") for ball in both.masses) for mass in expected)
    model = hl.RingModel(hl.wilson(SU3, "beta"), hl.static_fermions(SU3, "z"))
    wilson = model.certify(digits=12, levels=4, beta=6, z="0.3")
    expected = mpmath_masses(3, 7, referees.wilson(3, 7, 6), "0.3", count=4)
    assert wilson.digits >= 12
    assert all(any(contains(ball, mass, "1e-14") for ball in wilson.masses) for mass in expected)


def test_a_float_is_the_decimal_that_python_prints():
    decimal, fraction, number = (
        EMBER.certify(digits=10, levels=3, t=1, z=z) for z in ("0.3", Fraction(3, 10), 0.3)
    )
    assert decimal.values["z"] == fraction.values["z"] == number.values["z"] == Fraction(3, 10)
    assert decimal.masses[0].real.overlaps(number.masses[0].real)


def test_a_spectrum_hands_over_to_its_proof():
    spectrum = EMBER.spectrum(levels=3, t=1, z=0.3)
    certificate = spectrum.certify(digits=12)
    assert len(certificate.masses) == 2
    for ball, mass, error in zip(certificate.masses, spectrum.masses, spectrum.error, strict=True):
        assert abs(complex(float(ball.real.mid()), float(ball.imag.mid())) - mass) <= error
    assert certificate.verdicts == spectrum.verdicts


@pytest.mark.parametrize("given_", [("0.30", "0.31"), Interval("0.30", "0.31")], ids=["pair", "Interval"])
def test_for_all_z_between_030_and_031_the_lowest_pair_is_complex(given_):
    certificate = EMBER.certify(digits=5, levels=3, t=1, z=given_)
    assert certificate.verdicts == ("complex pair", "complex pair")
    assert certificate.leading
    for z in (0.30, 0.3037, 0.31):
        for mass in EMBER.spectrum(levels=3, t=1, z=z).masses:
            with precision(100):
                point = flint.acb(float(mass.real), float(mass.imag))
                assert any(ball.overlaps(point) for ball in certificate.masses)


def test_an_interval_across_a_merger_stays_undecided():
    certificate = EMBER.certify(digits=5, levels=3, t=1, z=("0.40", "0.42"))
    assert certificate.verdicts == (UNDECIDED, UNDECIDED)
    assert all(level.reason for level in certificate.levels)


def test_next_to_a_merger_low_precision_does_not_decide_and_high_precision_does():
    """z − z* ≈ 1.5·10⁻¹⁸ (z* = 0.410100451151161811432…): √ of it parts the levels by about 10⁻¹⁰."""
    from haarloom.numerics.certify import attempt

    z = Fraction("0.410100451151161811432775774862")
    values = {"t": Fraction(1), "z": z}
    low = attempt(EMBER, values, 3, 6, 53)
    assert UNDECIDED in low.verdicts
    assert "undecided at this precision" in low.statement()
    high = attempt(EMBER, values, 3, 10, 300)
    assert high.verdicts == ("complex pair", "complex pair")


def test_limits_are_kept_and_what_is_known_comes_back():
    certificate = EMBER.certify(digits=100, levels=3, t=1, z="0.3", irrep_limit=30)
    assert 0 < certificate.digits < 100
    assert len(EMBER.group.irreps(certificate.cutoff)) <= 30
    assert certificate.verdicts == ("complex pair", "complex pair")


@pytest.mark.parametrize("z", [Fraction(1, 7), "0.55", 1])
def test_enclosures_at_two_precisions_overlap(z):
    coarse = EMBER.certify(digits=6, levels=4, t="0.8", z=z)
    fine = EMBER.certify(digits=25, levels=4, t="0.8", z=z)
    for ball in fine.masses:
        assert any(ball.overlaps(other) for other in coarse.masses)
    assert fine.digits >= 25


def test_hermitian_points_are_proven_real():
    certificate = EMBER.certify(digits=10, levels=4, t=1, z=1)
    assert certificate.verdicts == ("real",) * 3
    assert "Hermitian" in certificate.levels[1].reason


def test_complex_fugacities_are_enclosed():
    certificate = EMBER.certify(digits=10, levels=3, t=1, z=0.3j)
    assert set(certificate.verdicts) == {"complex"}
    spectrum = EMBER.spectrum(levels=3, t=1, z=0.3j)
    for ball, mass in zip(certificate.masses, spectrum.masses, strict=True):
        assert abs(complex(float(ball.real.mid()), float(ball.imag.mid())) - mass) < 1e-9


def test_stretches_cover_the_line_and_change_at_the_merger():
    stretches = certified_stretches(EMBER, "z", "0.3", "0.5", finest=Fraction(1, 200), t=1)
    assert stretches[0].interval.lower == Fraction(3, 10)
    assert stretches[-1].interval.upper == Fraction(1, 2)
    for one, other in pairwise(stretches):
        assert one.interval.upper == other.interval.lower
    assert [stretch.verdict for stretch in stretches] == ["complex pair", UNDECIDED, "real"]
    merger = Fraction("0.410100451151161811432775774862")
    assert stretches[1].interval.lower < merger < stretches[1].interval.upper
    assert stretches[1].interval.width <= Fraction(1, 200)


def test_refused_without_a_proven_tail():
    from haarloom.actions.potentials import logarithmic_potential

    creased = hl.RingModel(hl.heat_kernel(SU3, "t"), logarithmic_potential(SU3, 1, "b"))
    with pytest.raises(ConvergenceError, match=r"no proven bound exists .* logarithmic potential.*creased"):
        creased.certify(levels=3, t=1, b="-1.75")
    sampled = hl.RingModel(hl.heat_kernel(SU3, "t"), hl.site_from(SU3, "1/(4 - L)"))
    with pytest.raises(
        ConvergenceError, match=r"no proven bound .*written site.*spectrum\(\.\.\.\) gives masses"
    ):
        sampled.certify(levels=3, t=1)
    with pytest.raises(ConvergenceError, match=r"no proven bound of .* .Manton"):
        hl.RingModel(hl.manton(SU3, "beta"), hl.static_fermions(SU3, "z")).certify(levels=3, beta=5, z="0.3")
    with pytest.raises(ConvergenceError, match=r"bound does not close|single rational"):
        EMBER.certify(levels=3, t=0, z="0.3")


@pytest.mark.parametrize(
    ("given_", "error", "message"),
    [
        ({"digits": 0, "t": 1, "z": "0.3"}, ParameterError, "digits = 0"),
        ({"digits": 1000, "t": 1, "z": "0.3"}, ParameterError, "from 1 to 200"),
        ({"digits": 2.5, "t": 1, "z": "0.3"}, ParameterError, "whole number"),
        ({"levels": 0, "t": 1, "z": "0.3"}, ParameterError, "levels"),
        ({"t": 1, "z": "three"}, ParameterError, "no exact number"),
        ({"t": 1, "z": np.nan}, ParameterError, "no exact number"),
        ({"t": 1, "z": ("0.4", "0.3")}, ParameterError, "is empty"),
        ({"t": 1, "z": ("0.1", "0.2", "0.3")}, ParameterError, "no interval"),
        ({"t": 1}, MissingValueError, "no value for z"),
        ({"t": -1, "z": "0.3"}, ParameterError, "t = -1"),
    ],
)
def test_bad_input(given_, error, message):
    with pytest.raises(error, match=message):
        EMBER.certify(**given_)
