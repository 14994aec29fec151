"""Conversions between couplings, matching curves, string tensions."""

from __future__ import annotations

import numpy as np
import pytest
import sympy

from haarloom.actions import convert_coupling, heat_kernel, manton, matching_curve, mixed_wilson, wilson
from haarloom.actions.matching import OBSERVABLES, matching_coupling
from haarloom.algebra.group import SU
from haarloom.exceptions import ConvergenceError, ParameterError


@pytest.mark.parametrize("n", [2, 3, 5])
@pytest.mark.parametrize("given", ["g2", "beta", "tau"])
@pytest.mark.parametrize("wanted", ["g2", "beta", "tau"])
def test_conversions_invert_exactly(n: int, given: str, wanted: str) -> None:
    x = sympy.Symbol("x")
    there = convert_coupling(SU(n), x, given, wanted)  # type: ignore[arg-type]
    assert sympy.simplify(convert_coupling(SU(n), there, wanted, given) - x) == 0  # type: ignore[arg-type]


def test_conversions_by_their_definitions() -> None:
    assert convert_coupling(SU(3), 6, "beta", "g2") == 1
    assert convert_coupling(SU(3), 6, "beta", "tau") == sympy.Rational(1, 2)
    with pytest.raises(ParameterError, match="known are"):
        convert_coupling(SU(3), 6, "beta", "alpha")  # type: ignore[arg-type]
    with pytest.raises(ParameterError, match="> 0"):
        convert_coupling(SU(3), 0, "beta", "g2")


@pytest.mark.parametrize("n", [2, 3, 4])
@pytest.mark.parametrize("observable", ["string tension", "coefficient"])
def test_matching_curves_invert(n: int, observable: str) -> None:
    G = SU(n)
    beta = np.array([0.5, 2.0, 6.0, 20.0])
    there = matching_curve(wilson(G, "beta"), heat_kernel(G, "t"), beta, observable)  # type: ignore[arg-type]
    back = matching_curve(heat_kernel(G, "t"), wilson(G, "beta"), there.y, observable)  # type: ignore[arg-type]
    assert np.abs(back.y - beta).max() < 1e-10
    assert np.all(np.abs(back.y - beta) <= back.error + 1e-11)
    assert np.all(there.error < 1e-10)


def test_the_matched_heat_kernel_time_is_the_tension_over_the_casimir() -> None:
    G = SU(3)
    curve = matching_curve(wilson(G, "beta"), heat_kernel(G, "t"), [6.0])
    k, _ = wilson(G, 6).coefficients_at([G.fundamental], {})
    assert curve.y[0] == pytest.approx(-np.log(k[0]) / (4 / 3), rel=1e-13)
    assert curve.value[0] == pytest.approx(-np.log(k[0]), rel=1e-13)


def test_strips_of_different_length_match_per_plaquette() -> None:
    G = SU(3)
    one = matching_curve(wilson(G, "beta"), manton(G, "b"), [6.0])
    four = matching_curve(wilson(G, "beta", 4), manton(G, "b", 2), [6.0])
    assert one.y[0] == pytest.approx(four.y[0], rel=1e-10)


def test_other_irreps_and_ratios_as_observables() -> None:
    G = SU(3)
    curve = matching_curve(wilson(G, "beta"), heat_kernel(G, "t"), [6.0], irrep="8")
    k, _ = wilson(G, 6).coefficients_at([G.adjoint], {})
    assert curve.y[0] == pytest.approx(-np.log(k[0]) / 3, rel=1e-13)
    ratio = matching_curve(wilson(G, "beta"), wilson(G, "b", 2), [3.0], "tension ratio", "8")
    assert ratio.y[0] == pytest.approx(3.0, rel=1e-8)
    assert set(OBSERVABLES) == {"string tension", "coefficient", "tension ratio"}


def test_matching_refuses_what_it_cannot_do() -> None:
    G = SU(3)
    with pytest.raises(ParameterError, match="exactly one symbol"):
        matching_curve(mixed_wilson(G, {"3": "b", "8": "c"}), heat_kernel(G, "t"), [1.0])
    with pytest.raises(ParameterError, match="choose one of"):
        matching_curve(wilson(G, "b"), heat_kernel(G, "t"), [1.0], "mass")  # type: ignore[arg-type]
    with pytest.raises(ConvergenceError, match="No coupling t"):
        matching_coupling(-1.0, heat_kernel(G, "t"), G.fundamental)


def test_the_curve_shows_itself() -> None:
    G = SU(2)
    page = matching_curve(wilson(G, "beta"), heat_kernel(G, "t"), [1.0, 2.0])._repr_html_()
    assert page.count("<tr>") == 3
    assert "<path" in page


def test_string_tensions_and_casimir_scaling() -> None:
    G = SU(3)
    exact = heat_kernel(G, "t", 4).string_tensions(G.irreps(2), {"t": 2.0})
    assert exact.tension == pytest.approx([float(r.casimir(2)) / 2 for r in G.irreps(2)])
    assert np.abs(exact.deviation[1:]).max() < 1e-13
    found = wilson(G, "beta", 3).string_tensions([G.adjoint], {"beta": 6.0})
    assert found.ratio[0] == pytest.approx(2.11094, abs=1e-5)
    assert found.casimir_ratio[0] == 2.25
    assert "2.11094" in repr(found)
    assert "<td>8</td>" in found._repr_html_()
    negative = mixed_wilson(G, {"8": "c"}).string_tensions([G.adjoint], {"c": -1.0})
    assert np.isnan(negative.tension[0])
