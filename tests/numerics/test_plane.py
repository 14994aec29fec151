"""Rectangles of points solved together: T on many vectors, corrections and cutoffs, against plain NumPy."""

from __future__ import annotations

import threading
from dataclasses import replace

import numpy as np
import pytest

import haarloom as hl
from haarloom.numerics import frames
from haarloom.numerics.corrections import corrected
from haarloom.numerics.labels import conjugation
from haarloom.numerics.plane import Plane, solve_plane
from haarloom.numerics.plane_cutoff import fitted, sufficient
from haarloom.numerics.plane_numbers import plane_numbers
from haarloom.numerics.threads import cores_shared, in_parallel, single_threaded, split
from numerics.models import EMBER, EMBER_BOTH, SU3
from numerics.referees import distance

MIXED = hl.RingModel(hl.mixed_wilson(SU3, {"3": "f", "8": "a"}), hl.static_fermions(SU3, "z"))
STAGGERED = hl.RingModel(
    hl.link_from_coefficients(
        SU3, {"1": 1, "3": "-x", "3bar": "-x", "8": "x**2", "6": "x**2", "6bar": "x**2"}
    ),
    hl.static_fermions(SU3, "z", "x"),
)

PLANES = {
    "one axis each": (EMBER, ("t", "z"), (0.5, 0.9), (0.2, 0.4), {}),
    "both in the site": (EMBER_BOTH, ("z", "zbar"), (0.2, 0.5), (0.05, 0.1), {"t": 0.9}),
    "both in the link": (MIXED, ("f", "a"), (4.0, 5.0), (0.2, 0.4), {"z": 0.3}),
    "one in both, signs in the link": (STAGGERED, ("x", "z"), (0.2, 0.3), (0.1, 0.2), {}),
    "a complex fugacity": (EMBER_BOTH, ("t", "zbar"), (0.8, 1.2), (0.05, 0.2), {"z": 0.3 * np.exp(0.4j)}),
}


def plane_of(name, rows=5, columns=4, cutoff=4):
    model, names, first, second, fixed = PLANES[name]
    axes = np.linspace(*first, rows), np.linspace(*second, columns)
    return Plane(model, cutoff, names, axes, fixed, 4, 1e-10)


@pytest.mark.parametrize("name", PLANES)
def test_images_are_those_of_the_stacked_matrices(name):
    plane = plane_of(name)
    rows, columns = plane.shape
    numbers = plane_numbers(plane)
    vectors = np.random.default_rng(5).standard_normal((numbers.size, 3, rows, columns))
    found = numbers.images(vectors)
    first, second = (grid.reshape(-1) for grid in np.meshgrid(*plane.axes, indexing="ij"))
    whole = plane.batch(first, second).whole
    expected = whole @ np.moveaxis(vectors.reshape(numbers.size, 3, -1), 2, 0)
    found = np.moveaxis(found.reshape(len(found), 3, -1), 2, 0)
    assert found == pytest.approx(np.broadcast_to(expected, found.shape), abs=1e-13)
    some = numbers.rows(slice(1, 3)).images(vectors[:, :, 1:3])
    assert some == pytest.approx(numbers.images(vectors)[:, :, 1:3], abs=1e-14)


@pytest.mark.parametrize("name", PLANES)
def test_levels_are_those_of_numpy_on_a_larger_basis(name):
    plane = sufficient(plane_of(name, 10, 8))
    found = solve_plane(plane)
    for row, column in ((0, 0), (4, 5), (9, 7)):
        values = dict(zip(plane.names, (plane.axes[0][row], plane.axes[1][column]), strict=True))
        matrix = plane.model.transfer_matrix(cutoff=plane.cutoff + 3).numeric(**plane.fixed, **values)
        levels = np.linalg.eigvals(matrix)
        levels = levels[np.argsort(-np.abs(levels))]
        mine, radius = found.values[row, column], found.radius[row, column]
        assert np.isfinite(radius).all()
        # a pair may be cut at the last level: compare with one more
        apart = np.abs(mine[:, None] - levels[None, : plane.levels + 2]).min(axis=1)
        assert (apart <= radius + 1e-14).all()
        assert distance(mine[:1], levels[:1]) <= radius[0] + 1e-14


def test_a_correction_brings_a_disturbed_subspace_back():
    plane = plane_of("one axis each", cutoff=6)
    first, second = np.array([0.6, 0.8]), np.array([0.25, 0.35])
    batch = plane.batch(first, second)
    _, right = batch.leading(3)
    basis = np.stack([right[:, :, 0].real, right[:, :, 1].real, right[:, :, 1].imag], axis=2)
    noise = np.random.default_rng(2).standard_normal(basis.shape)
    groups = (slice(0, 1), slice(1, 3))
    dual = (batch.phase[:, : batch.size], conjugation(SU3.rank, plane.cutoff))

    def distances(vectors):
        """Sines of the largest angles between each group and the true one."""
        found = []
        for group in groups:
            exact, mine = (np.linalg.qr(array[:, :, group])[0] for array in (basis, vectors))
            found.append(np.linalg.norm(mine - exact @ (np.swapaxes(exact, 1, 2) @ mine), axis=(1, 2)))
        return np.array(found)

    disturbed = basis + 1e-4 * noise
    better = distances(corrected(batch.matrix, disturbed, dual, groups))
    assert (better < 0.3 * distances(disturbed)).all()
    assert (better[0] < 1e-6).all(), "a single level gains the square"


def test_the_cutoff_found_suffices_and_the_one_below_does_not():
    """Against the shift of the masses on a basis three steps larger, by NumPy."""
    plane = sufficient(plane_of("one axis each", 9, 9))

    def worst(cutoff):
        shifts = []
        for first, second in ((0, 0), (0, 8), (8, 8)):
            values = dict(zip(plane.names, (plane.axes[0][first], plane.axes[1][second]), strict=True))
            masses = []
            for size in (cutoff, plane.cutoff + 3):
                matrix = plane.model.transfer_matrix(cutoff=size).numeric(**values)
                levels = np.sort(np.abs(np.linalg.eigvals(matrix)))[::-1][: plane.levels]
                masses.append(-np.log(levels[1:] / levels[0]))
            shifts.append(np.abs(masses[0] - masses[1]) / masses[1])
        return np.max(shifts)

    assert worst(plane.cutoff) <= plane.tolerance
    assert worst(plane.cutoff - 1) > 0.01 * plane.tolerance, "a much smaller basis would have done"
    assert fitted(plane).cutoff <= plane.cutoff


def test_stacks_are_cut_for_threads_and_put_together_in_order():
    for length in (1, 7, 8, 100):
        parts = split(length, 8)
        assert [place for part in parts for place in range(length)[part]] == list(range(length))
    assert list(in_parallel(lambda part: part * part, [3, 1, 2])) == [9, 1, 4]
    with cores_shared():
        assert split(1000, 8) == [slice(0, 1000)]
        assert (
            list(in_parallel(lambda _: threading.current_thread(), [1, 2]))
            == [threading.current_thread()] * 2
        )


def test_the_blas_limit_holds_until_whoever_set_it_leaves():
    threadpoolctl = pytest.importorskip("threadpoolctl")

    def blas_threads():
        return {pool["num_threads"] for pool in threadpoolctl.threadpool_info() if pool["user_api"] == "blas"}

    seen = []

    @single_threaded
    def inner():
        seen.append(blas_threads())

    @single_threaded
    def outer():
        inner()
        other = threading.Thread(target=inner)
        other.start()
        other.join()
        seen.append(blas_threads())

    inner()  # loads every library that brings a BLAS
    before = blas_threads()
    outer()
    assert seen == [{1}] * 4
    assert blas_threads() == before


COARSE = {
    "far from normal": (EMBER, ("t", "z"), (1.1, 2.0), (0.5, 1.0), {}, (6, 7)),
    "weak coupling, mergers": (EMBER, ("t", "z"), (0.3, 0.6), (0.3, 0.5), {}, (6, 7)),
    "antiparticles": (EMBER_BOTH, ("z", "zbar"), (0.2, 0.5), (0.05, 0.1), {"t": 0.9}, (6, 7)),
    "a complex fugacity": (
        EMBER_BOTH,
        ("t", "zbar"),
        (0.8, 1.2),
        (0.05, 0.2),
        {"z": 0.3 * np.exp(0.4j)},
        (5, 6),
    ),
}


@pytest.mark.parametrize("name", COARSE)
def test_radii_hold_where_subspaces_are_interpolated_coarsely(name):
    """Against LAPACK at every point; a radius a hundred times too large would say nothing either."""
    model, names, *ends, fixed, nodes = COARSE[name]
    axes = np.linspace(*ends[0], 30), np.linspace(*ends[1], 30)
    plane = Plane(model, 7, names, axes, fixed, 4, 1e-3)
    coarse = frames._frames(plane, nodes)
    values, radius, _ = frames._everywhere(plane, replace(coarse, swell=frames._swell(plane, coarse)))
    assert np.isfinite(radius).mean() > 0.5
    first, second = (grid.reshape(-1) for grid in np.meshgrid(*axes, indexing="ij"))
    exact = np.linalg.eigvals(plane.batch(first, second).matrix).reshape(30, 30, -1)
    apart = np.abs(values[..., :, None] - exact[..., None, :]).min(axis=-1)
    assert apart.max() > 1e-12, "the interpolation was too good to say anything"
    assert 0.01 < (apart / (radius + 1e-13)).max() <= 1


def test_the_resolvent_of_what_is_left_out_is_measured(monkeypatch):
    """Against Σ x yᵀ/(Λ − λ) over the levels left out, from NumPy's eigenvectors."""
    monkeypatch.setattr(frames, "SPREAD", 1.0)
    plane = plane_of("one axis each", 40, 40, cutoff=6)
    found = frames._frames(plane, (5, 5))
    count = found.groups[-1].stop
    largest = 1.0
    for row, column in ((0, 0), (0, 4), (2, 2), (4, 0), (4, 4)):
        matrix = plane.batch(found.nodes[0][[row]], found.nodes[1][[column]]).matrix[0]
        values, right = np.linalg.eig(matrix)
        order = np.argsort(-np.abs(values))
        values, right = values[order], right[:, order]
        left = np.linalg.inv(right)
        rest = found.rest * np.abs(values[count - 1])
        for level in values[: plane.levels]:
            outside = (right[:, count:] / (values[count:] - level)) @ left[count:]
            largest = max(largest, np.linalg.norm(outside, 2) * (np.abs(level) - rest))
    assert frames._swell(plane, found) == pytest.approx(largest, rel=1e-8)
    assert largest > 1.05, "the example is too near to normal"


def test_nothing_is_said_where_levels_of_two_groups_meet():
    plane = plane_of("one axis each", 40, 40, cutoff=4)
    found = frames._frames(plane, (5, 5))
    twice = found.vectors.copy()
    twice[:, :, 1] = twice[:, :, 0]
    broken = replace(found, vectors=twice)
    assert frames._swell(plane, broken) == np.inf
    _, radius, _ = frames._everywhere(plane, replace(broken, swell=np.inf))
    assert np.isinf(radius).all()
