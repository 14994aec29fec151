"""Site weights that the user writes, potentials, and powers of the reduced measure."""

from __future__ import annotations

import numpy as np
import pytest
import sympy
from hypothesis import given
from hypothesis import strategies as st

from haarloom.actions import (
    haar_power,
    logarithmic_potential,
    loop_field,
    polynomial_potential,
    site_from,
    static_fermions,
)
from haarloom.actions.base import Site
from haarloom.algebra.group import SU
from haarloom.exceptions import (
    ClassFunctionError,
    ConvergenceError,
    ExpressionError,
    LabelError,
    ParameterError,
)
from haarloom.torus.quadrature import haar_integral

VALUES = {"h": 0.3, "z": 0.4}


@pytest.mark.parametrize(
    ("text", "built_in"),
    [
        ("1 + z*L + z^2*L* + z^3", static_fermions(SU(3), "z")),
        ("exp(h*(L + conj(L)))", loop_field(SU(3), {"3": "h", "3bar": "h"})),
        ("exp(h*(L*conj(L) - 1))", loop_field(SU(3), {"8": "h"})),
        ("exp(h*chi(1, 1))", loop_field(SU(3), {"8": "h"})),
        ("(1 + z*exp(I*theta_1))*(1 + z*exp(I*theta_2))*(1 + z*exp(I*theta_3))", static_fermions(SU(3), "z")),
        ("(1 + z*x_1)*(1 + z*x_2)*(1 + z*x_3)", static_fermions(SU(3), "z")),
        ("1 + z*L + z^2*(L^2 - tr(P, 2))/2 + z^3", static_fermions(SU(3), "z")),
    ],
)
def test_written_weights_equal_the_built_in_ones(text: str, built_in: Site, rng: np.random.Generator) -> None:
    site = site_from(SU(3), text)
    assert site.finite == built_in.finite
    angles = rng.uniform(-3, 3, (6, 2))
    assert np.allclose(site.density_at(angles, VALUES), built_in.density_at(angles, VALUES), rtol=1e-12)
    irreps = SU(3).irreps(3)
    w, error = site.coefficients_at(irreps, VALUES)
    other, slack = built_in.coefficients_at(irreps, VALUES)
    assert np.all(np.abs(w - other) <= error + slack + 1e-15)
    assert np.max(error) < 1e-12
    if built_in.finite:
        assert site.class_function() == built_in.class_function()


def test_estimated_tail_is_above_the_true_one_and_falls() -> None:
    site = site_from(SU(3), "exp(h*(L + conj(L)))")
    proven = loop_field(SU(3), {"3": "h", "3bar": "h"})
    many = SU(3).irreps(14)
    w, _ = proven.coefficients_at(many, VALUES)
    for cutoff in (2, 4, 6):
        beyond = sum(abs(v) * r.dimension for v, r in zip(w, many, strict=True) if sum(r.labels) > cutoff)
        assert beyond <= site.tail_bound(cutoff, VALUES) * 1.0001
        assert site.tail_bound(cutoff, VALUES) <= 5 * beyond + 1e-11
    assert site.tail_bound(100, VALUES) < 1e-30


def test_arrays_of_values_are_taken_point_by_point() -> None:
    site = site_from(SU(2), "exp(h*L)/(2 + z*L)")
    w, error = site.coefficients_at(SU(2).irreps(2), {"h": [0.1, 0.2, 0.3], "z": [[0.1], [0.5]]})
    assert w.shape == error.shape == (2, 3, 3)
    one, _ = site.coefficients_at(SU(2).irreps(2), {"h": 0.3, "z": 0.5})
    assert np.allclose(w[1, 2], one)


@pytest.mark.parametrize(
    ("text", "values", "error", "words"),
    [
        ("P + 1", {}, ClassFunctionError, "P is a matrix"),
        ("cos(theta_1)", {}, ClassFunctionError, "not symmetric"),
        ("theta_1^2 + theta_2^2 + theta_3^2", {}, ClassFunctionError, "not periodic"),
        ("x_1 - x_2", {}, ClassFunctionError, "not symmetric"),
        ("chi(1)", {}, LabelError, "label"),
        ("tr(P, 1/2)", {}, ExpressionError, "whole number"),
        ("import os", {}, ExpressionError, "operator"),
        ("1/(a - L*conj(L))", {"a": 4.0}, ConvergenceError, "pole on the torus"),
        ("1/(L - 1)", {}, ConvergenceError, "pole on the torus"),
        ("log(a - L*conj(L))", {"a": 4.0}, ConvergenceError, r"infinite at eigenphases \("),
        ("sqrt(a - L*conj(L))", {"a": 4.0}, ConvergenceError, "branch cut on the torus"),
        ("sqrt(1 + L)", {}, ConvergenceError, "branch cut on the torus"),
        ("log(1 + L)", {}, ConvergenceError, "torus"),
    ],
)
def test_what_is_no_regular_class_function_is_refused_with_its_place(
    text: str, values: dict[str, float], error: type[Exception], words: str
) -> None:
    with pytest.raises(error, match=words):
        site_from(SU(3), text).coefficients_at(SU(3).irreps(1), values)


def test_regular_ones_near_by_are_accepted() -> None:
    for text in ("1/(12 - L*conj(L))", "log(12 - L*conj(L))", "sqrt(9 - L*conj(L))", "sqrt(4 + L)"):
        w, error = site_from(SU(3), text).coefficients_at(SU(3).irreps(2), {})
        assert np.max(error) < 1e-10 * np.abs(w).max()


def test_other_things_are_no_class_functions() -> None:
    for thing in (None, [1], SU(2).loop, object()):
        with pytest.raises(ClassFunctionError):
            site_from(SU(3), thing)  # type: ignore[arg-type]
    assert site_from(SU(3), SU(3).loop * 2 + 1).coefficient(SU(3).fundamental) == 2
    assert site_from(SU(3), 1).support() == (SU(3).trivial,)


@pytest.mark.parametrize("n", [2, 3, 4, 5])
def test_whole_powers_of_the_reduced_measure_are_exact(n: int, rng: np.random.Generator) -> None:
    site = haar_power(SU(n), 2 if n < 4 else 1)
    assert site.finite
    angles = rng.uniform(-3, 3, (5, n - 1))
    assert np.allclose(site.class_function().at(angles), site.density_at(angles, {}), atol=1e-12)
    assert site.density_at(2 * np.pi / n * np.arange(n - 1) - (n - 1) * np.pi / n, {}) == pytest.approx(1.0)


@given(st.floats(1.0, 3.0))
def test_fractional_powers_against_a_finer_rule(power: float) -> None:
    site = haar_power(SU(2), "p")
    w, error = site.coefficients_at([SU(2).trivial], {"p": power})
    # (2/π) ∫ sin^{2p+2}: a beta function
    exact = 2 / sympy.pi * sympy.beta(power + sympy.Rational(3, 2), sympy.Rational(1, 2))
    assert abs(w[0] - float(exact.evalf(20))) <= error[0]


def test_potentials_against_the_haar_integral_of_their_published_form() -> None:
    G = SU(3)

    def loops(angles: np.ndarray) -> np.ndarray:
        full = np.concatenate([angles, -angles.sum(axis=-1, keepdims=True)], axis=-1)
        return np.exp(1j * full).sum(axis=-1) / 3

    def polynomial(angles: np.ndarray) -> np.ndarray:
        ell = loops(angles)
        size = abs(ell) ** 2
        return np.exp(-2.0 * (-1.1 / 2 * size - 0.75 / 6 * (ell**3 + ell.conj() ** 3) + 7.5 / 4 * size**2))

    def logarithmic(angles: np.ndarray) -> np.ndarray:
        ell = loops(angles)
        size = abs(ell) ** 2
        inside = 1 - 6 * size + 4 * (ell**3 + ell.conj() ** 3).real - 3 * size**2
        return np.exp(1.5 / 2 * size) * np.maximum(inside, 0) ** 2

    cases = (
        (polynomial_potential(G, "b2", 0.75, 7.5, volume=2), {"b2": 1.1}, polynomial),
        (logarithmic_potential(G, "a", "b"), {"a": 1.5, "b": -2.0}, logarithmic),
    )
    for site, values, published in cases:
        w, error = site.coefficients_at([G.trivial], values)
        expected, slack = haar_integral(G, published, 40)
        assert abs(w[0] - expected) <= error[0] + slack + 1e-13
        assert site.norm_bound(values) >= 0.999 * np.abs(site.density_at(np.zeros((1, 2)), values))[0]


@pytest.mark.parametrize(
    ("make", "words"),
    [
        (lambda: logarithmic_potential(SU(3), 1, 2), "b = 2 is not allowed.*θ_i = θ_j"),
        (lambda: logarithmic_potential(SU(3), 1, "b").density_at(np.zeros((1, 2)), {"b": 0.5}), "b = 0.5"),
        (lambda: logarithmic_potential(SU(3), 1j, -1), "a = 0\\+1j"),
        (lambda: polynomial_potential(SU(3), 1, 1, 1, volume=-1), "volume = -1"),
        (lambda: haar_power(SU(3), -0.5), "power = -0.5"),
        (lambda: haar_power(SU(3), "p").coefficients_at(SU(3).irreps(0), {"p": -1.0}), "power = -1"),
    ],
)
def test_singular_potentials_are_refused(make: object, words: str) -> None:
    with pytest.raises(ParameterError, match=words):
        make()  # type: ignore[operator]
