"""Links that mix irreps, exp[λ(L L′* + L* L′)]: the spectrum is right, or refused with a reason."""

from __future__ import annotations

import numpy as np
import pytest

import haarloom as hl
from haarloom.actions.exponential_coupling import exponential_coupling
from haarloom.exceptions import ConvergenceError
from numerics import referees
from numerics.models import SU2, SU3

MIXED = {2: hl.RingModel(exponential_coupling(SU2, "lam"), hl.static_fermions(SU2, "z"))}
MIXED[3] = hl.RingModel(exponential_coupling(SU3, "lam"), hl.static_fermions(SU3, "z"))


def torus_levels(n: int, lam: float, z: float, points: int) -> np.ndarray:
    """Eigenvalues of the integral operator K(P, P′) W(P′) by quadrature on the maximal torus (Nyström).

    K depends on loops alone, so that it acts on class functions; no irrep enters.
    """
    from haarloom.torus.quadrature import haar_grid

    angles, weights = haar_grid(hl.SU(n), points)
    phases = np.concatenate([angles, -angles.sum(axis=1, keepdims=True)], axis=1)
    eigenvalues = np.exp(1j * phases)
    loops = eigenvalues.sum(axis=1)
    kernel = np.exp(2 * lam * (loops[:, None] * loops[None, :].conj()).real)
    site = np.prod(1 + z * eigenvalues, axis=1)
    values = np.linalg.eigvals(kernel * (site * weights)[None, :])
    return values[np.argsort(-np.abs(values))]


@pytest.mark.parametrize(
    ("n", "lam", "z", "points"), [(2, 0.2, 0.3, 60), (3, 0.1, 0.3, 24), (3, 0.05, 0.6, 24)]
)
def test_spectrum_against_quadrature_on_the_torus(n, lam, z, points):
    spectrum = MIXED[n].spectrum(levels=4, lam=lam, z=z)
    expected = torus_levels(n, lam, z, points)[:4]
    assert referees.distance(spectrum.eigenvalues, expected) <= spectrum.eigenvalue_error.max() + 1e-11
    assert (spectrum.error < 1e-9).all()


def test_a_small_basis_is_honest():
    small = MIXED[2].spectrum(levels=2, cutoff=12, lam=0.2, z=0.3)
    best = MIXED[2].spectrum(levels=2, lam=0.2, z=0.3)
    assert np.isfinite(small.eigenvalue_error[0])
    assert abs(small.eigenvalues[0] - best.eigenvalues[0]) <= small.eigenvalue_error[0]
    open_ = MIXED[3].spectrum(levels=3, cutoff=4, lam=0.2, z=0.3)
    assert np.isinf(open_.error).any()
    assert "does not close" in open_.status


def test_vectors_satisfy_k_w():
    from haarloom.numerics.compile import compile_transfer

    spectrum = MIXED[3].spectrum(levels=3, cutoff=6, lam=0.1, z=0.3)
    matrix = compile_transfer(MIXED[3], 6)(lam=0.1, z=0.3)
    assert np.allclose(matrix @ spectrum.right, spectrum.right * spectrum.eigenvalues, rtol=0, atol=1e-12)
    assert np.allclose(spectrum.left.T @ spectrum.right, np.eye(3), rtol=0, atol=1e-9)


def test_charge_conjugation_holds_for_the_coupling_too():
    both = hl.RingModel(exponential_coupling(SU3, "lam"), hl.static_fermions(SU3, "z", "zbar"))
    one = both.spectrum(levels=4, lam=0.1, z=0.4, zbar=0.1)
    other = both.spectrum(levels=4, lam=0.1, z=0.1, zbar=0.4)
    assert referees.distance(one.masses, other.masses) <= one.error.max() + other.error.max()


def test_scans_and_single_points_agree():
    table = MIXED[2].scan(lam=[0.1, 0.2], z=0.3, progress=False)
    for row, lam in enumerate((0.1, 0.2)):
        single = MIXED[2].spectrum(levels=4, lam=lam, z=0.3)
        assert np.allclose(
            table["mass_real"].values[row], single.masses.real, rtol=0, atol=single.error.max()
        )


def test_what_needs_a_diagonal_link_says_so():
    with pytest.raises(ConvergenceError, match="mixes irreps: certification"):
        MIXED[2].certify(levels=2, lam=0.2, z=0.3)
    with pytest.raises(ConvergenceError, match=r"mixes irreps: .*series"):
        MIXED[2].series("z", lam=0.2)


def test_branches_along_a_line_of_couplings_are_right_or_refused():
    from haarloom.numerics.branches import masses_along

    found = masses_along(MIXED[3], "z", [0.1, 0.3], levels=4, cutoff=8, lam=0.1)
    for row, z in enumerate((0.1, 0.3)):
        single = MIXED[3].spectrum(levels=4, lam=0.1, z=z)
        assert referees.distance(found.masses[row], single.masses) <= 1e-6
        # what is stated must hold
        for mass, error in zip(found.masses[row], found.error[row], strict=True):
            assert np.abs(single.masses - mass).min() <= error + single.error.max()
