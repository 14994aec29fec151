"""Proofs for site weights with infinitely many characters, against mpmath at 50 digits on larger bases."""

from __future__ import annotations

from fractions import Fraction

import flint
import mpmath
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from mpmath import mp

import haarloom as hl
from haarloom.exceptions import ParameterError
from haarloom.numerics import ball_truncation
from haarloom.numerics.balls import Interval, precision
from haarloom.numerics.certify import attempt
from numerics import referees
from numerics.models import SU2, SU3, TINTED

HEAT = hl.heat_kernel(SU3, "t")
FIELD = hl.RingModel(HEAT, hl.loop_field(SU3, {"3": "h", "3bar": "h"}))
BOSONS = hl.RingModel(HEAT, hl.static_bosons(SU3, "z", "zbar"))
MIXED_MATTER = hl.RingModel(
    HEAT,
    hl.static_fermions(SU3, "z") * hl.loop_field(SU3, {"3": "h", "3bar": "h"}) * hl.static_bosons(SU3, "y"),
)


def contains(ball, number, slack="1e-24") -> bool:
    with precision(300):
        room = flint.arb(0, slack)
        target = flint.acb(*(flint.arb(mp.nstr(part, 45)) + room for part in (number.real, number.imag)))
        return bool(ball.overlaps(target))


def covers(certificate, expected, slack="1e-24") -> bool:
    """Every level of the referee in a ball; a conjugate may stand for its partner at the end of the list."""
    balls = [*certificate.masses, *(ball.conjugate() for ball in certificate.masses)]
    return all(any(contains(ball, mass, slack) for ball in balls) for mass in expected)


def field_phi(h):
    """exp(h(x + 1/x)) = Σ I_l(2h) x^l (DLMF 10.35.2)."""
    return lambda order: mpmath.besseli(abs(order), 2 * mp.mpf(h))


def boson_phi(z, zbar):
    """Laurent coefficients of 1/((1 − zx)(1 − z̄/x))."""
    z, zbar = mp.mpf(z), mp.mpf(zbar)
    return lambda order: (z**order if order >= 0 else zbar**-order) / (1 - z * zbar)


def referee_masses(n, cutoff, t, phi, shifts, count):
    site = referees.multiplicative(n, cutoff, phi, shifts)
    return referees.masses(referees.levels(referees.transfer(referees.heat(n, cutoff, t), site), count))


def test_loop_field_of_su2_at_twenty_digits():
    """⟨r|W|s⟩ = Σ_c (I_c − I_{c+2})(2h) over |r − s| ≤ c ≤ r + s (DLMF 10.32.3 and angular momenta)."""
    mp.dps = 50
    certificate = hl.RingModel(hl.heat_kernel(SU2, "t"), hl.loop_field(SU2, {"2": "h"})).certify(
        digits=20, levels=5, t=1, h="0.7"
    )
    assert certificate.digits >= 20
    assert certificate.leading
    w = [mpmath.besseli(c, mp.mpf("1.4")) - mpmath.besseli(c + 2, mp.mpf("1.4")) for c in range(70)]
    size = 26
    site = {
        (r, s): sum(w[c] for c in range(abs(r - s), r + s + 1, 2)) for r in range(size) for s in range(size)
    }
    expected = referees.masses(referees.levels(referees.transfer(referees.heat(2, size - 1, 1), site), 5))
    assert covers(certificate, expected, "1e-30")
    assert certificate.verdicts == ("real",) * 4
    assert all(float(ball.rad()) < 1e-20 for ball in certificate.masses)


def test_loop_field_of_su3_at_twenty_digits():
    mp.dps = 50
    certificate = FIELD.certify(digits=20, levels=5, t=1, h="0.2")
    assert certificate.digits >= 20
    assert certificate.leading
    assert "Hermitian" in certificate.levels[1].reason
    assert covers(certificate, referee_masses(3, 8, 1, field_phi("0.2"), 24, 5))


@pytest.mark.parametrize(("n", "cutoff", "slack"), [(2, 20, "1e-28"), (3, 6, "1e-12")])
def test_bosons_with_antibosons_at_twenty_digits(n, cutoff, slack):
    """The slack is what the referee's own basis leaves out."""
    mp.dps = 50
    group = hl.SU(n)
    model = hl.RingModel(hl.heat_kernel(group, "t"), hl.static_bosons(group, "z", "zbar"))
    certificate = model.certify(digits=20, levels=5, t=1, z="0.3", zbar="0.1")
    assert certificate.digits >= 20
    assert certificate.leading
    expected = referee_masses(n, cutoff, 1, boson_phi("0.3", "0.1"), 44, 5)
    assert covers(certificate, expected, slack)
    for ball, verdict in zip(certificate.masses, certificate.verdicts, strict=True):
        assert (0 in ball.imag) == (verdict == "real")


def test_bosons_alone_make_complex_pairs_and_equal_fugacities_make_none():
    alone = hl.RingModel(HEAT, hl.static_bosons(SU3, "z")).certify(digits=8, levels=3, t=1, z="0.3")
    assert alone.verdicts == ("complex pair", "complex pair")
    equal = BOSONS.certify(digits=8, levels=3, t=1, z="0.2", zbar="0.2")
    assert equal.verdicts == ("real", "real")
    assert "Hermitian" in equal.levels[1].reason
    imaginary = BOSONS.certify(digits=8, levels=3, t=1, z=0.2 + 0.1j, zbar=0.2 - 0.1j)
    assert imaginary.verdicts == ("real", "real")
    twisted = BOSONS.certify(digits=8, levels=3, t=1, z=0.2 + 0.1j, zbar="0.1")
    assert set(twisted.verdicts) == {"complex"}


def test_complex_fields_and_imaginary_exponents():
    """exp[ih(L + L*)] is no positive weight: T is complex, and no partner of a level needs to exist."""
    certificate = FIELD.certify(digits=8, levels=3, t=1, h=0.2j)
    assert not {"real", "complex pair"} & set(certificate.verdicts)
    assert inside(certificate, FIELD.spectrum(levels=3, t=1, h=0.2j))
    hermitian = hl.RingModel(HEAT, hl.loop_field(SU3, {"3": "h", "3bar": "g"}))
    twisted = hermitian.certify(digits=8, levels=3, t=1, h=0.2 + 0.1j, g=0.2 - 0.1j)
    assert twisted.verdicts == ("real", "real")
    assert "Hermitian" in twisted.levels[1].reason


def test_fermions_times_field_times_bosons():
    """φ = (1 + zx) exp(h(x + 1/x))/(1 − yx), one Laurent series."""
    mp.dps = 50
    certificate = MIXED_MATTER.certify(digits=12, levels=4, t=1, z="0.3", h="0.1", y="0.2")
    assert certificate.digits >= 12
    bessel = [mpmath.besseli(k, mp.mpf("0.2")) for k in range(60)] + [mp.mpf(0)]

    def plain(k):
        return bessel[min(abs(k), 60)] + mp.mpf("0.3") * bessel[min(abs(k - 1), 60)]

    phi: dict[int, mpmath.mpf] = {}
    for order in range(-60, 200):
        phi[order] = plain(order) + mp.mpf("0.2") * phi.get(order - 1, 0)
    expected = referee_masses(3, 6, 1, lambda order: phi.get(order, mp.mpf(0)), 30, 4)
    assert covers(certificate, expected, "1e-11")


def test_adjoint_bosons_and_fields_agree_with_floats_and_with_themselves():
    model = hl.RingModel(
        HEAT,
        hl.static_fermions(SU3, "z") * hl.static_bosons(SU3, "y", irrep="8") * hl.loop_field(SU3, {"8": "h"}),
    )
    values = {"t": 1, "z": "0.3", "y": "0.05", "h": "0.1"}
    coarse, fine = (model.certify(digits=digits, levels=4, **values) for digits in (6, 12))
    assert fine.digits >= 12
    for ball in fine.masses:
        assert any(ball.overlaps(other) for other in coarse.masses)
    spectrum = model.spectrum(levels=4, t=1, z=0.3, y=0.05, h=0.1)
    assert inside(fine, spectrum)


def inside(certificate, spectrum) -> bool:
    """Each mass in floats lies in a ball widened by its own stated error."""
    balls = [*certificate.masses, *(ball.conjugate() for ball in certificate.masses)]
    return all(
        any(contains(ball, mp.mpc(complex(mass)), repr(float(error))) for ball in balls)
        for mass, error in zip(spectrum.masses, spectrum.error, strict=True)
    )


@settings(max_examples=4)
@given(
    st.fractions(Fraction(1, 2), Fraction(3, 2), max_denominator=12),
    st.fractions(Fraction(-3, 10), Fraction(3, 10), max_denominator=30),
    st.fractions(Fraction(0), Fraction(3, 10), max_denominator=30),
    st.fractions(Fraction(0), Fraction(1), max_denominator=30),
)
def test_floats_lie_in_the_enclosures_at_random_rationals(t, h, y, z):
    values = {"t": t, "h": h, "y": y, "z": z}
    certificate = MIXED_MATTER.certify(digits=5, levels=4, **values)
    if all(level.eigenvalue is not None for level in certificate.levels):
        assert inside(
            certificate, MIXED_MATTER.spectrum(levels=4, **{k: float(v) for k, v in values.items()})
        )


@pytest.mark.parametrize(
    ("model", "values", "name", "inner"),
    [
        (TINTED, {"t": 1, "h": ("0.200", "0.201")}, "h", (0.2, 0.2007, 0.201)),
        (BOSONS, {"t": 1, "z": ("0.300", "0.301"), "zbar": 0}, "z", (0.3, 0.3002, 0.301)),
    ],
    ids=["field", "bosons"],
)
def test_a_verdict_for_a_whole_interval(model, values, name, inner):
    certificate = model.certify(digits=3, levels=3, **values)
    assert certificate.verdicts == ("complex pair", "complex pair")
    assert certificate.leading
    for number in inner:
        spectrum = model.spectrum(levels=3, **{**values, name: number})
        assert inside(certificate, spectrum)


def test_links_from_exact_factors_of_the_plaquette():
    """exp[(β/2N)(χ_F + χ_F̄)] written out is the Wilson action; stacked strips multiply."""
    written = hl.RingModel(
        hl.link_from_plaquette(SU3, "exp(beta*(L + conj(L))/6)"), hl.static_fermions(SU3, "z")
    )
    mixed = hl.RingModel(hl.mixed_wilson(SU3, {"3": "beta"}), hl.static_fermions(SU3, "z"))
    closed = hl.RingModel(hl.wilson(SU3, "beta"), hl.static_fermions(SU3, "z"))
    values = {"beta": 4, "z": "0.3", "digits": 10, "levels": 3}
    reference = closed.certify(**values)
    for model in (written, mixed):
        certificate = model.certify(**values)
        assert certificate.verdicts == reference.verdicts
        assert certificate.digits >= 10
        for ball in certificate.masses:
            assert any(ball.overlaps(other) for other in reference.masses)
    strips = hl.RingModel(
        hl.heat_kernel(SU3, Fraction(1, 2)) @ hl.heat_kernel(SU3, "t"), hl.static_fermions(SU3, "z")
    ).certify(t=Fraction(1, 2), z="0.3", digits=10, levels=3)
    whole = hl.RingModel(HEAT, hl.static_fermions(SU3, "z")).certify(t=1, z="0.3", digits=10, levels=3)
    assert all(any(a.overlaps(b) for b in whole.masses) for a in strips.masses)


def test_a_wilson_coupling_may_be_an_interval():
    model = hl.RingModel(hl.wilson(SU3, "beta"), hl.static_fermions(SU3, "z"))
    certificate = model.certify(digits=3, levels=3, beta=("6", "6.0001"), z="0.3")
    assert certificate.verdicts == ("complex pair", "complex pair")
    assert inside(certificate, model.spectrum(levels=3, beta=6.00005, z=0.3))


def test_a_link_parameter_may_enter_without_being_monotone():
    """t = (x − 1)² + 1/2 is least inside the interval: the tail must be taken there."""
    model = hl.RingModel(hl.heat_kernel(SU3, "(x - 1)^2 + 1/2"), hl.static_fermions(SU3, "z"))
    certificate = model.certify(digits=2, levels=3, x=("0.98", "1.02"), z="0.8")
    for x in (0.98, 1.0, 1.02):
        assert inside(certificate, model.spectrum(levels=3, x=x, z=0.8))


def test_an_interval_that_reaches_the_edge_is_refused():
    with pytest.raises(ParameterError, match=r"\|z\| < 1 throughout"):
        attempt(BOSONS, {"t": Fraction(1), "z": Interval("0.9", "1.1"), "zbar": Fraction(0)}, 3, 4, 64)


def test_a_tail_that_is_too_small_is_noticed(monkeypatch):
    """At cutoff 1 the enclosures are wide and hold; without the parts for what was cut off they miss."""
    mp.dps = 50
    values = {"t": Fraction(1), "h": Fraction(1, 5)}
    expected = referee_masses(3, 6, 1, field_phi("0.2"), 24, 2)
    honest = attempt(FIELD, values, 2, 2, 128)
    assert honest.levels[1].mass is not None
    assert covers(honest, expected)
    monkeypatch.setattr(ball_truncation._Blocks, "couple_far", lambda self, strength: None)
    monkeypatch.setattr(ball_truncation, "_outer", lambda link, majorant, cutoff, farthest: cutoff)
    wrong = attempt(FIELD, values, 2, 2, 128)
    assert wrong.levels[1].mass is not None
    assert not covers(wrong, expected)
