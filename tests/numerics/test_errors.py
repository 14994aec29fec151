"""The stated error: honest, not absurd, and refused where nothing can be said."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import haarloom as hl
from haarloom.exceptions import ConvergenceError, MissingValueError, ParameterError, SizeError
from numerics import referees
from numerics.models import EMBER, EMBER_BOTH, SU2, SU3, TINTED

TOO_MUCH = 1e7
"""A stated truncation error this much above the true one says nothing any more."""


def nearest(value, others):
    return float(np.abs(np.asarray(others) - value).min())


def assert_honest(small, best):
    """Each level of the small basis lies within its error of one of the best."""
    for value, error in zip(small.eigenvalues, small.eigenvalue_error, strict=True):
        assert nearest(value, best.eigenvalues) <= error + best.eigenvalue_error.max()
    for mass, error in zip(small.masses, small.error, strict=True):
        assert nearest(mass, best.masses) <= error + best.error[np.isfinite(best.error)].max()


@pytest.mark.parametrize(
    ("model", "values", "cutoffs", "large"),
    [
        (EMBER, {"t": 0.5, "z": 0.4}, (4, 5, 6, 7), 16),
        (EMBER, {"t": 0.2, "z": 0.8}, (7, 9, 11), 22),
        (EMBER_BOTH, {"t": 0.6, "z": 0.4, "zbar": 0.2}, (4, 6, 8), 16),
        (TINTED, {"t": 0.8, "h": 0.3}, (5, 6), 12),
        (
            hl.RingModel(hl.heat_kernel(SU2, "t"), hl.static_fermions(SU2, "z")),
            {"t": 0.2, "z": 0.6},
            (5, 8),
            40,
        ),
        (
            hl.RingModel(hl.wilson(SU3, "beta"), hl.static_fermions(SU3, "z")),
            {"beta": 6.0, "z": 0.4},
            (4, 6),
            12,
        ),
    ],
    ids=["Ember-I", "Ember-I weak", "antiparticles", "loop field", "SU(2)", "Wilson"],
)
def test_a_small_basis_is_as_wrong_as_it_says(model, values, cutoffs, large):
    best = model.spectrum(levels=8, cutoff=large, **values)
    closed = 0
    for cutoff in cutoffs:
        small = model.spectrum(levels=4, cutoff=cutoff, **values)
        assert_honest(small, best)
        for mass, error in zip(small.masses, small.error, strict=True):
            true = nearest(mass, best.masses)
            if np.isfinite(error):
                closed += 1
                assert error <= TOO_MUCH * max(true, 1e-15)
    assert closed, "no bound closed on any of these bases: the test would say nothing"


@settings(max_examples=20)
@given(t=st.floats(0.3, 2.0), z=st.floats(0.0, 1.5), zbar=st.floats(0.0, 0.5), cutoff=st.integers(3, 7))
def test_errors_are_honest_everywhere(t, z, zbar, cutoff):
    small = EMBER_BOTH.spectrum(levels=4, cutoff=cutoff, t=t, z=z, zbar=zbar)
    best = EMBER_BOTH.spectrum(levels=9, cutoff=14, t=t, z=z, zbar=zbar)
    for value, error in zip(small.eigenvalues, small.eigenvalue_error, strict=True):
        assert nearest(value, best.eigenvalues) <= error + 1e-13


def test_the_automatic_cutoff_holds_its_promise():
    chosen = EMBER.spectrum(levels=6, t=0.4, z=0.6)
    best = EMBER.spectrum(levels=6, cutoff=chosen.cutoff + 8, t=0.4, z=0.6)
    assert (chosen.error < 1e-9).all()
    assert referees.distance(chosen.masses, best.masses) < 2e-11
    assert "chosen so that truncation shifts masses by less than" in chosen.status


def test_a_cutoff_of_the_users_gets_its_error_said():
    closed = EMBER.spectrum(levels=2, cutoff=6, t=1, z=0.3)
    assert "as given" in closed.status
    open_ = EMBER.spectrum(levels=6, cutoff=3, t=0.05, z=0.3)
    assert np.isinf(open_.error).any()
    assert "does not close" in open_.status
    assert "leave cutoff out" in open_.status
    assert "undecided" in open_.verdicts


def test_an_open_bound_comes_back_as_infinite_not_as_small():
    """At t = 0 the link coefficients do not fall: no basis is large enough."""
    with pytest.raises(ConvergenceError, match="bound does not close"):
        EMBER.spectrum(t=0, z=0.3)
    fixed = EMBER.spectrum(levels=3, cutoff=4, t=0, z=0.3)
    assert np.isinf(fixed.error).all()


def test_perron_frobenius_is_claimed_only_where_its_premises_hold():
    positive = EMBER.spectrum(levels=3, t=1, z=0.3)
    assert "real, positive and simple: all elements" in positive.status
    assert positive.eigenvalues[0].imag == 0
    assert positive.eigenvalues[0].real > abs(positive.eigenvalues[1])
    for value in (-0.3, 0.3j):
        assert "Perron and Frobenius do not apply" in EMBER.spectrum(levels=3, t=1, z=value).status
    # without matter the pattern is diagonal: every irrep is a part by itself
    assert "falls into" in EMBER.spectrum(levels=3, t=1, z=0).status


def test_vanishing_levels_have_infinite_mass_and_say_so():
    """The loop coupling knows three irreps only: T has rank 3."""
    model = hl.RingModel(hl.loop_coupling(SU3, "lam"), hl.static_fermions(SU3, "z"))
    spectrum = model.spectrum(levels=5, lam=0.2, z=0.3)
    assert np.isfinite(spectrum.error[:2]).all()
    assert np.isinf(spectrum.masses[2:].real).all()
    assert "has rank 3" in spectrum.status


@pytest.mark.parametrize(
    ("given_", "error", "message"),
    [
        ({"t": 1}, MissingValueError, "no value for z"),
        ({"t": 1, "z": np.inf}, ParameterError, "not finite"),
        ({"t": 1, "z": np.nan}, ParameterError, "not finite"),
        ({"t": -1, "z": 0.3}, ParameterError, "must be a real number ≥ 0"),
        ({"t": 1, "z": "a"}, ParameterError, "is no number"),
        ({"t": 1, "z": [0.1, 0.2]}, ParameterError, "several numbers"),
        ({"t": 1, "z": 0.3, "q": 1}, ParameterError, "'q' is no parameter"),
        ({"t": 1, "z": 0.3, "levels": 0}, ParameterError, "levels 0 given"),
        ({"t": 1, "z": 0.3, "levels": 2.5}, ParameterError, r"levels 2\.5"),
        ({"t": 1, "z": 0.3, "levels": True}, ParameterError, "levels True"),
        (
            {"t": 1, "z": 0.3, "levels": 11, "cutoff": 3},
            ParameterError,
            "11 levels are more than the 10 irreps",
        ),
        ({"t": 1, "z": 0.3, "cutoff": -1}, ParameterError, "must be an integer ≥ 0"),
        ({"t": 1, "z": 0.3, "cutoff": 1.5}, ParameterError, "must be an integer ≥ 0"),
        ({"t": 1, "z": 0.3, "cutoff": 10**6}, SizeError, "GB for 500,001,500,001 irreps"),
    ],
)
def test_bad_input_is_refused_with_a_remedy(given_, error, message):
    with pytest.raises(error, match=message):
        EMBER.spectrum(**given_)


def test_more_levels_than_memory_holds_are_refused_by_size():
    with pytest.raises(SizeError, match="GB"):
        EMBER.spectrum(levels=100_000, t=1, z=0.3)


def test_the_face_of_a_spectrum_holds_what_it_knows():
    spectrum = EMBER.spectrum(levels=3, t=1, z=0.3)
    text, html = repr(spectrum), spectrum._repr_html_()
    assert "complex pair" in text
    assert "dense, cutoff" in text
    assert "1.386" in html
    assert "<script" not in html
