"""Derivations: each statement replays on the torus, and a corrupted one does not."""

from __future__ import annotations

from dataclasses import dataclass, replace

import pytest
import sympy

import haarloom as hl
from haarloom.actions import Link
from haarloom.ring.claims import (
    ElementClaim,
    ExpansionClaim,
    KernelClaim,
    LinkFactorClaim,
    OverlapClaim,
    ProductClaim,
    SelectionClaim,
    SiteElementClaim,
)
from haarloom.ring.torus_function import form_scale


def ember(n: int = 3, **options) -> hl.RingModel:
    G = hl.SU(n)
    return hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z", **options))


MODELS = {
    "fundamental, SU(3)": (ember(), [("3", "3bar"), ("1", "1"), ("8", "3"), ("6", "6bar"), ("8", "1")]),
    "with antiparticles, SU(3)": (ember(zbar="w", copies=2), [("8", "8"), ("3", "6")]),
    "fundamental, SU(2)": (ember(2), [("2", "3"), ("1", "3")]),
    "fundamental, SU(4)": (ember(4), [("4", "6"), ("15", "15")]),
    "Wilson, SU(3)": (
        hl.RingModel(hl.wilson(hl.SU(3), "beta", plaquettes=2), hl.static_fermions(hl.SU(3), "z")),
        [("3", "3bar")],
    ),
    "loop field, SU(3)": (
        hl.RingModel(hl.heat_kernel(hl.SU(3), "t"), hl.loop_field(hl.SU(3), {"3": "h", "3bar": "h"})),
        [("3", "8")],
    ),
}
CASES = [(name, pair) for name, (_, pairs) in MODELS.items() for pair in pairs]


@pytest.mark.parametrize(("name", "pair"), CASES, ids=lambda value: str(value))
def test_every_statement_replays(name, pair):
    model, _ = MODELS[name]
    derivation = model.transfer_matrix(cutoff=4).derivation(*pair)
    verification = derivation.verify()
    assert verification.passed, verification
    assert derivation.element == model.transfer_matrix(cutoff=4)[pair]


def corrupted(claim):
    """The same claim with one thing wrong, of the kind that goes wrong by hand."""
    match claim:
        case ExpansionClaim(terms=terms):
            return replace(claim, terms=((terms[0][0], 2 * terms[0][1]), *terms[1:]))
        case SelectionClaim(components=components):
            return replace(claim, components=components[1:])
        case ProductClaim(terms=terms):
            return replace(claim, terms=((terms[0][0], terms[0][1] + 1), *terms[1:]))
        case OverlapClaim(value=value):
            return replace(claim, value=value + 1)
        case SiteElementClaim(value=value):
            return replace(claim, value=value.subs("z", 1 / sympy.Symbol("z")))
        case LinkFactorClaim(value=value):
            return replace(claim, value=value**2)
        case ElementClaim(value=value):
            return replace(claim, value=-value)


@pytest.mark.parametrize("pair", [("8", "3"), ("3", "3bar")], ids=str)
def test_each_corrupted_statement_fails(pair):
    derivation = ember().transfer_matrix(cutoff=2).derivation(*pair)
    assert derivation.verify().passed
    for place, step in enumerate(derivation.steps):
        for number, claim in enumerate(step.claims):
            wrong = (*step.claims[:number], corrupted(claim), *step.claims[number + 1 :])
            steps = (*derivation.steps[:place], replace(step, claims=wrong), *derivation.steps[place + 1 :])
            verification = replace(derivation, steps=steps).verify()
            assert not verification.passed, (step.title, claim)
            assert [outcome.passed for outcome in verification.steps].index(False) == place


def test_small_link_coefficients_are_still_checked():
    """k_(4,4) is about 1e-5 at the random point; a wrong Casimir there must not hide in the tolerance."""
    derivation = ember().transfer_matrix(cutoff=8).derivation((4, 4), (4, 4))
    assert derivation.verify().passed
    step = derivation.steps[-1]
    t = sympy.Symbol("t")
    wrong = replace(step.claims[0], value=sympy.exp(-25 * t), root=sympy.exp(-25 * t / 2))
    spoiled = replace(
        derivation, steps=(*derivation.steps[:-1], replace(step, claims=(wrong, *step.claims[1:])))
    )
    assert not spoiled.verify().passed


def test_what_cannot_be_replayed_is_said_and_does_not_pass():
    """Gauss's rule needs more nodes on the alcove of SU(5) than fit; the finite statements still replay."""
    G = hl.SU(5)
    model = hl.RingModel(hl.manton(G, "beta"), hl.static_fermions(G, "z"))
    verification = model.transfer_matrix(1).derivation("5", "1").verify()
    assert not verification.passed
    assert all(step.passed for step in verification.steps)
    assert [bool(step.not_replayed) for step in verification.steps] == [False, False, False, True]
    assert "does not settle" in repr(verification)


def test_coefficients_without_a_weight_behind_them_are_said_to_be_such():
    @dataclass(frozen=True)
    class Bare(Link):
        group: hl.SU
        k: sympy.Expr

        def coefficient(self, irrep):
            return self.k ** sum(irrep.labels)

    model = hl.RingModel(Bare(hl.SU(3), sympy.Symbol("k")), hl.static_fermions(hl.SU(3), "z"))
    verification = model.transfer_matrix(1).derivation("3", "1").verify()
    assert not verification.passed
    assert "give it a plaquette weight (plaquette_at) or a kernel" in repr(verification)


def links() -> dict[str, Link]:
    """One link weight of each kind that has a road of its own through the replay."""
    G = hl.SU(3)
    heat, finite = hl.heat_kernel(G, "t"), hl.loop_coupling(G, "lam")
    pairs = hl.bilinear_coupling(G, {("1", "1"): 1, ("3", "3"): "lam", ("3", "6bar"): "mu", ("1", "8"): "nu"})
    return {
        "Manton, SU(2)": hl.manton(hl.SU(2), "beta"),
        "Manton, SU(3), two plaquettes": hl.manton(G, "beta", plaquettes=2),
        "Manton, SU(4)": hl.manton(hl.SU(4), "beta"),
        "loop coupling": finite,
        "diagonal pairs": hl.bilinear_coupling(G, {("1", "1"): 2, ("3", "3"): "lam"}),
        "pairs": pairs,
        "coupled heat kernel": heat * finite,
        "coupled Wilson": pairs * hl.wilson(G, "beta", plaquettes=2),
        "coupled Manton": hl.manton(G, "beta") * finite,
        "stacked": heat @ hl.wilson(G, "beta") @ hl.manton(G, "b"),
        "heat kernel, SU(7)": hl.heat_kernel(hl.SU(7), "t", plaquettes=2),
        "heat kernel, SU(8)": hl.heat_kernel(hl.SU(8), "t"),
        "Wilson, SU(8)": hl.wilson(hl.SU(8), "beta"),
        "loop coupling, SU(8)": hl.loop_coupling(hl.SU(8), "lam"),
        "table, SU(8)": hl.link_from_coefficients(hl.SU(8), {"1": 1, "8": "k"}),
    }


@pytest.mark.parametrize("name", links(), ids=str)
def test_every_kind_of_link_replays_and_a_wrong_value_does_not(name):
    link = links()[name]
    model = hl.RingModel(link, hl.static_fermions(link.group, "z"))
    derivation = model.transfer_matrix(1).derivation(link.group.fundamental, link.group.trivial)
    assert derivation.element != 0
    assert derivation.verify().passed, derivation.verify()
    place, number, wrong = next(
        (place, number, replace(claim, value=claim.value * (1 + sympy.Rational(1, 10**8))))
        for place, step in enumerate(derivation.steps)
        for number, claim in enumerate(step.claims)
        if isinstance(claim, KernelClaim)
        or (isinstance(claim, LinkFactorClaim) and claim.irrep != link.group.trivial)
    )
    step = derivation.steps[place]
    claims = (*step.claims[:number], wrong, *step.claims[number + 1 :])
    steps = (*derivation.steps[:place], replace(step, claims=claims), *derivation.steps[place + 1 :])
    spoiled = replace(derivation, steps=steps).verify()
    assert not spoiled.steps[place].passed


@pytest.mark.parametrize("n", [7, 8])
def test_matter_of_infinite_reach_replays_where_no_grid_fits(n):
    G = hl.SU(n)
    site = hl.static_bosons(G, "z", "w") * hl.loop_field(G, {str(n): "h"})
    derivation = hl.RingModel(hl.heat_kernel(G, "t"), site).transfer_matrix(1).derivation(str(n), "1")
    assert derivation.verify().passed, derivation.verify()


def test_a_form_that_is_not_the_weight_is_not_used():
    G = hl.SU(8)
    right = hl.wilson(G, "beta").determinant_form({"beta": 4.0})
    assert form_scale(right, right.at) == pytest.approx(1)
    assert form_scale(right, lambda angles: right.at(angles) ** 2) is None


def test_faces_hold_the_statements():
    derivation = ember().transfer_matrix(cutoff=2).derivation("8", "3")
    html = derivation._repr_html_()
    assert html.count("<li>") == len(derivation.steps) == 4
    assert r"\otimes" not in html
    assert r"\chi_{" in derivation.latex()
    assert r"\begin{aligned}" in derivation.latex()
    assert "<script" not in html
    assert "⟨8|T|3⟩" in repr(derivation)
    zero = ember().transfer_matrix(cutoff=2).derivation("8", "1")
    assert r"N-ality }0\text{)}" in zero.latex()
    assert zero.element == 0


def mixing() -> hl.RingModel:
    from haarloom.actions.exponential_coupling import exponential_coupling

    return hl.RingModel(exponential_coupling(hl.SU(3), "lam"), hl.static_fermions(hl.SU(3), "z"))


def test_a_link_that_mixes_irreps_replays_on_two_tori():
    derivation = mixing().transfer_matrix(cutoff=2).derivation("3", "1")
    assert len(derivation.steps) == 5
    assert derivation.element == mixing().transfer_matrix(cutoff=2)["3", "1"]
    assert derivation.verify().passed, derivation.verify()


def test_a_corrupted_kernel_element_fails():
    derivation = mixing().transfer_matrix(cutoff=1).derivation("1", "1")
    for place, number in ((3, 0), (4, 0)):
        step = derivation.steps[place]
        wrong = replace(step.claims[number], value=step.claims[number].value + sympy.Rational(1, 10**6))
        claims = (*step.claims[:number], wrong, *step.claims[number + 1 :])
        steps = (*derivation.steps[:place], replace(step, claims=claims), *derivation.steps[place + 1 :])
        assert not replace(derivation, steps=steps).verify().passed
