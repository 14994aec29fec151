"""Shapes and checks of eigenphases."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from haarloom.exceptions import ParameterError
from haarloom.torus.angles import full_angles


def test_the_last_phase_is_supplied() -> None:
    np.testing.assert_allclose(full_angles(3, [0.2, 0.3]), [0.2, 0.3, -0.5])
    assert full_angles(4, np.zeros((5, 6, 3))).shape == (5, 6, 4)


@pytest.mark.parametrize("turns", [0, 1, -2])
def test_all_phases_may_add_up_to_full_turns(turns: int) -> None:
    phases = [0.1, 0.2, 2 * np.pi * turns - 0.3]
    np.testing.assert_array_equal(full_angles(3, phases), phases)


@pytest.mark.parametrize(
    ("angles", "cause"),
    [
        ([0.1, 0.2, 0.3], "misses 0 mod 2π"),
        (0.5, "last axis"),
        ([0.1], "last axis"),
        (np.zeros((2, 4)), "last axis"),
        (["a", "b"], "real numbers"),
        ([1j, 0], "real numbers"),
        (None, "finite"),
        ([np.nan, 0.0], "finite"),
        ([np.inf, 0.0], "finite"),
    ],
)
def test_bad_angles(angles: Any, cause: str) -> None:
    with pytest.raises(ParameterError, match=cause):
        full_angles(3, angles)
