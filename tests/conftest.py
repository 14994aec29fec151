"""Settings that every test shares: deterministic property tests, seeded random numbers, clean precision."""

from __future__ import annotations

import random
from collections.abc import Iterator

import numpy as np
import pytest
from hypothesis import HealthCheck, settings
from mpmath import mp

settings.register_profile(
    "haarloom",
    deadline=None,
    derandomize=True,
    max_examples=25,
    suppress_health_check=[HealthCheck.too_slow],
)
settings.load_profile("haarloom")


@pytest.fixture(autouse=True)
def _repeatable() -> Iterator[None]:
    """Seed the global generators and give mpmath its precision back."""
    random.seed(20)
    np.random.seed(20)  # noqa: NPY002 (third-party code may still draw from the global state)
    precision = mp.prec
    yield
    mp.prec = precision


@pytest.fixture
def rng() -> np.random.Generator:
    """A seeded generator of random numbers."""
    return np.random.default_rng(20)
