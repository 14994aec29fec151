"""The boundary of the complex region: mergers followed as curves in a plane, through folds and cusps."""

from __future__ import annotations

import flint
import numpy as np
import pytest
from mpmath import mp

from haarloom.exceptions import ParameterError
from haarloom.numerics.boundary import complex_boundary
from haarloom.numerics.compile import compile_transfer
from numerics import referees
from numerics.models import EMBER, EMBER_BOTH

MERGER = 0.41010045115116181143


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


class Determinant:
    """det(T − λ) of Ember-I in Arb's numbers at 150 digits, with slopes from differences.

    A double root in λ is a merger, a triple one a cusp; where the slope by t vanishes, z turns round: no
    bordered system, no irreps of the package, another basis.
    """

    OFFSET = mp.mpf(10) ** -30

    def __init__(self, cutoff=9):
        self.cutoff = cutoff
        self.matrices = {}

    def __call__(self, level, z, t):
        key = (str(z), str(t))
        if key not in self.matrices:
            matrix = referees.transfer(referees.heat(3, self.cutoff, t), referees.fermions(3, self.cutoff, z))
            self.matrices[key] = [[_arb(x) for x in row] for row in matrix.tolist()]
        shifted = [
            [x - _arb(level) if i == j else x for j, x in enumerate(row)]
            for i, row in enumerate(self.matrices[key])
        ]
        return mp.mpf(flint.arb_mat(shifted).det().mid().str(150, radius=False))

    def slope(self, place, axis, function=None):
        function = function or self.at
        up, down = list(place), list(place)
        up[axis] += self.OFFSET
        down[axis] -= self.OFFSET
        return (function(up) - function(down)) / (2 * self.OFFSET)

    def at(self, place):
        return self(*place)

    def zero(self, start, third):
        """Newton's method for det = det_λ = third = 0 from a start in double precision."""
        conditions = (self.at, lambda p: self.slope(p, 0), third)
        place = [mp.mpf(float(x)) for x in start]
        for _ in range(5):
            values = mp.matrix([condition(place) for condition in conditions])
            rows = [[self.slope(place, axis, condition) for axis in range(3)] for condition in conditions]
            change = mp.lu_solve(mp.matrix(rows), -values)
            place = [x + change[i] for i, x in enumerate(place)]
            if max(abs(x) for x in change) < mp.mpf(10) ** -20:
                return [float(x) for x in place]
        raise AssertionError("the referee did not converge")


def _arb(number):
    return flint.arb(mp.nstr(number, 150))


@pytest.fixture
def determinant():
    mp.dps, before = 150, flint.ctx.prec
    flint.ctx.prec = 520
    yield Determinant()
    flint.ctx.prec = before


def test_z_turns_round_where_the_determinant_says(boundary, determinant):
    """The lowest pair is complex for at most z = 0.41185, at t = 0.894; the two lowest levels of Ember-I."""
    (curve,) = boundary.curves
    ((index,), in_t) = curve.folds
    assert in_t == curve.cusps == ()
    assert curve.complete
    assert curve.points[index, 0] == curve.points[:, 0].max()
    start = [curve.eigenvalue[index], *curve.points[index]]
    level, z, t = determinant.zero(start, lambda p: determinant.slope(p, 2))
    assert curve.points[index, 0] == pytest.approx(z, abs=1e-13)
    assert curve.points[index, 1] == pytest.approx(t, abs=1e-9)
    assert curve.eigenvalue[index] == pytest.approx(level, abs=1e-9)


def test_particles_and_holes_fold_alike(boundary):
    """z → 1/z leaves every mass as it is: the fold comes again at 1/z."""
    holes = EMBER.complex_boundary(z=(1.05, 4.0), t=(0.35, 2.0), step=0.05)
    folds = [
        [curve.points[i] for curve in found.curves for i in curve.folds[0]] for found in (boundary, holes)
    ]
    assert len(folds[0]) == len(folds[1]) == 1
    assert folds[0][0][0] * folds[1][0][0] == pytest.approx(1, abs=1e-12)
    assert folds[0][0][1] == pytest.approx(folds[1][0][1], abs=1e-9)


@pytest.fixture(scope="module")
def around_the_cusp():
    return EMBER.complex_boundary(z=(0.3, 0.45), t=(0.5, 0.65), levels=7, step=0.05)


def test_three_levels_of_ember_meet_in_a_cusp(around_the_cusp, determinant):
    """Levels 3, 4 and 5: one curve through the cusp, which is a triple root of the determinant."""
    (curve,) = [curve for curve in around_the_cusp.curves if curve.cusps]
    (index,) = curve.cusps
    assert curve.complete
    assert not curve.closed
    start = [curve.eigenvalue[index], *curve.points[index]]
    level, z, t = determinant.zero(
        start, lambda p: determinant.slope(p, 0, lambda q: determinant.slope(q, 0))
    )
    assert curve.eigenvalue[index] == pytest.approx(level, rel=1e-10)
    assert curve.points[index] == pytest.approx([z, t], abs=1e-12)
    assert set(curve.level[: index - 1]) ^ set(curve.level[index + 2 :]) == {3, 4}
    assert_mergers(EMBER, around_the_cusp, curve, 6)


def test_the_two_sheets_part_like_a_semicubical_parabola():
    """Near the tip, with s = ln(λ/λ*): along the tip ∝ s², across it ∝ s³; s of both signs."""
    boundary = EMBER.complex_boundary(z=(0.3774, 0.37745), t=(0.58858, 0.58863), levels=7, step=5e-3)
    (curve,) = boundary.curves
    (index,) = curve.cusps
    s = np.log(curve.eigenvalue / curve.eigenvalue[index])
    offset = (curve.points - curve.points[index]) / 5e-5
    quadratic, cubic = np.polynomial.polynomial.polyfit(s, offset, [2, 3, 4, 5])[[2, 3]]
    along = quadratic / np.linalg.norm(quadratic)
    across = np.array([-along[1], along[0]])
    outer = np.abs(s) > 0.3 * np.abs(s).max()
    assert {-1.0, 1.0} == set(np.sign(s[outer]))
    assert offset[outer] @ along / s[outer] ** 2 == pytest.approx(np.linalg.norm(quadratic), rel=0.1)
    assert offset[outer] @ across / s[outer] ** 3 == pytest.approx(cubic @ across, rel=0.25)


def test_complex_inside_the_two_sheets_or_outside_as_a_dense_grid_says(around_the_cusp):
    """A grid of LAPACK spectra knows nothing of curves: verdicts change exactly where a curve passes.

    Between neighbours of a column of the grid the number of complex levels among those near λ* changes by two
    for every crossing of a curve.
    """
    z, t, window = np.linspace(0.36, 0.385, 26), np.linspace(0.575, 0.6, 200), 0.25
    (curve,) = [curve for curve in around_the_cusp.curves if curve.cusps]
    target = curve.eigenvalue[curve.cusps[0]]
    fine = EMBER.complex_boundary(z=(0.36, 0.385), t=(0.575, 0.6), levels=7, step=0.02)
    transfer = compile_transfer(EMBER, 9)
    for column in z:
        values = np.linalg.eigvals(transfer(z=np.full(len(t), column), t=t))
        mine = np.abs(values / target - 1) < window
        assert (mine.sum(axis=1) == 3).all(), "the window holds the three levels and no other one"
        pairs = ((values.imag > 0) & mine).sum(axis=1)
        changes = np.flatnonzero(np.diff(pairs))
        crossings = sorted(
            _crossing(one, other, column)
            for piece in fine.curves
            for one, other in zip(piece.points[:-1], piece.points[1:], strict=True)
            if (one[0] - column) * (other[0] - column) <= 0 and one[0] != other[0]
        )
        assert len(changes) == len(crossings)
        for change, crossing in zip(changes, crossings, strict=True):
            assert t[change] - 2e-5 <= crossing <= t[change + 1] + 2e-5


def _crossing(one, other, column):
    share = (column - one[0]) / (other[0] - one[0])
    return one[1] + share * (other[1] - one[1])


def test_sheets_close_to_each_other_are_one_curve_followed_once():
    """The cusp at z = 0.63775: its sheets lie closer together than a step, and are followed to both ends."""
    boundary = EMBER.complex_boundary(z=(0.1, 0.95), t=(0.4, 1.5), levels=8, step=0.03)
    assert all(curve.complete and not curve.closed for curve in boundary.curves)
    cusps = sorted(tuple(curve.points[i].tolist()) for curve in boundary.curves for i in curve.cusps)
    assert cusps == [
        pytest.approx((0.377436059784, 0.588604425246), abs=1e-9),
        pytest.approx((0.637750989677, 0.857611075444), abs=1e-9),
    ], "as Newton's method on the discriminant of the three levels from LAPACK finds them"
    assert boundary.unsettled == ()


def test_with_antiparticles_the_other_parameter_turns_round():
    """In the (z, z̄) plane, mirrored at z = z̄ (charge conjugation); the line z̄ = 0 is Ember-I."""
    boundary = EMBER_BOTH.complex_boundary(z=(0.05, 1.2), zbar=(0.0, 0.9), t=1.0, step=0.04, lines=4)
    (curve,) = boundary.curves
    assert_mergers(EMBER_BOTH, boundary, curve, 4)
    (in_z, (index,)) = curve.folds
    assert in_z == curve.cusps == ()
    assert curve.points[index, 1] == curve.points[:, 1].max()
    assert curve.points[np.argmin(curve.points[:, 1])] == pytest.approx([MERGER, 0], abs=1e-12)
    mirrored = EMBER_BOTH.complex_boundary(zbar=(0.05, 1.2), z=(0.0, 0.9), t=1.0, step=0.04, lines=4)
    (other,) = mirrored.curves
    assert mirrored.axes == ("zbar", "z")
    assert other.points[other.folds[1][0]] == pytest.approx(curve.points[index], abs=1e-9)


def test_a_curve_into_a_corner_without_matter_says_that_it_was_given_up():
    """At z = z̄ = 0 T is diagonal and levels meet with vectors of their own: no smooth curve ends there."""
    boundary = EMBER_BOTH.complex_boundary(z=(-0.05, 0.5), zbar=(-0.05, 0.5), t=1.0, step=0.05, lines=3)
    assert boundary.curves
    assert not all(curve.complete for curve in boundary.curves)


@pytest.mark.parametrize(
    ("values", "error", "message"),
    [
        ({"z": (0.1, 0.9), "t": 1.0}, ParameterError, "1 parameters have a range"),
        ({"z": 0.3, "t": 1.0}, ParameterError, "0 parameters have a range"),
        ({"z": (0.9, 0.1), "t": (0.5, 1.0)}, ParameterError, "empty or not real"),
        ({"z": (0.1, 0.9j), "t": (0.5, 1.0)}, ParameterError, "empty or not real"),
        ({"z": (0.1, np.inf), "t": (0.5, 1.0)}, ParameterError, "z"),
        ({"z": (0.1, "b"), "t": (0.5, 1.0)}, ParameterError, "z"),
        ({"z": (0.1, 0.9), "t": (0.5, 1.0), "step": 0}, ParameterError, "step = 0"),
        ({"z": (0.1, 0.9), "t": (0.5, 1.0), "lines": 0}, ParameterError, "lines 0 given"),
        ({"z": (0.1, 0.9), "t": (0.5, 1.0), "most_points": 1.5}, ParameterError, "most_points 1.5 given"),
        ({"z": (0.1, 0.5, 0.9), "t": (0.5, 1.0)}, ParameterError, "pair"),
        ({"z": (0.1, 0.9), "q": (0.5, 1.0), "t": 1.0}, ParameterError, "'q' is no parameter"),
        ({"z": (0.1, 0.9), "t": (0.5, 1.0), "steps": 1}, ParameterError, "'steps' is no parameter"),
    ],
)
def test_bad_planes(values, error, message):
    with pytest.raises(error, match=message):
        complex_boundary(EMBER, **values)


def test_a_complex_matrix_has_no_such_boundary():
    with pytest.raises(ParameterError, match="T is not real"):
        complex_boundary(EMBER_BOTH, z=(0.1, 0.5), t=(0.5, 1.0), zbar=0.1 + 0.1j)


def test_a_curve_longer_than_most_points_says_that_it_is_incomplete():
    boundary = EMBER.complex_boundary(z=(0.1, 0.95), t=(0.35, 2.0), step=0.05, lines=1, most_points=5)
    assert boundary.curves
    assert not any(curve.complete for curve in boundary.curves)


def test_a_boundary_is_drawn_with_its_turning_points():
    boundary = EMBER.complex_boundary(z=(0.2, 0.9), t=(0.5, 1.5))
    face = boundary._repr_html_()
    assert face.count("<path") == len(boundary.curves) == 1
    assert face.count(">fold<") == 1
    assert ">z<" in face
    assert ">t<" in face
