"""Proven stretches of a line: no undecided one around a merger is longer than was asked for."""

from __future__ import annotations

import re
from fractions import Fraction
from itertools import pairwise

import pytest

from haarloom.exceptions import ParameterError
from haarloom.numerics.certify import UNDECIDED
from haarloom.numerics.stretches import certified_stretches
from haarloom.numerics.verdicts import PAIR, REAL
from numerics.models import EMBER

MERGER = Fraction("0.410100451151161811432775774862")
"""Where the two lowest levels of Ember-I merge at t = 1; a published test has it from mpmath."""


def assert_covers(stretches, lower, upper):
    assert stretches[0].interval.lower == Fraction(lower)
    assert stretches[-1].interval.upper == Fraction(upper)
    for one, other in pairwise(stretches):
        assert one.interval.upper == other.interval.lower
        assert one.verdict != other.verdict


@pytest.mark.parametrize("finest", ["1/20", "0.02", "1/200", "1/3000"])
@pytest.mark.parametrize("ends", [("0.3", "0.5"), ("0.13", "0.53")])
def test_what_stays_undecided_is_no_longer_than_the_finest(ends, finest):
    stretches = certified_stretches(EMBER, "z", *ends, finest=finest, t=1)
    assert_covers(stretches, *ends)
    assert [stretch.verdict for stretch in stretches] == ["complex pair", UNDECIDED, "real"]
    assert stretches[1].interval.width <= Fraction(finest)
    assert stretches[1].interval.lower < MERGER < stretches[1].interval.upper


@pytest.mark.parametrize("finest", ["0.05", "1.5"])
def test_both_mergers_of_particles_and_holes(finest):
    """With 1.5 both lie in one undecided stretch at first, and a decided piece is found between them."""
    stretches = certified_stretches(EMBER, "z", "0.3", "3", finest=finest, t=1)
    assert_covers(stretches, "0.3", "3")
    undecided = [stretch for stretch in stretches if stretch.verdict == UNDECIDED]
    assert stretches[stretches.index(undecided[0]) + 1].verdict == "real"
    assert stretches[-1].verdict == "complex pair"
    for stretch, merger in zip(undecided, (MERGER, 1 / MERGER), strict=True):
        assert stretch.interval.width <= Fraction(finest)
        assert stretch.interval.lower < merger < stretch.interval.upper


def test_two_mergers_too_close_to_be_told_apart_stay_one_undecided_stretch():
    """Just below the fold of the boundary at z = 0.41184915, t = 0.894: complex for some t about it."""
    stretches = certified_stretches(EMBER, "t", "0.8", "1.0", finest="0.1", z="0.411849")
    assert_covers(stretches, "0.8", "1")
    assert [s.verdict for s in stretches] == ["real", UNDECIDED, "real"]


@pytest.mark.parametrize("finest", [0, "-0.1", "x", float("nan"), ("0.1", "0.2")])
def test_a_finest_length_is_positive(finest):
    with pytest.raises(ParameterError, match="finest = "):
        certified_stretches(EMBER, "z", "0.3", "0.5", finest=finest, t=1)


def test_an_empty_line_is_refused():
    with pytest.raises(ParameterError, match="is empty"):
        certified_stretches(EMBER, "z", "0.5", "0.3", t=1)


def test_stretches_are_drawn_and_named_in_a_notebook():
    stretches = EMBER.certified_stretches("z", "0.3", "0.5", finest="0.05", t=1)
    assert [stretch.verdict for stretch in stretches] == [PAIR, UNDECIDED, REAL]
    assert stretches[0].interval.lower == Fraction(3, 10)
    assert len(stretches[1:]) == 2
    text, face = str(stretches), stretches._repr_html_()
    assert text.startswith("Proven of m_1 along z at t = 1:")
    # one band for each stretch, one field of the legend for each verdict, and the frame
    assert face.count("<rect") == 3 + 3 + 1
    widths = [float(width) for width in re.findall(r'width="([0-9.]+)" height="28"', face)]
    lengths = [float(stretch.interval.width) for stretch in stretches]
    assert widths[:3] == pytest.approx([widths[3] * length / 0.2 for length in lengths], abs=0.02)
    assert all(stretch.verdict in face for stretch in stretches)
