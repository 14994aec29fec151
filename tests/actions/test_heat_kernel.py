"""The heat kernel: coefficients, its proven bound, and the sum over windings."""

from __future__ import annotations

import numpy as np
import pytest
import sympy
from hypothesis import given
from hypothesis import strategies as st

from haarloom.actions import heat_kernel
from haarloom.actions.windings import shortest_phases
from haarloom.algebra.group import SU
from haarloom.exceptions import MissingValueError, ParameterError
from haarloom.torus.characters import characters
from haarloom.torus.determinant_forms import WindingGaussian


def test_coefficients_are_exponentials_of_casimirs() -> None:
    G = SU(3)
    t = sympy.Symbol("t")
    assert heat_kernel(G, "t").coefficient(G.adjoint) == sympy.exp(-3 * t)
    assert heat_kernel(G, 1).coefficient(G.fundamental) == sympy.exp(-sympy.Rational(4, 3))
    assert heat_kernel(G, "tau*N_t").parameters == (sympy.Symbol("N_t"), sympy.Symbol("tau"))


@given(st.integers(2, 6), st.floats(0, 20))
def test_numbers_agree_with_the_exact_expressions(n: int, t: float) -> None:
    G = SU(n)
    irreps = G.irreps(3 if n < 5 else 2)
    k, error = heat_kernel(G, "t").coefficients_at(irreps, {"t": t})
    for value, slack, irrep in zip(k, error, irreps, strict=True):
        exact = sympy.exp(-sympy.Rational(t) * irrep.casimir(2)).evalf(40)
        assert abs(sympy.Float(float(value), 40) - exact) <= slack


def test_shapes_follow_the_values() -> None:
    G = SU(3)
    k, error = heat_kernel(G, "t").coefficients_at(G.irreps(2), {"t": np.ones((4, 5)), "z": np.ones(3)})
    assert k.shape == error.shape == (4, 5, 6)


@pytest.mark.parametrize("n", range(2, 9))
def test_the_bound_outside_is_the_largest_coefficient_there(n: int) -> None:
    G = SU(n)
    link = heat_kernel(G, "t")
    for cutoff in range(3):
        shells = [r for r in G.irreps(cutoff + 2) if sum(r.labels) > cutoff]
        k, _ = link.coefficients_at(shells, {"t": 0.37})
        bound = link.largest_outside(cutoff, {"t": 0.37})
        assert k.max() <= bound <= k.max() * (1 + 1e-12)


@pytest.mark.parametrize(
    ("n", "cutoff", "tau"),
    [(2, 60, 0.1), (2, 40, 1.0), (3, 40, 0.1), (3, 20, 1.0), (3, 10, 9.0), (4, 12, 0.8), (5, 6, 2.0)],
)
def test_windings_sum_to_the_characters(n: int, cutoff: int, tau: float, rng: np.random.Generator) -> None:
    G = SU(n)
    irreps = G.irreps(cutoff)
    angles = rng.uniform(-np.pi, np.pi, (8, n - 1))
    angles[0] = 0.0
    angles[1] = 1e-4 * np.arange(n - 1)
    angles[2] = 2 * np.pi / n  # an element of the centre other than 1
    weights = np.array([r.dimension * np.exp(-tau * float(r.casimir(2))) for r in irreps])
    expected = (characters(irreps, angles) @ weights).real
    found = heat_kernel(G, tau).plaquette_at(angles, {})
    assert np.abs(found - expected).max() <= 1e-11 * np.abs(expected).max()


def test_two_plaquettes_halve_the_time_of_each() -> None:
    G = SU(3)
    one = heat_kernel(G, 1).plaquette_at(np.array([0.3, 0.5]), {})
    two = heat_kernel(G, 2, plaquettes=2).plaquette_at(np.array([0.3, 0.5]), {})
    assert one == pytest.approx(two)


@given(st.lists(st.floats(-20, 20), min_size=3, max_size=3))
def test_shortest_phases_are_the_same_element_and_never_longer(phases: list[float]) -> None:
    given_phases = np.array([[*phases, -sum(phases)]])
    [short] = shortest_phases(given_phases)
    assert abs(short.sum()) < 1e-9
    assert np.allclose(np.exp(1j * short), np.exp(1j * given_phases[0]))
    assert (short**2).sum() <= (given_phases**2).sum() + 1e-9
    for i in range(4):
        for j in range(4):
            step = np.eye(4)[i] - np.eye(4)[j]
            assert (short**2).sum() <= ((short + 2 * np.pi * step) ** 2).sum() + 1e-9


@pytest.mark.parametrize("bad", [-1, -0.1, 2j, "-2"])
def test_negative_and_complex_times_are_refused(bad: object) -> None:
    with pytest.raises(ParameterError, match=r"t = .* must be a real number ≥ 0"):
        heat_kernel(SU(3), bad)


def test_bad_values_at_evaluation() -> None:
    G = SU(3)
    link = heat_kernel(G, "t")
    with pytest.raises(ParameterError, match="t = -1"):
        link.coefficients_at(G.irreps(1), {"t": [1.0, -1.0]})
    with pytest.raises(MissingValueError, match="No value for t"):
        link.coefficients_at(G.irreps(1), {})
    with pytest.raises(ParameterError, match="delta function"):
        link.plaquette_at(np.zeros(2), {"t": 0.0})


@pytest.mark.parametrize("plaquettes", [0, -2, 1.5, "2", True])
def test_plaquettes_are_whole_and_positive(plaquettes: object) -> None:
    with pytest.raises(ParameterError, match=r"plaquettes .* integer ≥ 1.*N_t counts"):
        heat_kernel(SU(2), "t", plaquettes)


@pytest.mark.parametrize(
    ("n", "tau", "cutoff"), [(2, 90.0, 4), (3, 21.0, 4), (4, 8.4, 5), (5, 4.2, 4), (6, 2.4, 4)]
)
def test_strong_coupling_has_no_cancellation(
    n: int, tau: float, cutoff: int, rng: np.random.Generator
) -> None:
    """Where windings would cancel to nine digits: all digits, coinciding eigenvalues included."""
    G = SU(n)
    phases = rng.uniform(-np.pi, np.pi, (6, n))
    phases[1], phases[2, 1], phases[3] = 0.0, phases[2, 0] + 1e-6, 0.4
    phases[:, -1] = -phases[:, :-1].sum(axis=1)
    irreps = G.irreps(cutoff)
    weights = np.array([r.dimension * np.exp(-tau * float(r.casimir(2))) for r in irreps])
    expected = (characters(irreps, phases) @ weights).real
    found = heat_kernel(G, "t").plaquette_at(phases, {"t": tau})
    assert np.abs(found - expected).max() < 1e-12


@pytest.mark.parametrize(("n", "tau"), [(7, 1.5), (8, 1.0)])
def test_both_sums_meet_where_many_colours_change_over(n: int, tau: float, rng: np.random.Generator) -> None:
    """The sum over characters against the sum over windings, unrolled (P. Menotti, E. Onofri 1981)."""
    angles = rng.uniform(-np.pi, np.pi, (5, n - 1))
    found = heat_kernel(SU(n), "t").plaquette_at(angles, {"t": tau})
    other = WindingGaussian(SU(n), tau).at(angles)
    assert found is not None
    assert np.allclose(other * (found[0] / other[0]), found, rtol=1e-5)
