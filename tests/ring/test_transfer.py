"""The symbolic transfer matrix: elements worked out by hand, patterns, bad input."""

from __future__ import annotations

import inspect

import numpy as np
import pytest
import sympy

import haarloom as hl
from haarloom.exceptions import (
    GroupError,
    HaarloomError,
    LabelError,
    ParameterError,
    SizeError,
    UnknownNameError,
)
from haarloom.ring.model import OPTIONS
from haarloom.torus.characters import character
from haarloom.torus.quadrature import haar_grid

z, t = sympy.symbols("z t")


@pytest.fixture(scope="module")
def ember() -> hl.RingModel:
    G = hl.SU(3)
    return hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))


def test_elements_by_hand(ember):
    """W = 1 + z³ + z χ_3 + z² χ_3bar, 3⊗3 = 6 + 3bar, 3⊗3bar = 1 + 8: worked on paper."""
    T = ember.transfer_matrix(cutoff=2)
    third = sympy.exp(-2 * t / 3)
    expected = {
        ("1", "1"): 1 + z**3,
        ("3", "1"): z * third,
        ("1", "3"): z**2 * third,
        ("1", "3bar"): z * third,
        ("3bar", "3"): z * third**2,
        ("3", "3bar"): z**2 * third**2,
        ("6", "3"): z * third * sympy.exp(-sympy.Rational(5, 3) * t),
        ("8", "3"): z**2 * third * sympy.exp(-sympy.Rational(3, 2) * t),
        ("8", "1"): 0,
        ("8", "8"): (1 + z**3) * sympy.exp(-3 * t),
    }
    for pair, value in expected.items():
        assert sympy.simplify(T[pair] - value) == 0, pair


def test_matrix_agrees_with_indexing(ember):
    T = ember.transfer_matrix(cutoff=3)
    assert T.matrix.shape == (10, 10)
    assert T.basis[1].name == "3"
    assert T.matrix[1, 2] == T["3", "3bar"] == T[(1, 0), (0, 1)] == T[T.basis[1], T.basis[2]]


def test_pattern_respects_nality(ember):
    T = ember.transfer_matrix(cutoff=4)
    for row, marks in zip(T.basis, T.pattern(), strict=True):
        for column, filled in zip(T.basis, marks, strict=True):
            assert filled == (T[row, column] != 0)
    # W of the fundamental determinant holds N-alities 0, 1 and 2, each in the matching block alone.
    for (row, column), places in T.nality_blocks().items():
        assert all((T.basis[i].nality, T.basis[j].nality) == (row, column) for i, j in places)
    gluons_only = hl.RingModel(ember.link, hl.loop_field(hl.SU(3), {"8": "h"})).transfer_matrix(cutoff=3)
    assert all(row == column for row, column in gluons_only.nality_blocks())


def test_numeric_equals_symbolic(ember):
    T = ember.transfer_matrix(cutoff=4)
    exact = np.array(
        T.matrix.subs({z: sympy.Rational(3, 10), t: sympy.Rational(7, 5)}).evalf(20), dtype=float
    )
    assert np.allclose(T.numeric(z=0.3, t=1.4), exact, rtol=1e-14, atol=1e-16)


def test_wilson_elements_keep_their_bessel_coefficients():
    G = hl.SU(2)
    model = hl.RingModel(hl.wilson(G, "beta", plaquettes=2), hl.static_fermions(G, "z"))
    element = model.transfer_matrix(cutoff=1)["2", "1"]
    value = float(element.subs({"z": 0.5, "beta": 2}).evalf())
    # exp[(β/2) tr U] = Σ_j (2j+1) w_j χ_j, w_j ∝ I_{2j+1}(β), DLMF 10.35; two plaquettes: √k = w_{1/2}/w_0.
    from scipy.special import iv

    assert value == pytest.approx(0.5 * iv(2, 2.0) / iv(1, 2.0), rel=1e-13)


def test_static_bosons_give_an_exact_matrix_too():
    G = hl.SU(2)
    T = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_bosons(G, "z")).transfer_matrix(cutoff=2)
    # det(1 - zP)^{-1} = Σ z^k χ_k for SU(2), so ⟨1|W|r⟩ = z^{2j}.
    assert sympy.simplify(T["1", "3"] - z**2 * sympy.exp(-t)) == 0


@pytest.mark.parametrize(
    ("call", "error", "words"),
    [
        (lambda m: m.transfer_matrix(cutoff=-1), ParameterError, "integer ≥ 0"),
        (lambda m: m.transfer_matrix(cutoff=1.5), ParameterError, "an integer"),
        (lambda m: m.transfer_matrix(cutoff=True), ParameterError, "an integer"),
        (lambda m: m.transfer_matrix(cutoff=60), SizeError, "1,891 irreps"),
        (lambda m: m.transfer_matrix(cutoff=1)["3"], LabelError, "row and a column"),
        (lambda m: m.transfer_matrix(cutoff=1)["27", "1"], ParameterError, "cutoff ≥ 4"),
        (lambda m: m.transfer_matrix(cutoff=1).derivation("8", "1"), ParameterError, "outside the basis"),
        (lambda m: m.transfer_matrix(cutoff=1)["3bra", "1"], UnknownNameError, "3bar"),
        (lambda m: m.with_link(hl.heat_kernel(hl.SU(2), 1)), GroupError, "same group"),
        (lambda m: m.with_link(m.site), ParameterError, "link weight"),
    ],
)
def test_bad_input_is_named(ember, call, error, words):
    assert issubclass(error, HaarloomError)
    with pytest.raises(error, match=words):
        call(ember)


def test_a_link_that_mixes_irreps_gives_the_eigenvalues_of_the_symmetric_form():
    from haarloom.actions.exponential_coupling import exponential_coupling
    from haarloom.numerics.compile import compile_transfer

    model = hl.RingModel(exponential_coupling(hl.SU(3), "lam"), hl.static_fermions(hl.SU(3), "z"))
    T = model.transfer_matrix(cutoff=2)
    values = {"lam": 0.1, "z": 0.3}
    exact = np.array(
        T.matrix.subs({"lam": sympy.Rational(1, 10), "z": sympy.Rational(3, 10)}).evalf(), dtype=float
    )
    assert np.allclose(T.numeric(**values), exact, rtol=1e-12, atol=1e-14)
    symmetric = compile_transfer(model, 2)(**values)
    order = np.sort_complex
    assert np.allclose(order(np.linalg.eigvals(symmetric)), order(np.linalg.eigvals(exact)), atol=1e-12)


def test_a_parameter_may_not_have_the_name_of_an_option():
    G = hl.SU(3)
    with pytest.raises(ParameterError, match=r"named levels, .* rename them, for instance levels_1"):
        hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "levels"))


def test_every_option_of_the_models_methods_is_reserved():
    from haarloom.numerics import boundary, certify, exceptional, scan, series, spectrum

    methods = (
        spectrum.spectrum,
        certify.certify,
        series.series,
        exceptional.exceptional_point,
        boundary.complex_boundary,
        scan.scan,
    )
    options = {name for method in methods for name in inspect.signature(method).parameters}
    assert options - {"values"} <= OPTIONS


def test_many_copies_cost_no_more_than_the_irreps_of_the_basis(monkeypatch):
    """Of the 1,326 characters of W only those that can join two irreps of the basis are looked at."""
    G, asked = hl.SU(3), []
    site = hl.static_fermions(G, "z", copies=50)
    original = type(site).coefficient
    monkeypatch.setattr(type(site), "coefficient", lambda self, c: asked.append(c) or original(self, c))
    model = hl.RingModel(hl.heat_kernel(G, "t"), site)
    T = model.transfer_matrix(1)
    assert max(sum(irrep.labels) for irrep in asked) == 2
    numbers = {"t": 0.4, "z": 0.3}
    angles, weights = haar_grid(G, 120)
    density = site.density_at(angles, numbers) * weights
    expected = np.sum(character(G.fundamental, angles).conj() * density) * np.exp(-0.4 * 4 / 6)
    assert float(T["3", "1"].subs(numbers)) == pytest.approx(expected.real, rel=1e-12)
