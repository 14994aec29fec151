"""The Wilson action: floats, exact symbols and proven bounds against one another and against other routes."""

from __future__ import annotations

import pickle
from fractions import Fraction

import numpy as np
import pytest
import sympy
from hypothesis import given
from hypothesis import strategies as st

from haarloom.actions import wilson
from haarloom.actions.wilson import WilsonCoefficient
from haarloom.actions.wilson_kernel import wilson_floats, wilson_fraction, wilson_shell_bound
from haarloom.algebra.group import SU
from haarloom.exceptions import ParameterError

BETA = sympy.Symbol("beta")


@pytest.mark.parametrize(
    ("n", "cutoff", "beta"),
    [
        (2, 5, 2.3), (2, 3, 200.0), (3, 5, 0.01), (3, 5, 6.0), (3, 4, 100.0), (3, 2, 3000.0), (4, 3, 12.0),
        (4, 2, 500.0), (5, 2, 30.0), (6, 2, 40.0), (7, 1, 50.0), (8, 1, 0.5), (8, 1, 100.0),
    ],
)  # fmt: skip
def test_floats_are_within_their_stated_error_of_long_integers(n: int, cutoff: int, beta: float) -> None:
    irreps = SU(n).irreps(cutoff)
    k, error = wilson_floats(irreps, np.array([beta / n]))
    for value, slack, irrep in zip(k[0], error[0], irreps, strict=True):
        exact = wilson_fraction(irrep, Fraction(beta / n), 90)
        assert abs(Fraction(float(value)) - exact) <= Fraction(float(slack))
        assert slack <= 1e-8 * value


@given(st.floats(0.0, 40.0), st.floats(0.0, 40.0))
def test_coefficients_rise_with_the_coupling_and_stay_below_one(first: float, second: float) -> None:
    low, high = sorted((first, second))
    irreps = SU(3).irreps(3)
    k, error = wilson_floats(irreps, np.array([low, high]) / 3)
    assert np.all(k[0] <= k[1] + error.sum(axis=0))
    assert np.all(k <= 1 + error)
    assert np.all(k >= -error)


def test_zero_coupling_leaves_the_trivial_irrep_alone() -> None:
    for n in (2, 3, 4):
        k, _ = wilson(SU(n), 0).coefficients_at(SU(n).irreps(2), {})
        assert k.tolist() == [1.0] + [0.0] * (len(k) - 1)


@pytest.mark.parametrize("n", [3, 4, 5, 6])
@pytest.mark.parametrize("beta", [0.5, 6.0, 40.0])
def test_the_walk_bound_is_above_every_coefficient_of_its_shells(n: int, beta: float) -> None:
    G, x = SU(n), np.array([beta / n])
    for shell in (1, 3, 5 if n < 5 else 4):
        ring = [r for r in G.irreps(shell) if sum(r.labels) == shell]
        assert wilson_floats(ring, x)[0].max() <= wilson_shell_bound(n, shell, x)[0]


@pytest.mark.parametrize("n", range(2, 9))
def test_the_symmetric_irrep_has_the_least_dimension_of_its_shell(n: int) -> None:
    # the premise of wilson_shell_bound
    for shell in range(1, 5 if n < 6 else 4):
        ring = [r.dimension for r in SU(n).irreps(shell) if sum(r.labels) == shell]
        assert min(ring) == sympy.binomial(shell + n - 1, n - 1)


@pytest.mark.parametrize(("n", "beta"), [(2, 5.0), (3, 6.0), (3, 60.0), (4, 10.0)])
def test_largest_outside_is_a_bound_and_not_a_wild_one(n: int, beta: float) -> None:
    G = SU(n)
    link = wilson(G, "beta", plaquettes=3)
    outside = [r for r in G.irreps(6) if sum(r.labels) > 2]
    largest = link.coefficients_at(outside, {"beta": beta})[0].max()
    bound = float(link.largest_outside(2, {"beta": beta}))
    assert largest <= bound <= largest * 1.01 + 1e-12


def test_values_keep_their_shape_and_repeat_nothing() -> None:
    G = SU(3)
    k, error = wilson(G, "beta").coefficients_at(G.irreps(2), {"beta": [[1.0, 2.0], [1.0, 6.0]]})
    assert k.shape == error.shape == (2, 2, 6)
    assert np.array_equal(k[0, 0], k[1, 0])


def test_strips_are_powers() -> None:
    G = SU(3)
    one, _ = wilson(G, 5).coefficients_at(G.irreps(2), {})
    four, error = wilson(G, 5, plaquettes=4).coefficients_at(G.irreps(2), {})
    assert np.all(np.abs(four - one**4) <= error)
    assert wilson(G, BETA, 4).coefficient(G.adjoint) == wilson(G, BETA).coefficient(G.adjoint) ** 4


def test_symbols_are_shared_by_conjugates_and_survive_pickling() -> None:
    G = SU(3)
    link = wilson(G, "beta")
    assert link.coefficient(G.irrep("6")) == link.coefficient(G.irrep("6bar"))
    assert link.coefficient(G.trivial) == 1
    expression = link.coefficient(G.irrep(2, 1)) ** 2 + BETA
    assert pickle.loads(pickle.dumps(expression)) == expression
    assert expression.subs(BETA, 0) == 0


@pytest.mark.parametrize("name", ["3", "8", "6"])
def test_derivatives_agree_with_the_series(name: str) -> None:
    G = SU(3)
    irrep, order = G.irrep(name), 9
    link = wilson(G, "beta")
    slope = link.coefficient(irrep).diff(BETA)
    by_terms = slope.replace(
        lambda e: isinstance(e, WilsonCoefficient),
        lambda e: link.strong_coupling(e.irrep, order),
    )
    difference = sympy.expand(by_terms - link.strong_coupling(irrep, order).diff(BETA))
    assert all(difference.coeff(BETA, power) == 0 for power in range(order))


def test_evalf_has_any_number_of_digits() -> None:
    G = SU(3)
    symbol = wilson(G, "beta").coefficient(G.adjoint)
    short, long = (symbol.evalf(digits, subs={"beta": 6}) for digits in (40, 500))
    assert abs(short - long) < sympy.Float(10) ** -39
    assert str(long).startswith("0.16225979947993817758")
    assert symbol.subs(BETA, 6).evalf(15) == pytest.approx(0.162259799479938, rel=1e-14)


@pytest.mark.parametrize("n", [2, 3])
def test_doit_writes_the_bessel_determinants(n: int) -> None:
    G = SU(n)
    written = WilsonCoefficient(n, BETA, *G.adjoint.labels).doit()
    if n == 2:
        assert written == sympy.besseli(3, BETA) / sympy.besseli(1, BETA)
    else:
        assert written.has(sympy.Sum)
        assert written.has(sympy.besseli)


@pytest.mark.parametrize("bad", [-1, "-0.5", 1j])
def test_negative_and_complex_couplings_are_refused(bad: object) -> None:
    with pytest.raises(ParameterError, match=r"beta = .* must be a real number ≥ 0"):
        wilson(SU(3), bad)
    with pytest.raises(ParameterError, match="first argument must be the group"):
        wilson(3, 1)
