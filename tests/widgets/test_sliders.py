"""Sliders: values, ranges, steps."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from haarloom.widgets.sliders import ValueSliders, step_of


@given(st.floats(-5, 5), st.floats(0.01, 100), st.floats(0, 1))
def test_step_is_round_and_divides_the_range_finely(low: float, width: float, share: float) -> None:
    low, width = round(low, 2), round(width, 2)
    value = round(low + share * width, 3)
    step = step_of(low, low + width, value)
    assert f"{step:e}"[0] in "125"
    assert set(f"{step:e}".split("e")[0][1:]) <= {".", "0"}
    assert width / step >= 120
    assert (value - low) / step == pytest.approx(round((value - low) / step), abs=1e-5)


def test_moving_a_slider_changes_the_values_and_the_other_way_round() -> None:
    sliders = ValueSliders({"t": 1.0, "z": 0.3}, {"t": (0.1, 3), "z": (0, 3)})
    sliders.children[1].value = 0.5
    assert sliders.values == {"t": 1.0, "z": 0.5}
    sliders.values = {"t": 2.0, "z": 0.5}
    assert sliders.children[0].value == 2.0


def test_a_value_outside_the_range_widens_it() -> None:
    sliders = ValueSliders({"z": 0.3}, {"z": (0, 1)})
    sliders.values = {"z": 4.0}
    assert (sliders.children[0].value, sliders.children[0].max) == (4.0, 4.0)


def test_other_parameters_replace_sliders_and_keep_those_that_stay() -> None:
    sliders = ValueSliders({"t": 1.0, "z": 0.3}, {"t": (0.1, 3), "z": (0, 3)})
    stays = sliders.children[1]
    sliders.rebuild({"beta": 6.0, "z": 0.3}, {"beta": (0, 12), "z": (0, 3)})
    assert [slider.description for slider in sliders.children] == ["β", "z"]
    assert sliders.children[1] is stays
    assert sliders.values == {"beta": 6.0, "z": 0.3}


def test_slow_drawing_makes_sliders_wait_for_release() -> None:
    sliders = ValueSliders({"z": 0.3}, {"z": (0, 1)})
    sliders.pace(1.0)
    assert not sliders.children[0].continuous_update
    sliders.pace(0.01)
    assert sliders.children[0].continuous_update
