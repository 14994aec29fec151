"""Mergers on a line, to full precision, with what coalesces there."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest

import haarloom as hl
from haarloom.actions.exponential_coupling import exponential_coupling
from haarloom.exceptions import ConvergenceError, MissingValueError, ParameterError
from haarloom.numerics.compile import compile_transfer
from haarloom.numerics.exceptional import exceptional_points
from haarloom.numerics.mergers import MatrixFamily, mergers_on
from haarloom.numerics.truncation import truncate
from numerics.models import EMBER, EMBER_BOTH, SU2, SU3

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


def test_levels_that_cross_at_the_end_of_the_line_do_not_count():
    """At z = 0 the fundamental and its conjugate have equal levels and vectors of their own."""
    for between in ((0, 0.5), (0, 0.42), (0.4, 0.42)):
        found = exceptional_points(EMBER, "z", between, levels=3, t=1)
        assert [m.value for m in found] == [pytest.approx(MERGER, abs=1e-13)]


def test_mergers_on_a_coarse_grid_are_those_on_a_fine_one():
    """Newton's method stays in its cell, or the cell is cut finer."""
    fine = exceptional_points(EMBER, "z", (0.05, 2.6), levels=8, samples=401, t=0.6)
    coarse = exceptional_points(EMBER, "z", (0.05, 2.6), levels=8, samples=33, t=0.6)
    assert [(m.level, pytest.approx(m.value, abs=1e-9)) for m in fine] == [(m.level, m.value) for m in coarse]
    assert len(fine) >= 4


def test_mergers_where_the_link_mixes_irreps():
    """exp[λ(L L′* + L* L′)]: the pair is real on one side and complex on the other, as LAPACK says."""
    model = hl.RingModel(exponential_coupling(SU3, "lam"), hl.static_fermions(SU3, "z"))
    family = MatrixFamily(model, 7, ("z",), {"lam": 0.1})
    found = list(mergers_on(family, np.linspace(0.02, 1, 20), levels=7))
    assert found
    for _, merger in found:
        assert merger is not None
        kinds = []
        for offset in (-1e-4, 1e-4):
            truncation = truncate(model, 7, {"lam": 0.1, "z": merger.value + offset})
            values = np.linalg.eigvals(truncation.dense)
            pair = values[np.argsort(np.abs(values - merger.eigenvalue))[:2]]
            kinds.append(bool(np.iscomplex(pair).all()))
            assert abs(pair[0] - pair[1]) < 0.1 * merger.eigenvalue
        assert sorted(kinds) == [False, True]


def test_a_complex_matrix_has_no_mergers_of_this_kind():
    with pytest.raises(ParameterError, match="T is not real"):
        exceptional_points(EMBER_BOTH, "z", (0.1, 0.5), t=1, zbar=0.1 + 0.1j)


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
        ("z", (0.3,), {"t": 1}, ParameterError, "give the two ends"),
        ("z", (0.3, 0.5), {"t": 1, "digits": 0}, ParameterError, "digits = 0"),
    ],
)
def test_bad_lines(parameter, between, values, error, message):
    with pytest.raises(error, match=message):
        EMBER.exceptional_point(parameter, between, **values)


def test_a_grid_has_at_least_two_points():
    with pytest.raises(ParameterError, match="samples 1 given"):
        exceptional_points(EMBER, "z", (0.3, 0.5), samples=1, t=1)
