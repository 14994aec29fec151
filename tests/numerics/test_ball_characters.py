"""Balls of character coefficients hold what Bessel functions, closed forms and quadrature give.

A tail that is too small is noticed.
"""

from __future__ import annotations

from fractions import Fraction

import flint
import mpmath
import numpy as np
import pytest
import sympy
from hypothesis import given, settings
from hypothesis import strategies as st
from mpmath import mp

import haarloom as hl
from haarloom.actions.character_factors import BosonFactor, ExponentialFactor, FiniteFactor
from haarloom.actions.potentials import logarithmic_potential, polynomial_potential
from haarloom.algebra.class_function import ClassFunction
from haarloom.exceptions import ConvergenceError, ParameterError
from haarloom.numerics.ball_characters import CharacterBalls, character_balls
from haarloom.numerics.balls import as_exact, coefficient_balls, precision
from haarloom.numerics.majorant import Majorant, factor_balls
from numerics import referees
from numerics.models import SU2, SU3

R = sympy.Rational


def balls_of(factors, group, reach, bits=160, **values) -> CharacterBalls:
    exact = {name: as_exact(name, value) for name, value in values.items()}
    with precision(bits):
        found = factor_balls(factors, lambda expressions: coefficient_balls(expressions, exact))
    return character_balls(found, Majorant(found, bits), group.rank, reach)


def holds(ball, number, slack="1e-45") -> bool:
    with precision(300):
        room, value = flint.arb(0, slack), mp.mpmathify(number)
        target = flint.acb(*(flint.arb(mp.nstr(part, 50)) + room for part in (value.real, value.imag)))
        return bool((flint.acb(ball) if isinstance(ball, flint.arb) else ball).overlaps(target))


def radius(ball) -> float:
    return float(ball.rad())


def labels(group, reach):
    return [irrep.labels for irrep in group.irreps(reach)]


@settings(max_examples=12)
@given(st.fractions(-3, 3, max_denominator=50))
def test_su2_field_is_a_difference_of_bessel_functions(h):
    """exp(2h cos θ) = Σ I_n(2h) e^{inθ} (DLMF 10.35.2), so that w_n = I_n(2h) − I_{n+2}(2h)."""
    mp.dps = 60
    field = hl.loop_field(SU2, {"2": h})
    found = balls_of(field.character_factors(), SU2, 12)
    x = 2 * mp.mpf(h.numerator) / h.denominator
    for n, ball in enumerate(found.coefficients):
        assert holds(ball, mpmath.besseli(n, x) - mpmath.besseli(n + 2, x))
        assert radius(ball) < 1e-36


@settings(max_examples=6)
@given(
    st.fractions(Fraction(-1, 2), Fraction(1, 2), max_denominator=20),
    st.fractions(Fraction(-1, 2), Fraction(1, 2), max_denominator=20),
    st.fractions(-1, 1, max_denominator=20),
)
def test_su3_products_of_field_bosons_and_fermion_are_toeplitz_determinants(h, y, z):
    """φ = exp(h(x + 1/x)) (1 + zx)/(1 − yx): Laurent coefficients Σ_k y^k (I_{l−k} + z I_{l−k−1})."""
    mp.dps = 60
    site = hl.static_fermions(SU3, z) * hl.loop_field(SU3, {"3": h, "3bar": h}) * hl.static_bosons(SU3, y)
    found = balls_of(site.character_factors(), SU3, 4)
    number = {name: mp.mpf(v.numerator) / v.denominator for name, v in (("h", h), ("y", y), ("z", z))}
    bessel = [mpmath.besseli(k, 2 * number["h"]) for k in range(42)] + [mp.mpf(0)]
    plain = {k: bessel[min(abs(k), 42)] + number["z"] * bessel[min(abs(k - 1), 42)] for k in range(-41, 44)}
    phi: dict[int, mpmath.mpf] = {}
    for order in range(-41, 120):
        phi[order] = plain.get(order, 0) + number["y"] * phi.get(order - 1, 0)
    for one, ball in zip(labels(SU3, 4), found.coefficients, strict=True):
        rows = referees.rows_of(one)
        total = sum(
            referees.determinant([[phi.get(rows[j] - j + i + m, 0) for j in range(3)] for i in range(3)])
            for m in range(-20, 60)
        )
        assert holds(ball, total, "1e-33")
        assert radius(ball) < 1e-25


def test_bosons_and_antibosons_of_su2_in_closed_form():
    """|1 − zx|^{−2} on SU(2) is Σ z^k χ_k; with antiparticles z̄ = z it is the square of that."""
    mp.dps = 50
    one = balls_of(hl.static_bosons(SU2, "9/10").character_factors(), SU2, 10)
    for k, ball in enumerate(one.coefficients):
        assert holds(ball, mp.mpf(9) ** k / mp.mpf(10) ** k, "1e-40")
        assert radius(ball) < 1e-30
    both = balls_of(hl.static_bosons(SU2, "1/2", "1/2").character_factors(), SU2, 8)
    # χ_a χ_b holds χ_c for |a − b| ≤ c ≤ a + b, a + b + c even
    for c, ball in enumerate(both.coefficients):
        expected = sum(mp.mpf(2) ** -(a + b) for a in range(200) for b in range(abs(a - c), a + c + 1, 2))
        assert holds(ball, expected, "1e-38")


def test_near_the_edge_bosons_are_slow_but_right_or_refused():
    mp.dps = 50
    near = balls_of(hl.static_bosons(SU2, "99/100").character_factors(), SU2, 3, bits=70)
    for k, ball in enumerate(near.coefficients):
        assert holds(ball, mp.mpf(99) ** k / mp.mpf(100) ** k, "1e-25")
        assert radius(ball) < 1e-8
    with pytest.raises(ConvergenceError, match="edge of their domain"):
        balls_of(hl.static_bosons(SU2, "9999/10000").character_factors(), SU2, 3)
    with pytest.raises(ParameterError, match=r"\|z\| < 1 throughout"):
        balls_of(hl.static_bosons(SU2, "z").character_factors(), SU2, 3, z=("0.9", "1.1"))


def test_capped_bases_give_wider_balls_that_still_hold(monkeypatch):
    exact = balls_of(hl.static_bosons(SU3, "4/5", "1/2").character_factors(), SU3, 2)
    monkeypatch.setattr("haarloom.numerics.ball_characters.MOST_IRREPS", 100)
    capped = balls_of(hl.static_bosons(SU3, "4/5", "1/2").character_factors(), SU3, 2)
    assert all(a.overlaps(b) for a, b in zip(exact.coefficients, capped.coefficients, strict=True))
    assert radius(capped.coefficients[0]) > 1e3 * radius(exact.coefficients[0])


@pytest.mark.parametrize(
    ("site", "density"),
    [
        (
            hl.loop_field(SU3, {"8": R(1, 5), "3": R(1, 10)}),
            lambda x: mp.exp((abs(sum(x)) ** 2 - 1) / 5 + sum(x) / 10),
        ),
        (
            hl.static_bosons(SU3, R(1, 10), irrep="8"),
            lambda x: 1 / mp.fprod((1 - a / b / 10) for a in x for b in x) * (1 - mp.mpf(1) / 10),
        ),
        (
            polynomial_potential(SU3, 1, R(3, 4), R(15, 2)),
            lambda x: mp.exp(
                (abs(sum(x) / 3) ** 2) / 2
                + mp.re((sum(x) / 3) ** 3) / 4
                - mp.mpf(15) / 8 * abs(sum(x) / 3) ** 4
            ),
        ),
        (
            logarithmic_potential(SU3, 2, -1),
            lambda x: (
                mp.exp(abs(sum(x) / 3) ** 2)
                * mp.fprod(abs(x[i] - x[j]) ** 2 for i, j in ((0, 1), (0, 2), (1, 2)))
                / 27
            ),
        ),
        (
            hl.site_from(SU3, "(1 + L/3)*exp((L + conj(L))/10)"),
            lambda x: (1 + sum(x) / 3) * mp.exp(mp.re(sum(x)) / 5),
        ),
    ],
    ids=["adjoint field", "adjoint bosons", "polynomial potential", "logarithmic potential", "written"],
)
def test_other_weights_against_quadrature_in_mpmath(site, density):
    mp.dps = 30
    found = balls_of(site.character_factors(), SU3, 2)
    expected = referees.coefficients_by_quadrature(labels(SU3, 2), density, 36)
    for ball, number in zip(found.coefficients, expected, strict=True):
        assert holds(ball, number, "1e-17")
        assert radius(ball) < 1e-30


def test_floats_agree_for_su4_and_copies():
    group = hl.SU(4)
    site = hl.static_bosons(group, R(1, 5), R(1, 10), copies=2) * hl.static_fermions(group, R(1, 3))
    found = balls_of(site.character_factors(), group, 3, bits=100)
    w, error = site.coefficients_at(group.irreps(3), {})
    for ball, number, slack in zip(found.coefficients, w, error, strict=True):
        assert abs(float(ball.mid()) - number) <= slack + 1e-15


def test_norm_and_tail_bound_sampled_values_and_far_coefficients():
    """sup |W| on random points, and Σ |w_c| d_c between two cutoffs by floats."""
    site = hl.static_fermions(SU3, R(3, 10)) * hl.loop_field(SU3, {"3": R(1, 5), "3bar": R(1, 10)})
    found = balls_of(site.character_factors(), SU3, 4)
    angles = np.random.default_rng(3).uniform(-np.pi, np.pi, (500, 2))
    assert np.abs(site.density_at(angles, {})).max() <= float(found.majorant.total)
    irreps = SU3.irreps(14)
    w, _ = site.coefficients_at(irreps, {})
    for order in (-1, 0, 2, 5, 9):
        part = sum(abs(x) * r.dimension for x, r in zip(w, irreps, strict=True) if sum(r.labels) > order)
        bound = float(found.beyond(order, [r.dimension for r in irreps]))
        assert part * (1 - 1e-9) <= bound <= (2 if order < found.reach else 1000) * part


def test_intervals_hold_every_point_and_are_narrow():
    found = balls_of(hl.loop_field(SU2, {"2": "h"}).character_factors(), SU2, 6, h=("0.50", "0.51"))
    mp.dps = 30
    for n, ball in enumerate(found.coefficients):
        ends = [
            mpmath.besseli(n, 2 * h) - mpmath.besseli(n + 2, 2 * h) for h in map(mp.mpf, ("0.50", "0.51"))
        ]
        inner = mpmath.besseli(n, mp.mpf("1.01")) - mpmath.besseli(n + 2, mp.mpf("1.01"))
        assert all(holds(ball, number, "1e-25") for number in (*ends, inner))
        assert 2 * radius(ball) < 1.5 * abs(ends[1] - ends[0]) + 1e-4


def test_a_tail_that_is_too_small_is_noticed(monkeypatch):
    """The same containment as above fails once the majorant forgets what lies beyond a few orders."""
    exact = [mpmath.besseli(n, 2) - mpmath.besseli(n + 2, 2) for n in range(4)]
    factors = hl.loop_field(SU2, {"2": 1}).character_factors()
    assert all(
        holds(b, e, "1e-12") for b, e in zip(balls_of(factors, SU2, 3).coefficients, exact, strict=True)
    )
    monkeypatch.setattr(Majorant, "order_below", lambda self, tolerance: 4)
    honest = balls_of(factors, SU2, 3)
    assert all(holds(b, e, "1e-12") for b, e in zip(honest.coefficients, exact, strict=True))
    assert radius(honest.coefficients[0]) > 1e-3
    monkeypatch.setattr(Majorant, "tail", lambda self, order: flint.arb(0))
    wrong = balls_of(factors, SU2, 3)
    assert not any(holds(b, e, "1e-12") for b, e in zip(wrong.coefficients, exact, strict=True))


def test_factors_multiply_out_in_any_order():
    one = [
        FiniteFactor(ClassFunction(SU3, {"1": 1, "3": R(1, 2)})),
        ExponentialFactor(ClassFunction(SU3, {"3bar": R(1, 5)})),
        BosonFactor(SU3.fundamental, R(1, 4), 1),
        BosonFactor(SU3.adjoint, R(1, 9), 1),
    ]
    other = [one[0], one[3], one[2], one[1]]
    first, second = (balls_of(factors, SU3, 5) for factors in (one, other))
    assert all(a.overlaps(b) for a, b in zip(first.coefficients, second.coefficients, strict=True))
    assert max(map(radius, first.coefficients)) < 1e-30
