"""Models that several tests of the numerics share; Ember is invented, parameters for illustration only."""

from __future__ import annotations

import haarloom as hl

SU2, SU3 = hl.SU(2), hl.SU(3)

EMBER = hl.RingModel(hl.heat_kernel(SU3, "t"), hl.static_fermions(SU3, "z"))
"""Ember-I: one static fermion in the fundamental, antiparticles suppressed."""

EMBER_BOTH = hl.RingModel(hl.heat_kernel(SU3, "t"), hl.static_fermions(SU3, "z", "zbar"))
"""Ember-I with antiparticles."""

TINTED = hl.RingModel(hl.heat_kernel(SU3, "t"), hl.loop_field(SU3, {"3": "h"}))
"""A loop field on the fundamental alone: W has infinitely many characters, T is real and not symmetric."""


def grid_model(n: int, link: str, antiparticles: bool) -> tuple[hl.RingModel, dict[str, float]]:
    """One of the grid of models on which solvers are compared, with values."""
    G = hl.SU(n)
    weight = hl.heat_kernel(G, "t") if link == "heat kernel" else hl.wilson(G, "beta", plaquettes=2)
    values = {"t": 0.7} if link == "heat kernel" else {"beta": 1.5 * n}
    site = hl.static_fermions(G, "z", "zbar") if antiparticles else hl.static_fermions(G, "z")
    values |= {"z": 0.4, "zbar": 0.15} if antiparticles else {"z": 0.4}
    return hl.RingModel(weight, site), values
