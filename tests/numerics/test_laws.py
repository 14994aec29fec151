"""Laws of the spectrum as properties: where it must be real, and what must not change it.

The reasons are symmetries of W on the group; each test is named after its law.
"""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

import haarloom as hl
from numerics import referees
from numerics.models import EMBER, EMBER_BOTH, SU2, SU3

few = settings(max_examples=15)
couplings = st.floats(0.3, 2.0)
fugacities = st.floats(0.0, 1.5)

TWO_COLOURS = hl.RingModel(hl.heat_kernel(SU2, "t"), hl.static_fermions(SU2, "z", "zbar", copies=2))
ISOSPIN = hl.RingModel(
    hl.heat_kernel(SU3, "t"), hl.static_fermions(SU3, "z", "zbar") * hl.static_fermions(SU3, "zbar", "z")
)


def assert_real(spectrum):
    assert spectrum.verdicts == ("real",) * len(spectrum.masses)
    assert np.abs(np.sin(spectrum.masses.imag)).max() <= 1e-7, "real levels have Im m = 0 or π"


def assert_same(one, other):
    allowed = one.error.max() + other.error.max()
    # of a pair at the last level either member may be listed
    upper = [spectrum.masses.real + 1j * np.abs(spectrum.masses.imag) for spectrum in (one, other)]
    assert referees.distance(*upper) <= allowed + 1e-12


@few
@given(t=couplings, z=fugacities, zbar=fugacities)
def test_su2_is_real_at_every_chemical_potential(t, z, zbar):
    """Irreps of SU(2) are pseudo-real: W(P†) = W(P), T is symmetric whatever z and z̄."""
    assert_real(TWO_COLOURS.spectrum(levels=4, t=t, z=z, zbar=zbar))


@few
@given(t=couplings, size=st.floats(0.0, 0.9), angle=st.floats(0.0, 2 * np.pi))
def test_imaginary_chemical_potential_is_real(t, size, angle):
    """z = r e^{iθ}, z̄ = r e^{−iθ}: W(P) = |det(1 + zP)|² is a real function on the group, T is Hermitian."""
    z = size * np.exp(1j * angle)
    assert_real(EMBER_BOTH.spectrum(levels=4, t=t, z=z, zbar=np.conj(z)))


@few
@given(t=couplings)
def test_without_matter_masses_are_casimirs(t):
    """z = 0: m = t C₂, hence 4t/3, 4t/3, 3t for SU(3) (common practice)."""
    spectrum = EMBER.spectrum(levels=4, t=t, z=0)
    assert_real(spectrum)
    assert np.allclose(spectrum.masses, [4 * t / 3, 4 * t / 3, 3 * t], rtol=0, atol=1e-12)


@few
@given(t=couplings, z=st.floats(0.05, 0.999))
def test_particles_and_holes(t, z):
    """det(1 + P/z) = z^{−3} det(1 + zP†) for z̄ = 0: every mass is the same at z and 1/z."""
    assert_same(EMBER.spectrum(levels=4, t=t, z=z), EMBER.spectrum(levels=4, t=t, z=1 / z))


@few
@given(t=couplings, z=fugacities, zbar=fugacities)
def test_charge_conjugation(t, z, zbar):
    """P ↔ P† exchanges z and z̄ and leaves the spectrum."""
    one = EMBER_BOTH.spectrum(levels=4, t=t, z=z, zbar=zbar)
    assert_same(one, EMBER_BOTH.spectrum(levels=4, t=t, z=zbar, zbar=z))


@few
@given(t=couplings)
def test_half_filling_is_hermitian(t):
    """z = 1, z̄ = 0: W(P†) = W(P) because det P = 1."""
    assert_real(EMBER.spectrum(levels=4, t=t, z=1.0))


@few
@given(t=couplings, z=fugacities, zbar=st.floats(0.0, 0.6))
def test_isospin_chemical_potential_is_real(t, z, zbar):
    """Two flavours at opposite chemical potentials: W is real and T Hermitian."""
    assert_real(ISOSPIN.spectrum(levels=4, t=t, z=z, zbar=zbar))


@few
@given(t=couplings, z=st.floats(0.0, 1.5), zbar=st.floats(0.0, 0.5))
def test_complex_masses_come_in_conjugate_pairs(t, z, zbar):
    """CK: T is real in the characters, so that levels are real or come with their conjugates."""
    spectrum = EMBER_BOTH.spectrum(levels=9, t=t, z=z, zbar=zbar)
    sizes = np.abs(spectrum.eigenvalues)
    whole = spectrum.eigenvalues[sizes > sizes[-1] * (1 + 1e-9)]
    assert referees.distance(whole, np.conj(whole)) <= spectrum.eigenvalue_error.max() + 1e-13


@few
@given(t=couplings, z=st.floats(0.0, 0.9), turn=st.integers(1, 2))
def test_centre_rotations_leave_the_spectrum(t, z, turn):
    """z → z e^{2πi/3} is P times a centre element: characters turn by their N-ality."""
    rotated = EMBER.spectrum(levels=4, t=t, z=z * np.exp(2j * np.pi * turn / 3))
    assert_same(EMBER.spectrum(levels=4, t=t, z=z), rotated)


def test_masses_of_a_trace_over_the_ring():
    """Σ_n λ_n^S = Tr T^S: all eigenvalues together against matrix powers."""
    from haarloom.numerics.compile import compile_transfer

    spectrum = EMBER.spectrum(levels=28, cutoff=6, t=0.6, z=0.4)
    matrix = compile_transfer(EMBER, 6)(t=0.6, z=0.4)
    for sites in (1, 2, 5):
        trace = np.trace(np.linalg.matrix_power(matrix, sites))
        assert abs((spectrum.eigenvalues**sites).sum() - trace) <= 1e-12 * trace


def test_a_common_phase_of_all_eigenvalues_makes_no_mass_complex():
    """z = e^{iα} with z̄ = 0: W = z^{3/2} times a Hermitian function at z = 1 turned by the centre's U(1)."""
    G = hl.SU(3)
    model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    spectrum = model.spectrum(levels=4, t=1, z=np.exp(0.3j))
    assert np.all(np.abs(spectrum.masses.imag) <= spectrum.error)
    assert "complex" not in spectrum.verdicts
