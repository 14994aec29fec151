"""The compiled transfer matrix against the symbolic one."""

from __future__ import annotations

import numpy as np
import pytest

import haarloom as hl
from haarloom.actions.exponential_coupling import exponential_coupling
from haarloom.exceptions import MissingValueError, ParameterError, SizeError
from haarloom.numerics.compile import compile_transfer
from numerics.models import EMBER, EMBER_BOTH, SU3, TINTED

SU4 = hl.SU(4)
CASES = [
    (EMBER, 4, {"t": 0.7, "z": 0.3}),
    (EMBER_BOTH, 3, {"t": 0.7, "z": 0.3, "zbar": 0.2}),
    (hl.RingModel(hl.heat_kernel(SU4, "t"), hl.static_fermions(SU4, "z", copies=2)), 2, {"t": 0.5, "z": 0.2}),
    (hl.RingModel(hl.wilson(SU3, "beta"), hl.static_fermions(SU3, "z")), 2, {"beta": 5.0, "z": 0.3}),
    (
        hl.RingModel(hl.heat_kernel(SU3, "t"), hl.static_fermions(SU3, "z", irrep="6")),
        3,
        {"t": 0.9, "z": 0.3},
    ),
]


@pytest.mark.parametrize(("model", "cutoff", "values"), CASES)
def test_equals_the_symbolic_matrix(model, cutoff, values):
    symbolic = model.transfer_matrix(cutoff).matrix
    named = {symbol: values[symbol.name] for symbol in symbolic.free_symbols}
    expected = np.array(symbolic.evalf(30, subs=named).tolist(), dtype=complex)
    found = compile_transfer(model, cutoff)(**values)
    assert found.dtype == np.float64
    assert np.allclose(found, expected, rtol=1e-13, atol=1e-15)


def test_arrays_broadcast_against_each_other():
    compiled = compile_transfer(EMBER, 3)
    t, z = np.array([[0.5], [1.0], [1.5]]), np.array([0.1, 0.2])
    stacked = compiled(t=t, z=z)
    assert stacked.shape == (3, 2, 10, 10)
    assert np.array_equal(stacked[1, 1], compiled(t=1.0, z=0.2))


def test_complex_values_and_negative_link_coefficients_give_complex_matrices():
    assert compile_transfer(EMBER, 2)(t=1.0, z=0.3j).dtype == np.complex128
    table = hl.link_from_coefficients(SU3, {"1": 1, "3": "-1/4", "3bar": "-1/4"})
    matrix = compile_transfer(hl.RingModel(table, hl.static_fermions(SU3, "z")), 1)(z=0.5)
    assert matrix[0, 1].imag == pytest.approx(0.125)


def test_a_kernel_that_mixes_irreps_gives_k_w():
    """No matrix root: K W, similar to T; its elements against the symbolic kernel evaluated by quadrature."""
    model = hl.RingModel(exponential_coupling(SU3, "lam"), hl.static_fermions(SU3, "z"))
    compiled = compile_transfer(model, 2)
    from haarloom.torus.characters import characters
    from haarloom.torus.quadrature import haar_grid

    angles, weights = haar_grid(SU3, 24)
    chi = characters(compiled.basis, angles)
    loops = chi[:, 1]
    density = np.exp(2 * 0.1 * (loops[:, None] * loops[None, :].conj()).real)
    kernel = np.einsum("a,ar,ab,bs,b->rs", weights, chi.conj(), density, chi, weights)
    site = compile_transfer(EMBER, 2)(t=0.0, z=0.3)
    assert np.allclose(compiled(lam=0.1, z=0.3), kernel @ site, rtol=0, atol=1e-10)


def test_infinite_site_weight_against_torus_quadrature():
    from haarloom.torus.characters import characters
    from haarloom.torus.quadrature import haar_grid

    compiled = compile_transfer(TINTED, 3)
    angles, weights = haar_grid(SU3, 60)
    chi = characters(compiled.basis, angles)
    density = TINTED.site.density_at(angles, {"h": 0.4})
    expected = np.einsum("a,ar,a,as->rs", weights, chi.conj(), density, chi)
    assert np.allclose(compiled(t=0.0, h=0.4), expected, rtol=0, atol=1e-12)


def test_what_is_wrong_is_said():
    compiled = compile_transfer(EMBER, 3)
    with pytest.raises(MissingValueError, match="no value for z"):
        compiled(t=1.0)
    with pytest.raises(ParameterError, match="'q' is no parameter"):
        compiled(t=1.0, z=0.3, q=1)
    with pytest.raises(ParameterError, match="not finite"):
        compiled(t=1.0, z=np.nan)
    with pytest.raises(ParameterError, match="do not broadcast"):
        compiled(t=np.ones(3), z=np.ones(2))
    with pytest.raises(SizeError, match="GB for"):
        compiled(t=1.0, z=np.zeros(10_000_000))
    with pytest.raises(SizeError, match=r"irreps|elements"):
        compile_transfer(EMBER, 10_000)
