"""Mergers on a line, to full precision, with what coalesces there; and as curves in a plane."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest

import haarloom as hl
from haarloom.exceptions import ConvergenceError, MissingValueError, ParameterError
from haarloom.numerics.boundary import complex_boundary
from haarloom.numerics.compile import compile_transfer
from haarloom.numerics.exceptional import exceptional_points
from numerics.models import EMBER, EMBER_BOTH, SU2

MERGER = 0.41010045115116181143


@pytest.fixture(scope="module")
def merger():
    return EMBER.exceptional_point("z", (0.3, 0.5), digits=12, t=1)


def test_real_on_one_side_complex_on_the_other(merger):
    for offset, kind in ((-1e-6, "complex pair"), (1e-6, "real")):
        spectrum = EMBER.spectrum(levels=3, t=1, z=float(merger.value) + offset)
        assert spectrum.verdicts == (kind, kind)
    low, high = merger.bracket
    assert merger.proven
    assert high - low == Fraction(1, 10**12)
    assert low <= merger.value <= high


def test_the_coalescing_vector_is_right_and_self_orthogonal(merger):
    """At a merger yᵀx = 0, with y = J x (conjugate irreps) for the heat kernel."""
    size = len(merger.vector)
    matrix = compile_transfer(EMBER, merger.cutoff)(t=1.0, z=float(merger.value))
    assert matrix.shape == (size, size) == (len(merger.basis),) * 2
    residual = matrix @ merger.vector - merger.eigenvalue * merger.vector
    assert np.linalg.norm(residual) < 1e-9
    place = {irrep: i for i, irrep in enumerate(merger.basis)}
    mirror = [place[irrep.conjugate] for irrep in merger.basis]
    assert abs(merger.vector[mirror] @ merger.vector) < 1e-6
    assert np.linalg.norm(merger.vector) == pytest.approx(1)


def test_the_square_root_coefficient_is_observed(merger):
    """λ − λ* ≈ ±√(q (p − p*)): half the distance of the pair, squared, over p − p*."""
    for offset in (-1e-5, 1e-5):
        matrix = compile_transfer(EMBER, 6)(t=1.0, z=float(merger.value) + offset)
        values = np.linalg.eigvals(matrix)
        pair = values[np.argsort(np.abs(values - merger.eigenvalue))[:2]]
        half = (pair[0] - pair[1]) / 2
        assert (half**2).real / offset == pytest.approx(merger.square_root_coefficient, rel=1e-3)


def test_all_mergers_on_a_line_and_their_mirror_images():
    """Particles and holes: with z* also 1/z* is a merger."""
    found = [m.value for m in exceptional_points(EMBER, "z", (0.05, 4.0), levels=3, samples=160, t=1)]
    assert any(abs(value - MERGER) < 1e-10 for value in found)
    assert any(abs(value - 1 / MERGER) < 1e-9 for value in found)
    for value in found:
        assert any(abs(value * other - 1) < 1e-8 for other in found)


def test_nothing_merges_where_t_is_symmetric():
    two = hl.RingModel(hl.heat_kernel(SU2, "t"), hl.static_fermions(SU2, "z"))
    assert exceptional_points(two, "z", (0.1, 2.0), t=1) == ()
    with pytest.raises(ConvergenceError, match=r"merges with the next one nowhere.*none at all"):
        two.exceptional_point("z", (0.1, 2.0), t=1)


@pytest.mark.parametrize(
    ("parameter", "between", "values", "error", "message"),
    [
        ("q", (0.1, 0.2), {"t": 1, "z": 0.3}, ParameterError, "'q' is no parameter"),
        ("z", (0.5, 0.3), {"t": 1}, ParameterError, "is empty"),
        ("z", (0.3, 0.3), {"t": 1}, ParameterError, "is empty"),
        ("z", (0.3, np.inf), {"t": 1}, ParameterError, r"no exact number|not finite"),
        ("z", (0.3, 0.5), {}, MissingValueError, "no value for t"),
        ("z", (0.45, 0.5), {"t": 1}, ConvergenceError, "nowhere for z between"),
    ],
)
def test_bad_lines(parameter, between, values, error, message):
    with pytest.raises(error, match=message):
        EMBER.exceptional_point(parameter, between, **values)


def gap_of(model, names, point, fixed, eigenvalue):
    """Distance, relative to λ, of the two eigenvalues nearest to λ*, from a larger basis by LAPACK."""
    values = np.linalg.eigvals(compile_transfer(model, 12)(**dict(zip(names, point, strict=True)), **fixed))
    pair = values[np.argsort(np.abs(values - eigenvalue))[:2]]
    return abs(pair[0] - pair[1]) / abs(eigenvalue)


def assert_mergers(model, boundary, curve, every):
    for index in range(0, len(curve.points), every):
        gap = gap_of(model, boundary.axes, curve.points[index], boundary.fixed, curve.eigenvalue[index])
        # √ of the distance to the merger: 1e-12 off in the plane parts the levels by about 1e-6
        assert gap < 3e-5


@pytest.fixture(scope="module")
def boundary():
    return EMBER.complex_boundary(z=(0.1, 0.95), t=(0.35, 2.0), step=0.05)


def test_points_of_the_boundary_are_mergers(boundary):
    assert boundary.axes == ("z", "t")
    assert boundary.curves
    for curve in boundary.curves:
        assert len(curve.points) == len(curve.mass) == len(curve.level) == len(curve.error)
        assert (curve.error < 1e-9).all()
        assert_mergers(EMBER, boundary, curve, 5)


def test_the_boundary_passes_through_the_merger_at_t_1(boundary):
    crossings = []
    for curve in boundary.curves:
        t = curve.points[:, 1]
        for i in np.flatnonzero((t[1:] - 1) * (t[:-1] - 1) <= 0):
            share = (1 - t[i]) / (t[i + 1] - t[i])
            crossings.append(curve.points[i, 0] + share * (curve.points[i + 1, 0] - curve.points[i, 0]))
    assert min(abs(z - MERGER) for z in crossings) < 2e-3


def test_the_boundary_parts_real_from_complex(boundary):
    """A step across the curve changes the verdict of the pair."""
    curve = boundary.curves[0]
    for index in range(3, len(curve.points) - 3, 9):
        along = curve.points[index + 1] - curve.points[index - 1]
        across = np.array([-along[1], along[0]]) / np.linalg.norm(along) * 2e-3
        verdicts = set()
        for sign in (-1, 1):
            z, t = curve.points[index] + sign * across
            spectrum = EMBER.spectrum(levels=int(curve.level[index]) + 2, z=z, t=t)
            verdicts.add(spectrum.verdicts[int(curve.level[index]) - 1])
        assert verdicts == {"real", "complex pair"}


def test_neighbouring_points_are_no_further_apart_than_the_step(boundary):
    size = np.array([0.85, 1.65])
    for curve in boundary.curves:
        steps = np.linalg.norm(np.diff(curve.points, axis=0) / size, axis=1)
        assert steps.max() <= 1.6 * 0.05


def test_through_a_fold_with_antiparticles():
    """The (z, z̄) plane is mirrored at z = z̄, where the model is Hermitian: any fold found is one."""
    boundary = EMBER_BOTH.complex_boundary(z=(0.05, 1.2), zbar=(0.0, 0.9), t=1.0, step=0.04, lines=4)
    assert boundary.curves
    for curve in boundary.curves:
        assert_mergers(EMBER_BOTH, boundary, curve, 7)
        for fold in curve.folds:
            steps = np.diff(curve.points[fold - 1 : fold + 2], axis=0)
            assert (steps[0] * steps[1] < 0).any()


@pytest.mark.parametrize(
    ("values", "error", "message"),
    [
        ({"z": (0.1, 0.9), "t": 1.0}, ParameterError, "1 parameters have a range"),
        ({"z": 0.3, "t": 1.0}, ParameterError, "0 parameters have a range"),
        ({"z": (0.9, 0.1), "t": (0.5, 1.0)}, ParameterError, r"empty or not finite"),
        ({"z": (0.1, np.inf), "t": (0.5, 1.0)}, ParameterError, r"not finite"),
        ({"z": (0.1, 0.5, 0.9), "t": (0.5, 1.0)}, ParameterError, "pair"),
        ({"z": (0.1, 0.9), "q": (0.5, 1.0), "t": 1.0}, ParameterError, "'q' is no parameter"),
    ],
)
def test_bad_planes(values, error, message):
    with pytest.raises(error, match=message):
        complex_boundary(EMBER, **values)
