"""Models that the tests of the numerics share: the invented Ember sector and its relatives."""

from __future__ import annotations

import pytest

import haarloom as hl
from haarloom.ring.model import RingModel


@pytest.fixture(scope="session")
def ember() -> RingModel:
    """Ember-I: heat kernel, static fundamental fermions of SU(3), no antiparticles."""
    group = hl.SU(3)
    return RingModel(hl.heat_kernel(group, "t"), hl.static_fermions(group, "z"))


@pytest.fixture(scope="session")
def ember_both() -> RingModel:
    """Particles and antiparticles of SU(3)."""
    group = hl.SU(3)
    return RingModel(hl.heat_kernel(group, "t"), hl.static_fermions(group, "z", "zb"))
