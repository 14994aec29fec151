"""The one door to numbers: Ember-I, symmetries, errors, premises, refusals."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import haarloom as hl
from haarloom.exceptions import ConvergenceError, MissingValueError, ParameterError, SizeError
from haarloom.numerics.spectrum import spectrum
from haarloom.ring.model import RingModel


def test_ember_without_matter_has_the_string_tensions(ember: RingModel) -> None:
    found = spectrum(ember, levels=6, t=1, z=0)
    np.testing.assert_allclose(found.masses, [4 / 3, 4 / 3, 3, 10 / 3, 10 / 3], atol=1e-13)
    assert set(found.verdicts) == {"real"}
    assert "parts" in found.status


def test_ember_turns_complex_and_back(ember: RingModel) -> None:
    middle, end = spectrum(ember, t=1, z=0.3), spectrum(ember, t=1, z=1)
    assert middle.verdicts[:2] == ("complex pair", "complex pair")
    # of a pair the mass with Im m > 0 comes first
    assert middle.masses[0].imag > 0 > middle.masses[1].imag
    assert set(end.verdicts) == {"real"}
    assert "Perron" in middle.status
    assert "simple" in middle.status


@given(z=st.floats(0.02, 0.98), t=st.floats(0.3, 2.0))
def test_particles_and_holes_have_the_same_masses(z: float, t: float) -> None:
    group = hl.SU(3)
    model = RingModel(hl.heat_kernel(group, "t"), hl.static_fermions(group, "z"))
    one, other = spectrum(model, levels=4, t=t, z=z), spectrum(model, levels=4, t=t, z=1 / z)
    # a level next to a merger may stand in either order
    apart = np.abs(one.masses[:, None] - other.masses[None, :]).min(axis=1)
    assert (apart <= one.error + other.error.max()).all()


@given(z=st.floats(0.05, 1.2), t=st.floats(0.3, 1.5), cutoff=st.integers(2, 5))
def test_error_covers_the_truth(z: float, t: float, cutoff: int) -> None:
    """Eigenvalues at a small cutoff lie within their radii of those at a large one."""
    group = hl.SU(3)
    model = RingModel(hl.heat_kernel(group, "t"), hl.static_fermions(group, "z"))
    rough = spectrum(model, levels=4, cutoff=cutoff, t=t, z=z)
    good = spectrum(model, levels=9, cutoff=12, t=t, z=z)
    for value, radius in zip(rough.eigenvalues, rough.eigenvalue_error, strict=True):
        assert np.abs(good.eigenvalues - value).min() <= radius + good.eigenvalue_error[0]


def test_ground_level_is_the_same_for_any_cutoff(ember: RingModel) -> None:
    found = [spectrum(ember, levels=2, cutoff=cutoff, t=1, z=0.4) for cutoff in range(2, 9)]
    best = found[-1].eigenvalues[0]
    for one in found:
        assert abs(one.eigenvalues[0] - best) <= one.eigenvalue_error[0] + found[-1].eigenvalue_error[0]


def test_vectors_are_biorthonormal(ember: RingModel) -> None:
    for values in ({"t": 1, "z": 0.3}, {"t": 0.01, "z": 0.3}, {"t": 1, "z": 1}, {"t": 1, "z": 0.3j}):
        found = spectrum(ember, levels=5, **values)
        np.testing.assert_allclose(found.left.T @ found.right, np.eye(5), atol=1e-10)
        assert found.right.shape == (len(found.basis), 5)
        assert (found.condition >= 1 - 1e-12).all()


def test_imaginary_chemical_potential_is_real() -> None:
    """At z = e^{iθ} ζ, z̄ = e^{−iθ} ζ W is a real function, so that T is Hermitian."""
    group = hl.SU(3)
    model = RingModel(hl.heat_kernel(group, "t"), hl.static_fermions(group, "z", "zb"))
    found = spectrum(model, t=1, z=0.3 * np.exp(0.7j), zb=0.3 * np.exp(-0.7j))
    assert set(found.verdicts) == {"real"}
    np.testing.assert_allclose(found.masses.imag, 0, atol=1e-13)


@given(z=st.floats(0.01, 3.0), zb=st.floats(0.0, 1.0))
def test_su2_is_real_at_every_chemical_potential(z: float, zb: float) -> None:
    group = hl.SU(2)
    model = RingModel(hl.heat_kernel(group, "t"), hl.static_fermions(group, "z", "zb", copies=2))
    assert set(spectrum(model, levels=4, t=1, z=z, zb=zb).verdicts) == {"real"}


def test_as_many_particles_as_antiparticles_are_real(ember_both: RingModel) -> None:
    """z = z̄: W is a real function of P."""
    assert set(spectrum(ember_both, t=1, z=0.4, zb=0.4).verdicts) == {"real"}


def test_complex_fugacity_says_that_the_premise_fails(ember: RingModel) -> None:
    found = spectrum(ember, t=1, z=0.3j)
    assert "do not apply" in found.status
    assert set(found.verdicts) <= {"complex", "undecided"}


def test_weak_coupling_goes_to_the_krylov_solver(ember: RingModel) -> None:
    found = spectrum(ember, levels=7, t=0.01, z=0.3)
    assert found.solver == "Krylov"
    assert (found.error < 1e-11).all()
    larger = spectrum(ember, levels=7, cutoff=found.cutoff + 10, t=0.01, z=0.3)
    assert (np.abs(found.masses - larger.masses) <= found.error + larger.error).all()


def test_infinite_site_weights() -> None:
    group = hl.SU(3)
    link = hl.heat_kernel(group, "t")
    for site, values in (
        (hl.static_bosons(group, "z"), {"z": 0.3}),
        (hl.loop_field(group, {"3": "h", "3bar": "hb"}), {"h": 0.3, "hb": 0.1}),
    ):
        model = RingModel(link, site)
        found, larger = (
            spectrum(model, levels=4, t=1, **values),
            spectrum(model, levels=4, cutoff=10, t=1, **values),
        )
        assert (np.abs(found.masses - larger.masses) <= found.error + larger.error).all()
        assert (found.error < 1e-9).all()


def test_link_of_finite_rank_has_infinite_masses() -> None:
    group = hl.SU(3)
    found = spectrum(
        RingModel(hl.loop_coupling(group, "lam"), hl.static_fermions(group, "z")), levels=5, lam=0.1, z=0.3
    )
    assert np.isfinite(found.masses[:2]).all()
    assert np.isinf(found.masses[2:].real).all()
    assert "rank 3" in found.status


def test_short_cutoff_is_said(ember: RingModel) -> None:
    found = spectrum(ember, levels=4, cutoff=1 + 1, t=0.1, z=0.5)
    assert np.isinf(found.error).any()
    assert "does not close" in found.status


def test_bound_that_cannot_close() -> None:
    """A link whose coefficients do not fall: t = 0 is the unit operator."""
    group = hl.SU(3)
    model = RingModel(hl.heat_kernel(group, "t"), hl.static_fermions(group, "z"))
    with pytest.raises(ConvergenceError, match="does not close"):
        spectrum(model, t=0, z=0.3)
    assert np.isinf(spectrum(model, levels=3, cutoff=3, t=0, z=0.3).error).all()


@pytest.mark.parametrize(
    ("options", "error", "match"),
    [
        ({"t": 1}, MissingValueError, "z"),
        ({"t": 1, "z": np.inf}, ParameterError, "finite"),
        ({"t": 1, "z": [0.1, 0.2]}, ParameterError, "several numbers"),
        ({"t": 1, "z": 0.3, "levels": 0}, ParameterError, "levels"),
        ({"t": 1, "z": 0.3, "levels": 7, "cutoff": 2}, ParameterError, "7 levels are more than the 6 irreps"),
        ({"t": 1, "z": 0.3, "cutoff": -1}, ParameterError, "cutoff"),
        ({"t": 1, "z": 0.3, "cutoff": 100_000}, SizeError, r"^[\d,.]+ GB"),
    ],
)
def test_refusals(ember: RingModel, options: dict[str, object], error: type, match: str) -> None:
    with pytest.raises(error, match=match):
        spectrum(ember, **options)


def test_faces(ember: RingModel) -> None:
    found = spectrum(ember, levels=3, t=1, z=0.3)
    assert "m_1 = 1.386" in repr(found)
    assert "complex pair" in found._repr_html_()
