"""Three solvers behind one door agree with each other, and with mpmath at 50 digits."""

from __future__ import annotations

import numpy as np
import pytest
from mpmath import mp

import haarloom as hl
from haarloom.numerics.batch import truncate_batch
from haarloom.numerics.dense import solve_dense
from haarloom.numerics.krylov import solve_krylov
from haarloom.numerics.plane import Plane, solve_plane
from haarloom.numerics.truncation import truncate
from numerics import referees
from numerics.models import EMBER, EMBER_BOTH, TINTED, grid_model

CUTOFFS = {2: 80, 3: 12, 4: 6, 5: 4}
"""Bases of 70 to 91 irreps: Krylov methods are at work, and the dense solver is still quick."""

GRID = [
    pytest.param(n, link, both, id=f"SU({n}) {link}{' antiparticles' if both else ''}")
    for n in CUTOFFS
    for link in ("heat kernel", "Wilson")
    for both in (False, True)
]
LEVELS = 5


@pytest.mark.parametrize(("n", "link", "both"), GRID)
def test_dense_and_krylov_solvers_agree(n, link, both):
    model, values = grid_model(n, link, both)
    truncation = truncate(model, CUTOFFS[n] if link == "heat kernel" else min(CUTOFFS[n], 12), values)
    dense, krylov = solve_dense(truncation), solve_krylov(truncation, LEVELS)
    assert (dense.solver, krylov.solver) == ("dense", "Krylov")
    count = len(krylov.values)
    assert count >= LEVELS
    largest = abs(dense.values[0])
    assert referees.distance(dense.values[:count], krylov.values) <= 1e-12 * largest
    assert (krylov.residual <= 1e-12 * largest).all()


@pytest.mark.parametrize(("n", "link", "both"), GRID)
def test_batched_solver_agrees_with_the_dense_one(n, link, both):
    """Warm starts on a small grid: levels at every point within 1e-12 of LAPACK's on the same basis."""
    model, values = grid_model(n, link, both)
    moving = "t" if "t" in values else "beta"
    axes = (values[moving] * np.linspace(1, 1.1, 10), np.linspace(0.35, 0.45, 12))
    fixed = {name: value for name, value in values.items() if name not in (moving, "z")}
    cutoff = {2: 12, 3: 5, 4: 4, 5: 3}[n]
    found = solve_plane(Plane(model, cutoff, (moving, "z"), axes, fixed, 3, 1e-10))
    for row in (0, 4, 9):
        for column in (0, 7, 11):
            point = {**fixed, moving: axes[0][row], "z": axes[1][column]}
            system = solve_dense(truncate(model, int(found.cutoff[row, column]), point))
            largest = abs(system.values[0])
            # rounding reaches a level magnified by its condition number, in both solvers
            allowed = 1e-12 * largest * max(1.0, system.condition[:3].max() / 100)
            assert referees.distance(found.values[row, column], system.values[:3]) <= allowed
            assert np.isfinite(found.radius[row, column]).all()


@pytest.mark.parametrize(
    ("model", "values", "cutoff"),
    [
        (TINTED, {"t": 0.8, "h": 0.5}, 11),
        (
            hl.RingModel(hl.heat_kernel(hl.SU(2), "t"), hl.loop_field(hl.SU(2), {"2": "h"})),
            {"t": 0.5, "h": 0.7},
            75,
        ),
        (
            hl.RingModel(hl.heat_kernel(hl.SU(3), "t"), hl.static_bosons(hl.SU(3), "z")),
            {"t": 0.8, "z": 0.4},
            11,
        ),
    ],
    ids=["SU(3) loop field", "SU(2) loop field", "SU(3) bosons"],
)
def test_infinite_site_weights_in_all_solvers(model, values, cutoff):
    truncation = truncate(model, cutoff, values)
    dense, krylov = solve_dense(truncation), solve_krylov(truncation, LEVELS)
    batch = truncate_batch(model, cutoff, {name: np.array([value]) for name, value in values.items()})
    stacked = batch.solved()[0][0]
    count = len(krylov.values)
    largest = abs(dense.values[0])
    assert referees.distance(dense.values[:count], krylov.values) <= 1e-12 * largest
    assert referees.distance(dense.values[:count], stacked[:count]) <= 1e-12 * largest


@pytest.mark.parametrize(
    ("n", "link", "z", "zbar", "copies", "cutoff"),
    [
        (2, "heat", "0.4", "0.1", 1, 8),
        (3, "heat", "0.3", 0, 1, 5),
        (3, "heat", "0.3", "0.2", 2, 4),
        (3, "wilson", "0.3", "0.1", 1, 3),
        (4, "heat", "0.35", 0, 1, 3),
        (4, "wilson", "0.35", "0.1", 1, 2),
        (5, "heat", "0.4", "0.1", 1, 2),
    ],
)
def test_against_mpmath_at_fifty_digits(n, link, z, zbar, copies, cutoff):
    """The same truncated T: by Pieri's rule and Bessel determinants in mpmath; masses agree to 1e-12."""
    mp.dps = 50
    numbers = referees.heat(n, cutoff, "0.8") if link == "heat" else referees.wilson(n, cutoff, 2 * n)
    site = referees.fermions(n, cutoff, mp.mpf(z), mp.mpf(zbar), copies)
    expected = referees.levels(referees.transfer(numbers, site), 4)
    G = hl.SU(n)
    weight = hl.heat_kernel(G, "t") if link == "heat" else hl.wilson(G, "beta")
    model = hl.RingModel(weight, hl.static_fermions(G, "z", "zbar", copies=copies))
    coupling = {"t": 0.8} if link == "heat" else {"beta": 2 * n}
    found = model.spectrum(levels=4, cutoff=cutoff, z=float(z), zbar=float(zbar), **coupling)
    assert referees.distance(found.eigenvalues, expected) <= 1e-12 * float(abs(expected[0]))
    assert referees.distance(found.masses, referees.masses(expected)) <= 1e-12 * 10


@pytest.mark.parametrize(
    ("t", "z", "zbar"),
    [(1.0, 0.3, 0.0), (0.02, 0.3, 0.1), (0.02, 0.3, 0.0)],
    ids=["dense", "Krylov both", "Krylov"],
)
def test_vectors_are_biorthonormal_and_satisfy_both_equations(t, z, zbar):
    spectrum = EMBER_BOTH.spectrum(levels=6, t=t, z=z, zbar=zbar, cutoff=20 if t < 1 else 6)
    assert spectrum.solver == ("Krylov" if t < 1 else "dense")
    right, left, values = spectrum.right, spectrum.left, spectrum.eigenvalues
    assert np.allclose(left.T @ right, np.eye(6), rtol=0, atol=1e-9)
    from haarloom.numerics.compile import compile_transfer

    matrix = compile_transfer(EMBER_BOTH, spectrum.cutoff)(t=t, z=z, zbar=zbar)
    scale = abs(values[0])
    assert np.allclose(matrix @ right, right * values, rtol=0, atol=1e-11 * scale)
    assert np.allclose(matrix.T @ left, left * values, rtol=0, atol=1e-9 * scale)
    assert len(spectrum.basis) == len(right)


def test_condition_numbers_are_those_of_the_vectors_and_explode_at_a_merger():
    """κ = ‖x‖‖y‖ ≥ 1; 1 for a Hermitian T (z = 1), huge next to the merger at z = 0.41010045…"""
    hermitian = EMBER.spectrum(levels=4, t=1, z=1.0)
    assert np.allclose(hermitian.condition, 1, rtol=0, atol=1e-9)
    plain = EMBER.spectrum(levels=4, t=1, z=0.3)
    norms = np.linalg.norm(plain.right, axis=0) * np.linalg.norm(plain.left, axis=0)
    assert np.allclose(plain.condition, norms, rtol=1e-12)
    assert (plain.condition >= 1 - 1e-12).all()
    near = EMBER.spectrum(levels=4, t=1, z=0.41010045)
    assert near.condition[1] > 1e2 * plain.condition[1]


def test_the_condition_number_is_the_sensitivity():
    """|δλ| ≤ κ ‖δT‖ to first order, reached for δT = ȳ xᵀ̄: the perturbation that hurts most."""
    truncation = truncate(EMBER, 6, {"t": 1.0, "z": 0.35})
    system = solve_dense(truncation)
    x, y = system.right[:, 1], system.left[:, 1]
    worst = np.outer(y.conj(), x.conj()) / (np.linalg.norm(x) * np.linalg.norm(y))
    step = 1e-7
    moved = np.linalg.eigvals(truncation.dense + step * worst)
    shift = np.abs(moved - system.values[1]).min() / step
    assert shift == pytest.approx(system.condition[1], rel=1e-3)


def test_a_large_basis_goes_to_krylov_and_matrix_free_transforms():
    """Dense W on many irreps: the operator by fast transforms; λ against LAPACK on the same basis."""
    from haarloom.numerics.site_action import TorusAction

    truncation = truncate(TINTED, 20, {"t": 0.05, "h": 1.0})
    assert isinstance(truncation.action, TorusAction)
    krylov = solve_krylov(truncation, 4)
    dense = solve_dense(truncation)
    assert referees.distance(krylov.values[:4], dense.values[:4]) <= 1e-12 * abs(dense.values[0])
