"""Ticks and ranges of the charts."""

from __future__ import annotations

from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st

from haarloom.widgets.charts import padded, round_ticks


@given(st.floats(-1e3, 1e3), st.floats(1e-6, 1e3))
def test_ticks_lie_inside_and_are_evenly_spaced(low: float, width: float) -> None:
    ticks = round_ticks(low, low + width)
    assert 1 <= len(ticks) <= 7
    slack = 1e-8 * max(1.0, abs(low), width)
    assert all(low - slack <= tick <= low + width + slack for tick in ticks)
    steps = {round((b - a) / width, 6) for a, b in pairwise(ticks)}
    assert len(steps) <= 1


@pytest.mark.parametrize(("low", "high"), [(0.0, 0.0), (2.0, 2.0), (-1.0, 3.0)])
def test_padding_leaves_room_also_around_one_value(low: float, high: float) -> None:
    bottom, top = padded(low, high)
    assert bottom < low <= high < top
