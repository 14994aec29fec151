"""The spectrum engine against general-purpose libraries and published closed forms, by other routes."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from mpmath import mp
from scipy.special import iv

import haarloom as hl
from numerics import referees
from numerics.models import EMBER, SU2, SU3


def discriminant_root(cutoff: int, low: str, high: str) -> mp.mpf:
    """z at which λ_1 and λ_2 meet at t = 1: zero of ((λ_1 − λ_2)/2)², analytic through the merger.

    The pair's sum and product come from a subspace iterated with T in mpmath: no Newton method on a bordered
    system, no irreps of the package.
    """

    def squared(z: mp.mpf) -> mp.mpf:
        matrix = referees.transfer(referees.heat(3, cutoff, 1), referees.fermions(3, cutoff, z))
        return _half_gap_squared(matrix)

    return mp.findroot(squared, (mp.mpf(low), mp.mpf(high)), solver="secant", tol=mp.mpf(10) ** -60)


def _half_gap_squared(matrix: mp.matrix) -> mp.mpf:
    """(tr² − 4 det)/4 of T on the invariant subspace of levels 1 and 2, by block inverse iteration."""
    size = matrix.rows
    numbers = np.array([[float(matrix[i, j]) for j in range(size)] for i in range(size)])
    values = np.linalg.eigvals(numbers)
    pair = values[np.argsort(-np.abs(values))[1:3]]
    shift = mp.mpf(float(pair.mean().real)) + mp.mpf(10) ** -8
    factors, pivots = mp.LU_decomp(matrix - shift * mp.eye(size))
    rng = np.random.default_rng(3)
    block = [mp.matrix([mp.mpf(float(x)) for x in rng.standard_normal(size)]) for _ in range(2)]
    for _ in range(40):
        before = block
        block = [mp.U_solve(factors, mp.L_solve(factors, x, pivots)) for x in block]
        block[0] /= mp.norm(block[0])
        block[1] -= (block[0].T * block[1])[0, 0] * block[0]
        block[1] /= mp.norm(block[1])
        missing = [x - sum(((b.T * x)[0, 0] * b for b in before), mp.zeros(size, 1)) for x in block]
        if max(mp.norm(x) for x in missing) < mp.mpf(10) ** (6 - mp.dps):
            break
    small = mp.matrix(2, 2)
    for i in range(2):
        for j in range(2):
            small[i, j] = (block[i].T * (matrix * block[j]))[0, 0]
    return (small[0, 0] - small[1, 1]) ** 2 / 4 + small[0, 1] * small[1, 0]


@pytest.mark.slow
def test_first_merger_of_ember_to_thirty_digits_with_a_proven_bracket():
    """t = 1, z between 0.3 and 0.5: a secant in mpmath at 40 digits against Newton and proof."""
    merger = EMBER.exceptional_point("z", (0.3, 0.5), digits=30, t=1)
    assert merger.proven
    low, high = merger.bracket
    assert high - low == Fraction(1, 10**30)
    mp.dps = 40
    expected = discriminant_root(7, "0.4101004", "0.4101005")
    value = mp.mpf(merger.value.numerator) / merger.value.denominator
    assert abs(value - expected) < mp.mpf(10) ** -30
    assert mp.mpf(low.numerator) / low.denominator < expected < mp.mpf(high.numerator) / high.denominator


@pytest.mark.parametrize("plaquettes", [1, 4])
def test_su2_wilson_masses_without_matter(plaquettes):
    """k_j = (I_{2j+1}(β)/I_1(β))^{N_t} up to dimensions (DLMF 10.35; A. A. Migdal, JETP 42 (1975) 413)."""
    model = hl.RingModel(hl.wilson(SU2, "beta", plaquettes=plaquettes), hl.static_fermions(SU2, "z"))
    masses = model.spectrum(levels=5, beta=3.0, z=0).masses
    orders = np.arange(2, 6)
    ratio = iv(orders, 3.0) / iv(1, 3.0)
    assert np.allclose(masses, -plaquettes * np.log(ratio), rtol=0, atol=1e-11)


@pytest.mark.parametrize("n", [2, 3, 4, 5])
def test_heat_kernel_masses_are_casimirs(n):
    """m_r = t C₂(r) (P. Menotti, E. Onofri, Nucl. Phys. B 190 (1981) 288); C₂ from Young diagrams."""
    G = hl.SU(n)
    model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    spectrum = model.spectrum(levels=9, t=0.7, z=0)
    casimirs = sorted(
        float(referees.casimir(labels)) for labels in referees.label_list(n, 10 if n == 2 else 6)
    )[1:9]
    assert np.allclose(np.sort(spectrum.masses.real), 0.7 * np.array(casimirs), rtol=0, atol=1e-12)


def test_gross_witten_ratio_of_fundamental_and_trivial():
    """k_3 of the SU(3) Wilson action by SciPy quadrature over the eigenphases (Weyl's formula)."""
    from scipy.integrate import dblquad

    beta = 5.0

    def weight(second, first):
        phases = np.exp(1j * np.array([first, second, -first - second]))
        pairs = [(0, 1), (0, 2), (1, 2)]
        measure = np.prod([abs(phases[a] - phases[b]) ** 2 for a, b in pairs])
        return phases.sum().real, measure * np.exp(beta / 3 * phases.sum().real)

    box = (-np.pi, np.pi, -np.pi, np.pi)
    options = {"epsabs": 1e-9, "epsrel": 1e-9}
    norm = dblquad(lambda b, a: weight(b, a)[1], *box, **options)[0]
    loop = dblquad(lambda b, a: np.prod(weight(b, a)), *box, **options)[0] / 3
    model = hl.RingModel(hl.wilson(SU3, "beta"), hl.static_fermions(SU3, "z"))
    mass = model.spectrum(levels=2, beta=beta, z=0).masses[0]
    assert mass.real == pytest.approx(-np.log(loop / norm), abs=1e-8)
