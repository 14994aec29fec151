"""Link weights defined by a plaquette function: mixed, Manton, written; their series and their limits."""

from __future__ import annotations

import numpy as np
import pytest
import sympy

from haarloom.actions import (
    convergence_radius,
    diffusion_time,
    heat_kernel,
    link_from_plaquette,
    manton,
    mixed_wilson,
    wilson,
)
from haarloom.actions.large_coupling import quartic_moments
from haarloom.algebra.group import SU
from haarloom.exceptions import ClassFunctionError, ConvergenceError, ParameterError
from haarloom.torus.transform import character_coefficients

B, C = sympy.symbols("b c")


@pytest.mark.parametrize(("n", "beta"), [(2, 1.0), (2, 30.0), (3, 6.0), (3, 30.0), (4, 12.0), (5, 8.0)])
def test_three_spellings_of_the_wilson_action_agree(n: int, beta: float) -> None:
    G = SU(n)
    irreps = G.irreps(3 if n < 4 else 2)
    exact, slack = wilson(G, "beta", 2).coefficients_at(irreps, {"beta": beta})
    cosines = " + ".join(f"cos(theta_{j})" for j in range(1, n + 1))
    for link in (
        mixed_wilson(G, {"fundamental": "beta"}, 2),
        link_from_plaquette(G, f"exp(beta*(L + conj(L))/{2 * n})", 2),
        link_from_plaquette(G, f"exp(beta/{n}*({cosines}))", 2),
    ):
        k, error = link.coefficients_at(irreps, {"beta": beta})
        assert np.all(np.abs(k - exact) <= error + slack)
        assert error.max() < 1e-11


@pytest.mark.parametrize("n", [2, 3, 4])
def test_mixed_action_against_the_fourier_transform_on_the_whole_torus(n: int) -> None:
    G = SU(n)
    values = {"b": 2.0, "c": -1.0}
    link = mixed_wilson(G, {"fundamental": "b", "adjoint": "c"})
    irreps = G.irreps(2)
    w, _ = character_coefficients(
        G, lambda angles: link.plaquette_at(angles, values), irreps, {2: 48, 3: 32, 4: 20}[n]
    )
    dimensions = np.array([r.dimension for r in irreps])
    k, error = link.coefficients_at(irreps, values)
    assert np.abs((w / w[0]).real / dimensions - k).max() < 1e-10
    assert error.max() < 1e-11


def test_strong_coupling_series_sum_to_the_numbers() -> None:
    G = SU(3)
    for link in (
        wilson(G, "b", 2),
        mixed_wilson(G, {"3": "b", "8": "c"}),
        link_from_plaquette(G, "exp(b*(L + conj(L))/6 + c*chi(1, 1)/8)", 2),
    ):
        values = {"b": 0.3, "c": 0.2}
        k, error = link.coefficients_at(G.irreps(2), values)
        for irrep, value, slack in zip(G.irreps(2), k, error, strict=True):
            series = link.strong_coupling(irrep, 9)
            assert series.subs({B: 0.3, C: 0.2}) == pytest.approx(value, abs=float(slack) + 1e-10)
            assert all(number.is_Rational for number in sympy.Poly(series, B, C).coeffs())


def test_series_of_written_and_named_mixed_actions_are_the_same_polynomials() -> None:
    G = SU(3)
    named = mixed_wilson(G, {"3": "b", "8": "c"})
    written = link_from_plaquette(G, "exp(b*(L + conj(L))/6 + c*chi(1, 1)/8)")
    for irrep in G.irreps(2):
        assert sympy.expand(named.strong_coupling(irrep, 4) - written.strong_coupling(irrep, 4)) == 0


@pytest.mark.parametrize(
    ("n", "kind"),
    [(n, kind) for kind in ("Wilson", "mixed", "Manton") for n in (2, 3, 4)] + [(5, "Wilson"), (6, "Wilson")],
)
def test_large_couplings_are_met_to_third_order(n: int, kind: str) -> None:
    G = SU(n)
    link = {
        "Wilson": wilson(G, "b", 2),
        "mixed": mixed_wilson(G, {"fundamental": "b", "adjoint": "c"}, 2),
        "Manton": manton(G, "b", 2),
    }[kind]
    irrep = G.adjoint
    formula = link.large_coupling(irrep)
    rest = []
    for beta in (60.0 * n, 120.0 * n) if n < 4 else (30.0 * n, 60.0 * n):
        values = {"b": beta, "c": beta / 3}
        k, _ = link.coefficients_at([irrep], values)
        rest.append(abs(k[0] - float(formula.subs({B: beta, C: beta / 3}))))
    assert rest[0] / rest[1] == pytest.approx(8.0, rel=0.15)


@pytest.mark.parametrize("make", [wilson, manton])
def test_large_coupling_is_the_heat_kernel_up_to_second_order(make: object) -> None:
    G = SU(3)
    link = make(G, "b")  # type: ignore[operator]
    t = float(diffusion_time(link).subs(B, 200))
    assert t == pytest.approx(3 / 200)
    gaps = []
    for beta in (200.0, 400.0):
        k, _ = link.coefficients_at([G.adjoint], {"b": beta})
        h, _ = heat_kernel(G, "t").coefficients_at([G.adjoint], {"t": 3 / beta})
        gaps.append(abs(k[0] - h[0]))
    assert gaps[0] / gaps[1] == pytest.approx(4.0, rel=0.1)


def test_heat_kernel_states_its_own_limits() -> None:
    G = SU(3)
    t = sympy.Symbol("t")
    assert heat_kernel(G, "t").strong_coupling(G.adjoint, 3) == sympy.exp(-3 * t)
    assert sympy.expand(heat_kernel(G, "t").large_coupling(G.adjoint)) == 1 - 3 * t + 9 * t**2 / 2


@pytest.mark.parametrize("n", [2, 3, 4, 5])
def test_quartic_moments_reproduce_the_sum_over_weights(n: int, rng: np.random.Generator) -> None:
    G = SU(n)
    for irrep in (G.fundamental, G.adjoint, G.irrep(*([2] + [0] * (n - 2)))):
        theta = rng.normal(size=n)
        theta -= theta.mean()
        partial = np.cumsum(theta[:-1])
        direct = sum(count * float(np.dot(w, partial)) ** 4 for w, count in irrep.weights().items())
        a, b = quartic_moments(irrep)
        expected = float(a) * (theta**4).sum() + float(b) * (theta**2).sum() ** 2
        assert direct == pytest.approx(expected, rel=1e-10)


def test_radius_of_the_su2_series_is_the_first_zero_of_a_bessel_function() -> None:
    from scipy.special import jn_zeros

    found = convergence_radius(wilson(SU(2), "b"))
    assert found.radius == pytest.approx(jn_zeros(1, 1)[0], abs=1e-10)


def test_radius_of_the_su3_series_is_where_ratios_of_its_coefficients_say() -> None:
    # the root test on the exact series: |c_n|^{-1/n} scatters around the radius, its best values close in
    # on it
    G = SU(3)
    series = sympy.Poly(wilson(G, "b").strong_coupling(G.fundamental, 40), B)
    roots = [abs(float(series.coeff_monomial(B**m))) ** (-1 / m) for m in range(30, 41)]
    assert convergence_radius(wilson(G, "b")).radius == pytest.approx(8.205214, abs=1e-6)
    assert min(roots) == pytest.approx(8.205214, rel=0.06)


def test_no_series_where_there_is_none() -> None:
    G = SU(3)
    with pytest.raises(ClassFunctionError, match="no finite combination"):
        manton(G, "b").strong_coupling(G.fundamental, 3)
    with pytest.raises(ClassFunctionError, match="exactly one coupling"):
        convergence_radius(mixed_wilson(G, {"3": "b", "8": "c"}))
    with pytest.raises(ParameterError, match="order"):
        wilson(G, "b").strong_coupling(G.fundamental, -1)


def test_finite_plaquette_weights_stay_exact() -> None:
    G = SU(3)
    link = link_from_plaquette(G, "1 + b*(L + conj(L)) + c*chi(1, 1)", 2)
    assert link.coefficient(G.fundamental) == B**2 / 9
    assert link.coefficient(G.adjoint) == C**2 / 64
    assert link.coefficient(G.irrep("6")) == 0
    k, error = link.coefficients_at(G.irreps(2), {"b": 0.2, "c": 0.1})
    assert np.all(np.abs(k - [1, 0.04 / 9, 0.04 / 9, 0, 0.01 / 64, 0]) <= error)


def test_named_coefficients_evaluate_to_the_numbers() -> None:
    G = SU(3)
    link = manton(G, "b", 2)
    symbol = link.coefficient(G.adjoint)
    [value], _ = link.coefficients_at([G.adjoint], {"b": 3.0})
    assert float(symbol.subs(B, 3).evalf()) == pytest.approx(value, rel=1e-12)
    assert symbol.free_symbols == {B}


@pytest.mark.parametrize(
    ("make", "error", "words"),
    [
        (lambda: mixed_wilson(SU(3), {"3": 1, "3bar": 1}), ParameterError, "same for 3 and 3bar"),
        (lambda: mixed_wilson(SU(3), {"1": 1}), ParameterError, "trivial irrep"),
        (lambda: mixed_wilson(SU(3), {"3": 1j}), ParameterError, "real"),
        (lambda: mixed_wilson(SU(3), {}), ParameterError, "table"),
        (lambda: manton(SU(3), -1), ParameterError, "≥ 0"),
        (lambda: link_from_plaquette(SU(3), "L + conj(L)"), ClassFunctionError, "no meaning"),
        (lambda: link_from_plaquette(SU(3), "cos(theta_1)"), ClassFunctionError, "not symmetric"),
        (
            lambda: link_from_plaquette(SU(3), "1/(9 - L*conj(L))").coefficients_at(SU(3).irreps(1), {}),
            ConvergenceError,
            "pole on the torus",
        ),
    ],
)
def test_bad_plaquette_weights_are_refused(make: object, error: type[Exception], words: str) -> None:
    with pytest.raises(error, match=words):
        make()  # type: ignore[operator]
