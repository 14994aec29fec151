"""Masses along a line of one parameter, as branches, with errors and verdicts."""

from __future__ import annotations

import numpy as np
import pytest

import haarloom as hl
from haarloom.exceptions import MissingValueError, ParameterError, SizeError
from haarloom.numerics.branches import masses_along
from numerics.models import EMBER, SU3


def test_the_lowest_masses_of_ember_merge_between_their_two_exceptional_points():
    """At t = 1: degenerate at z = 0, complex up to z = 0.41010045…, real from there to z = 1."""
    z = np.linspace(0.0, 1.0, 101)
    line = masses_along(EMBER, "z", z, levels=4, cutoff=6, t=1.0)
    assert line.masses.shape == line.error.shape == line.verdicts.shape == (101, 3)
    assert np.allclose(line.masses[0], [4 / 3, 4 / 3, 3], rtol=0, atol=1e-12)
    pair = line.complex_pair[:, 0]
    assert pair[(z > 0.005) & (z < 0.405)].all()
    assert not pair[z > 0.415].any()
    assert (line.verdicts[z > 0.415, 0] == "real").all()
    assert np.allclose(line.masses[pair, 0], np.conj(line.masses[pair, 1]), rtol=0, atol=1e-12)
    assert np.abs(np.diff(line.masses[:, :2], axis=0)).max() < 0.06
    assert np.isfinite(line.error).all()
    assert line.fixed == {"t": 1.0}


def test_every_point_of_a_line_is_the_spectrum_there():
    line = masses_along(EMBER, "t", [2.0, 1.5, 1.0, 0.7], levels=4, cutoff=8, z=0.5)
    for row, t in enumerate(line.grid):
        spectrum = EMBER.spectrum(levels=5, t=t, z=0.5)
        for mass, error in zip(line.masses[row], line.error[row], strict=True):
            assert np.abs(spectrum.masses - mass).min() <= error + spectrum.error.max()


@pytest.mark.parametrize("points", [8, 15, 106])
def test_branches_do_not_depend_on_how_fine_the_line_is(points):
    """z from 0 to 1 at t = 0.6: two mergers of levels 1 to 5 and a return to the real axis."""
    fine = masses_along(EMBER, "z", np.linspace(0.0, 1.0, 841), levels=6, cutoff=7, t=0.6)
    coarse = masses_along(EMBER, "z", np.linspace(0.0, 1.0, points), levels=6, cutoff=7, t=0.6)
    np.testing.assert_allclose(coarse.masses, fine.masses[:: 840 // (points - 1)], rtol=0, atol=1e-6)


def test_a_line_that_starts_at_vanishing_levels():
    """Loop coupling λ from 0: at λ = 0 all excited masses are infinite."""
    model = hl.RingModel(hl.loop_coupling(SU3, "lam"), hl.static_fermions(SU3, "z"))
    line = masses_along(model, "lam", np.linspace(0.0, 0.3, 20), levels=3, cutoff=2, z=0.3)
    assert np.isinf(line.masses[0].real).all()
    assert np.isfinite(line.masses[1:, :2]).all()
    assert (np.diff(line.masses[1:, 0].real) < 0).all()


@pytest.mark.parametrize(
    ("grid", "message"),
    [
        ([], "at least one value"),
        ([[0.1], [0.2]], "one-dimensional"),
        ([0.1, np.nan], "not finite"),
        ([0.1, np.inf], "not finite"),
        ([0.1, 0.3, 0.2], "neither rises nor falls"),
        ([0.1, 0.1], "neither rises nor falls"),
        (["a"], "no path of real numbers"),
    ],
)
def test_bad_paths_are_refused(grid, message):
    with pytest.raises(ParameterError, match=message):
        masses_along(EMBER, "z", grid, t=1.0)


def test_bad_lines_are_refused():
    with pytest.raises(ParameterError, match="'q' is no parameter"):
        masses_along(EMBER, "q", [0.1], t=1.0, z=0.1)
    with pytest.raises(MissingValueError, match="no value for t"):
        masses_along(EMBER, "z", [0.1])
    with pytest.raises(ParameterError, match="more than the 3 irreps"):
        masses_along(EMBER, "z", [0.1], levels=4, cutoff=1, t=1.0)
    with pytest.raises(SizeError, match="GB"):
        masses_along(EMBER, "z", np.linspace(0, 1, 2000), cutoff=100, t=1.0)
