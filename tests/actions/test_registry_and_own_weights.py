"""Every built-in weight is rebuilt from its description; a weight of one's own takes twenty lines."""

from __future__ import annotations

import pickle
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
import pytest
import sympy
from sympy import Expr

import haarloom.actions as actions
from haarloom.actions import REGISTRY, Link, LinkWeight, Site, SiteWeight, TorusSite, build
from haarloom.actions.parameters import Values, evaluate
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ClassFunctionError, DocumentError
from haarloom.torus.angles import full_angles

G = SU(3)
EXAMPLES: dict[str, tuple[Any, dict[str, complex]]] = {
    "heat kernel": (actions.heat_kernel(G, "t", 2), {"t": 1.0}),
    "Wilson": (actions.wilson(G, "2*b", 3), {"b": 3.0}),
    "mixed Wilson": (actions.mixed_wilson(G, {"3": "b", (1, 1): "1/3"}), {"b": 2.0}),
    "Manton": (actions.manton(G, 2.5), {}),
    "plaquette function": (actions.link_from_plaquette(G, "exp(b*(L + conj(L)) + tr(P, 3))", 2), {"b": 0.1}),
    "coefficient table": (actions.link_from_coefficients(G, {"1": 1, "3": "k"}), {"k": 0.2}),
    "loop coupling": (actions.loop_coupling(G, "lam"), {"lam": 0.1}),
    "exponential loop coupling": (actions.loop_coupling(G, "lam", "exponential"), {"lam": 0.1}),
    "bilinear coupling": (actions.bilinear_coupling(G, {("3", "8"): "I*a", ("8", "3"): "-I*a"}), {"a": 0.1}),
    "stacked strips": (actions.heat_kernel(G, "t") @ actions.wilson(G, "b"), {"t": 1.0, "b": 2.0}),
    "coupled link": (actions.heat_kernel(G, "t") * actions.loop_coupling(G, "lam"), {"t": 1.0, "lam": 0.1}),
    "static fermions": (
        actions.static_fermions(G, "exp(mu - m)", "y", 2, "6"),
        {"mu": 0.1, "m": 1.0, "y": 0.1},
    ),
    "static bosons": (actions.static_bosons(G, "z", 0.25, 2), {"z": 0.1}),
    "loop field": (actions.loop_field(G, {"8": "h", "3": 0.5}), {"h": 0.1}),
    "polynomial potential": (actions.polynomial_potential(G, "b2", 0.75, 7.5, "v"), {"b2": 1.0, "v": 1.0}),
    "logarithmic potential": (actions.logarithmic_potential(G, "a", "-b"), {"a": 1.0, "b": 2.0}),
    "Haar power": (actions.haar_power(G, "p"), {"p": 2.0}),
    "written site": (actions.site_from(G, "exp(h*L*conj(L))"), {"h": 0.1}),
    "product": (actions.static_fermions(G, "z") * actions.loop_field(G, {"8": "h"}), {"z": 0.1, "h": 0.1}),
}


def test_every_kind_has_an_example() -> None:
    assert set(EXAMPLES) == set(REGISTRY)


@pytest.mark.parametrize("kind", EXAMPLES)
def test_descriptions_rebuild_equal_weights(kind: str) -> None:
    weight, _ = EXAMPLES[kind]
    described = weight.describe()
    assert described["kind"] == kind == weight.kind
    again = build(G, described)
    assert again == weight
    assert hash(again) == hash(weight)
    assert pickle.loads(pickle.dumps(weight)) == weight
    assert _plain(described)


def _plain(value: Any) -> bool:
    if isinstance(value, Mapping):
        return all(isinstance(key, str) and _plain(entry) for key, entry in value.items())
    return all(map(_plain, value)) if isinstance(value, list) else isinstance(value, str | int)


@pytest.mark.parametrize("kind", EXAMPLES)
def test_weights_keep_their_protocol_in_shape_and_value(kind: str) -> None:
    weight, values = EXAMPLES[kind]
    family = REGISTRY[kind].family
    assert isinstance(weight, LinkWeight if family == "link" else SiteWeight)
    assert {symbol.name for symbol in weight.parameters} == set(values)
    irreps = G.irreps(2)
    numbers, error = weight.coefficients_at(irreps, values)
    assert numbers.shape == error.shape == (6,)
    exact = {sympy.Symbol(name): sympy.Rational(str(value)) for name, value in values.items()}
    for irrep, number, slack in list(zip(irreps, numbers, error, strict=True))[:5]:
        value = complex(sympy.sympify(weight.coefficient(irrep)).subs(exact).evalf())
        assert abs(value - number) <= 4 * slack + 1e-13
    assert weight.latex()
    if family == "link":
        kernel, _ = weight.kernel_at(irreps, values)
        assert kernel.shape == (6, 6)
        assert weight.kernel(irreps).shape == (6, 6)
        assert np.isfinite(weight.largest_outside(2, values))
        assert weight.formula()
    else:
        assert weight.norm_bound(values) > 0
        assert weight.tail_bound(2, values) >= 0
        assert np.isfinite(weight.density_at(np.array([[0.3, 0.4]]), values)).all()


@pytest.mark.parametrize("kind", sorted(REGISTRY))
def test_every_field_has_what_a_control_needs(kind: str) -> None:
    entry = REGISTRY[kind]
    assert entry.help
    for field in entry.fields:
        assert all((field.name, field.domain, field.help))
        if field.domain != "weights":
            assert field.default


@pytest.mark.parametrize(
    ("description", "words"),
    [
        ({"kind": "heat kernal", "t": "t"}, "did you mean heat kernel"),
        ({"kind": "Wilson"}, "missing: beta"),
        ({"kind": "Wilson", "beta": "b", "alpha": 1}, "unknown: alpha"),
        ({}, "Unknown kind"),
    ],
)
def test_descriptions_that_name_nothing_are_refused(description: dict[str, Any], words: str) -> None:
    with pytest.raises(DocumentError, match=words):
        build(G, description)


@dataclass(frozen=True)
class SpringLink(Link):
    """k_r = 1/(1 + s C₂(r)): a link weight that the package does not have."""

    group: SU
    s: Expr
    kind: ClassVar[str] = "spring"

    def coefficient(self, irrep: Irrep) -> Expr:
        return 1 / (1 + self.s * irrep.casimir(2))


@dataclass(frozen=True)
class PairSite(Site):
    """1 + a |L|²."""

    group: SU
    a: Expr
    kind: ClassVar[str] = "pairs"

    def class_function(self) -> ClassFunction:
        return self.a * self.group.loop * self.group.loop.conjugate() + 1


@dataclass(frozen=True)
class LorentzSite(TorusSite):
    """1/(a − |L|²/9)."""

    group: SU
    a: Expr
    kind: ClassVar[str] = "Lorentz"

    def density_at(self, angles: Any, values: Values) -> Any:
        [a] = evaluate([self.a], values)
        loop = np.exp(1j * full_angles(3, angles)).sum(axis=-1)
        return 1 / (a - np.abs(loop) ** 2 / 9)


def test_a_link_weight_of_ones_own() -> None:
    link = SpringLink(G, sympy.Symbol("s"))
    assert isinstance(link, LinkWeight)
    k, error = link.coefficients_at(G.irreps(1), {"s": [0.0, 1.0]})
    assert np.allclose(k, [[1, 1, 1], [1, 3 / 7, 3 / 7]])
    assert np.max(error) < 1e-13
    assert link.describe() == {"kind": "spring", "s": "s"}
    assert link.largest_outside(1, {"s": 1.0}) == pytest.approx(1 / 4)
    assert (link @ actions.heat_kernel(G, 1)).coefficient(G.adjoint).subs("s", 1) == sympy.exp(-3) / 4


def test_site_weights_of_ones_own() -> None:
    pairs = PairSite(G, sympy.Symbol("a"))
    assert isinstance(pairs, SiteWeight)
    assert pairs.coefficient(G.adjoint) == sympy.Symbol("a")
    assert pairs.reach({"a": 1.0}) == 2
    assert pairs.norm_bound({"a": 0.5}) == pytest.approx(1 + 0.5 * 9)
    both = pairs * LorentzSite(G, sympy.Symbol("b"))
    assert isinstance(both, SiteWeight)
    w, error = both.coefficients_at(G.irreps(2), {"a": 0.5, "b": 2.0})
    alone, _ = LorentzSite(G, sympy.Symbol("b")).coefficients_at(G.irreps(2), {"b": 2.0})
    # the trivial coefficient of a product: Σ_c w_c w′_c̄
    assert w[0] == pytest.approx(1.5 * alone[0] + 0.5 * alone[4], abs=float(error[0]) + 1e-13)


@dataclass(frozen=True)
class LopsidedSite(TorusSite):
    """Not a class function: it singles out the first eigenphase."""

    group: SU
    kind: ClassVar[str] = "lopsided"

    def density_at(self, angles: Any, values: Values) -> Any:
        return 2 + np.cos(np.asarray(angles)[..., 0])


def test_a_density_that_is_no_class_function_is_refused() -> None:
    with pytest.raises(ClassFunctionError, match=r"no class function: at eigenphases \("):
        LopsidedSite(G).coefficients_at(G.irreps(1), {})
