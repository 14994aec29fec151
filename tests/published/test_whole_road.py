"""The whole road on Ember-I (an invented model), against theory and a plain script of another route."""

from __future__ import annotations

from math import comb

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import iv

import haarloom as hl

G = hl.SU(3)
EMBER = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))


def plain_matrix(t: float, z: float, cutoff: int) -> np.ndarray:
    """T by a route that knows neither irreps nor products: alternants sampled on the torus of eigenphases.

    ⟨r|W|s⟩ = ∫ χ_r* W χ_s over a full grid with the Weyl measure; characters as quotients of determinants
    of powers (H. Weyl), W = ∏(1 + z e^{iθ}), C₂ = (p² + q² + pq)/3 + p + q (Slansky 1981).
    """
    labels = [(p, level - p) for level in range(cutoff + 1) for p in range(level, -1, -1)]
    points = 2 * cutoff + 7
    line = 2 * np.pi * (np.arange(points) + 0.5) / points
    a, b = (grid.ravel() for grid in np.meshgrid(line, line + 0.1))
    x = np.exp(1j * np.array([a, b, -a - b]))

    def alternant(rows):
        return np.linalg.det(np.moveaxis(np.array([x**row for row in rows]), -1, 0))

    delta = alternant((2, 1, 0))
    numerators = np.array([alternant((p + q + 2, q + 1, 0)) for p, q in labels])
    site = np.prod(1 + z * x, axis=0)
    # |Δ|² of the measure cancels the denominators of the two characters.
    assert np.mean(np.abs(delta) ** 2) == pytest.approx(6)
    elements = (numerators.conj() * site) @ numerators.T / (6 * points**2)
    roots = np.exp(-t / 2 * np.array([(p * p + q * q + p * q) / 3 + p + q for p, q in labels]))
    return (roots[:, None] * elements * roots).real


def plain_masses(t: float, z: float, cutoff: int, levels: int) -> np.ndarray:
    eigenvalues = np.linalg.eigvals(plain_matrix(t, z, cutoff)).astype(complex)
    eigenvalues = eigenvalues[np.argsort(-np.abs(eigenvalues))]
    return -np.log(eigenvalues[1:levels] / eigenvalues[0])


def multiset(masses: np.ndarray) -> np.ndarray:
    """Sorted by real, then imaginary part, blind to rounding: the order of a pair is a convention."""
    return np.array(sorted(masses, key=lambda m: (round(m.real, 7), round(m.imag, 7))))


def test_matrix_against_the_plain_script():
    for t, z in ((1.0, 0.3), (0.7, 1.6)):
        ours = EMBER.transfer_matrix(cutoff=5).numeric(t=t, z=z)
        assert np.allclose(ours, plain_matrix(t, z, 5), rtol=0, atol=1e-13)


@pytest.mark.parametrize("z", [0.1, 0.3, 0.38, 0.5, 1.0, 2.5])
def test_masses_against_the_plain_script(z):
    spectrum = EMBER.spectrum(levels=6, t=1, z=z)
    allowed = spectrum.error.max() + 1e-10
    assert np.allclose(multiset(spectrum.masses), multiset(plain_masses(1.0, z, 8, 6)), rtol=0, atol=allowed)


def test_without_matter_the_masses_are_the_string_tensions():
    """t C₂ of 3, 3bar and 8 at t = 1: 4/3, 4/3, 3 (common practice)."""
    spectrum = EMBER.spectrum(levels=4, t=1, z=0)
    assert np.allclose(spectrum.masses, [4 / 3, 4 / 3, 3], rtol=0, atol=1e-13)
    assert np.all(np.abs(spectrum.masses - [4 / 3, 4 / 3, 3]) <= spectrum.error)


def test_real_at_half_filling_and_complex_below():
    """T is Hermitian at z = 1 with z̄ = 0, and a conjugate pair lies in between."""
    assert np.array_equal(
        EMBER.transfer_matrix(6).numeric(t=1, z=1), EMBER.transfer_matrix(6).numeric(t=1, z=1).T
    )
    assert np.all(EMBER.spectrum(t=1, z=1).masses.imag == 0)
    pair = EMBER.spectrum(levels=3, t=1, z=0.3)
    assert pair.verdicts[:2] == ("complex pair", "complex pair")
    assert pair.masses[0] == np.conj(pair.masses[1])
    assert abs(pair.masses[0].imag) > 1e6 * pair.error[0]


@given(z=st.floats(0.05, 0.95), t=st.floats(0.6, 2.0))
def test_particle_hole_symmetry(z, t):
    """With z̄ = 0 every mass is the same at z and 1/z, W(1/z; P) = z^{-3} W(z; P†)."""
    low, high = EMBER.spectrum(levels=4, t=t, z=z), EMBER.spectrum(levels=4, t=t, z=1 / z)
    allowed = low.error.max() + high.error.max()
    assert np.allclose(multiset(low.masses), multiset(high.masses), rtol=0, atol=allowed + 1e-12)


def test_leading_eigenvalue_is_the_same_at_any_cutoff_within_its_error():
    best = EMBER.spectrum(levels=2, t=0.5, z=0.4, cutoff=14)
    seen = []
    for cutoff in range(3, 10):
        spectrum = EMBER.spectrum(levels=2, t=0.5, z=0.4, cutoff=cutoff)
        distance = abs(spectrum.eigenvalues[0] - best.eigenvalues[0])
        assert distance <= spectrum.eigenvalue_error[0] + best.eigenvalue_error[0]
        seen.append(spectrum.eigenvalue_error[0])
    assert seen[0] > 1e3 * seen[-1], "the stated error must shrink with the cutoff, or it says nothing"


@pytest.mark.parametrize("cutoff", [0, 4, 8])
def test_basis_sizes(cutoff):
    """Irreps of SU(N) with Σ a_i ≤ K: a binomial coefficient (28 for SU(3), K = 6; 45 for K = 8)."""
    for n in (2, 3, 4, 5):
        assert len(hl.SU(n).irreps(cutoff)) == comb(cutoff + n - 1, n - 1)


def test_wilson_link_of_su2_in_closed_form():
    """exp[(β/2) tr U] = Σ_j (2j+1) w_j χ_j with w_j ∝ I_{2j+1}(β) (DLMF 10.35), k_j = (w_j/w_0)^{N_t}."""
    H = hl.SU(2)
    model = hl.RingModel(hl.wilson(H, "beta", plaquettes=3), hl.static_fermions(H, "z"))
    masses = model.spectrum(levels=4, beta=2.0, z=0).masses
    ratio = iv([2, 3, 4], 2.0) / iv(1, 2.0)
    assert np.allclose(masses, -3 * np.log(ratio), rtol=0, atol=1e-12)
