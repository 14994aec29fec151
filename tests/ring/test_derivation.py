"""Derivations: each statement replays on the torus, and a corrupted one does not."""

from __future__ import annotations

from dataclasses import replace

import pytest
import sympy

import haarloom as hl
from haarloom.ring.claims import (
    ElementClaim,
    ExpansionClaim,
    LinkFactorClaim,
    OverlapClaim,
    ProductClaim,
    SelectionClaim,
    SiteElementClaim,
)


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
    """The plaquette weight of SU(8) needs more grid points than fit; the finite statements still replay."""
    verification = ember(8).transfer_matrix(1).derivation("8", "1").verify()
    assert not verification.passed
    assert all(step.passed for step in verification.steps)
    assert [bool(step.not_replayed) for step in verification.steps] == [False, False, False, True]
    assert "does not settle" in repr(verification)


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
