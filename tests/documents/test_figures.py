"""Shown digits are honest: the interval on paper contains the interval computed."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from haarloom.documents.figures import bracketed, shown_with_error

VALUES = st.floats(-1e6, 1e6)
ERRORS = st.floats(1e-18, 1e3)


@given(VALUES, ERRORS)
def test_shown_interval_contains_the_computed_one(value: float, error: float) -> None:
    shown, margin = map(Fraction, shown_with_error(value, error))
    assert shown - margin <= Fraction(value) - Fraction(error)
    assert shown + margin >= Fraction(value) + Fraction(error)


@given(VALUES, ERRORS)
def test_error_has_one_digit_and_is_not_inflated(value: float, error: float) -> None:
    margin = shown_with_error(value, error)[1]
    assert len(margin.replace(".", "").strip("0")) == 1
    assert Fraction(margin) <= 3 * Fraction(error)


@pytest.mark.parametrize(
    ("value", "error", "text"),
    [
        (4 / 3, 2.2e-7, "1.3333333(3)"),
        (0.98, 0.0096, "0.98(1)"),
        (-123.4, 30.0, "-120(40)"),
        (-1e-9, 1e-3, "0.000(2)"),
        (0.25, 0.0, "0.25"),
        (1e-20, 1.5e-25, "0.0000000000000000000100000(2)"),
        (1.0, float("inf"), "?"),
        (float("nan"), 1e-3, "?"),
        (1.0, float("nan"), "?"),
        (1.0, -1.0, "?"),
    ],
)
def test_short_form(value: float, error: float, text: str) -> None:
    assert bracketed(value, error) == text
