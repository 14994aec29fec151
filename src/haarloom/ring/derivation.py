"""How one element of the transfer matrix comes about: expand, decompose, project, attach the link."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import sympy

from haarloom.algebra.products import multiply
from haarloom.ring.claims import (
    Claim,
    ElementClaim,
    ExpansionClaim,
    KernelClaim,
    LinkFactorClaim,
    OverlapClaim,
    ProductClaim,
    RowClaim,
    SelectionClaim,
    SiteElementClaim,
)
from haarloom.ring.roots import positive_root
from haarloom.ring.site_elements import contributions

if TYPE_CHECKING:
    from haarloom.actions.protocols import SiteWeight
    from haarloom.algebra.irrep import Irrep
    from haarloom.ring.model import RingModel
    from haarloom.ring.replay import Verification

__all__ = ["Derivation", "Step", "derive"]

EXPAND = "Expand the site weight in characters"
DECOMPOSE = "Decompose each product that contributes"
PROJECT = "Project by orthogonality"

MOST_EXPANDED = 100
"""A finite W with more characters is stated by those that enter the element alone."""


@dataclass(frozen=True)
class Step:
    """One step: what is done, and the statements that come out of it."""

    title: str
    claims: tuple[Claim, ...]

    def latex(self) -> tuple[str, ...]:
        """Each statement as LaTeX, without delimiters."""
        from haarloom.ring.faces import claim_latex

        return tuple(claim_latex(claim) for claim in self.claims)


@dataclass(frozen=True)
class Derivation:
    """The steps that lead to ⟨bra|T|ket⟩, and the element itself.

    Examples
    --------
    >>> import haarloom as hl
    >>> G = hl.SU(3)
    >>> model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    >>> derivation = model.transfer_matrix(cutoff=1).derivation("3", "3bar")
    >>> derivation.element
    z**2*exp(-4*t/3)
    >>> derivation.verify().passed
    True
    """

    model: RingModel
    bra: Irrep
    ket: Irrep
    steps: tuple[Step, ...]

    @property
    def element(self) -> sympy.Expr:
        """The value that the last step states."""
        final = self.steps[-1].claims[-1]
        assert isinstance(final, ElementClaim | RowClaim)
        return final.value

    def verify(self, seed: int = 20, tolerance: float = 1e-12) -> Verification:
        """Replay every statement on the maximal torus, at random parameter values.

        Nothing of the algebra is used in it: characters are quotients of determinants, integrals are
        quadratures with the Weyl measure, W and the plaquette weight are their closed forms.

        Parameters
        ----------
        seed
            Of the random points and parameter values; the result depends on nothing else.
        tolerance
            Largest residual accepted, relative to the larger side of the statement or 1.
        """
        from haarloom.ring.replay import replay

        return replay(self, seed=seed, tolerance=tolerance)

    def latex(self) -> str:
        """The whole derivation as LaTeX, one aligned equation a statement."""
        from haarloom.ring.faces import derivation_latex

        return derivation_latex(self)

    def _repr_latex_(self) -> str:
        return f"$\\displaystyle {self.latex()}$"

    def _repr_html_(self) -> str:
        from haarloom.ring.faces import derivation_html

        return derivation_html(self)

    def __repr__(self) -> str:
        return f"Derivation(⟨{self.bra.name}|T|{self.ket.name}⟩ = {self.element}; {len(self.steps)} steps)"


def derive(model: RingModel, basis: tuple[Irrep, ...], bra: Irrep, ket: Irrep) -> Derivation:
    """The derivation of ⟨bra|T|ket⟩; ``basis`` matters to a link that mixes irreps alone."""
    if not model.link.diagonal:
        return _derive_row(model, basis, bra, ket)
    joined = contributions(model.site, bra, ket)
    site_value = _site_value(model.site, joined)
    steps = (
        Step(EXPAND, (_expansion(model.site, tuple(joined)),)),
        Step(DECOMPOSE, _products(bra, ket, tuple(joined))),
        Step(PROJECT, _projections(bra, ket, joined, site_value)),
        Step("Attach the link factors", _dressing(model, bra, ket, site_value)),
    )
    return Derivation(model, bra, ket, steps)


def _derive_row(model: RingModel, basis: tuple[Irrep, ...], bra: Irrep, ket: Irrep) -> Derivation:
    """(K W)_rs: each irrep q that the link joins to the bra, and ⟨q|W|s⟩ by the same road."""
    row = model.link.kernel(basis)[basis.index(bra), :]
    kernel = {q: k for q, k in zip(basis, row, strict=True) if k != 0}
    joined = {q: contributions(model.site, q, ket) for q in kernel}
    values = {q: _site_value(model.site, found) for q, found in joined.items()}
    entering = tuple({c: None for found in joined.values() for c in found})
    total = sympy.Add(*(kernel[q] * values[q] for q in kernel))
    steps = (
        Step(EXPAND, (_expansion(model.site, entering),)),
        Step(DECOMPOSE, _each(_products(q, ket, tuple(found)) for q, found in joined.items())),
        Step(PROJECT, _each(_projections(q, ket, found, values[q]) for q, found in joined.items())),
        Step("Take the row of the link kernel", tuple(KernelClaim(bra, q, k) for q, k in kernel.items())),
        Step("Sum over the irreps in between", (RowClaim(bra, tuple(kernel), ket, total),)),
    )
    return Derivation(model, bra, ket, steps)


def _site_value(site: SiteWeight, joined: Mapping[Irrep, int]) -> sympy.Expr:
    return sympy.Add(*(count * site.coefficient(c) for c, count in joined.items()))


def _each(groups: Iterable[tuple[Claim, ...]]) -> tuple[Claim, ...]:
    """One tuple without repetition: the same product serves several irreps in between."""
    return tuple(dict.fromkeys(claim for group in groups for claim in group))


def _expansion(site: SiteWeight, joined: tuple[Irrep, ...]) -> ExpansionClaim:
    support = tuple(site.support()) if site.finite else ()
    whole = 0 < len(support) <= MOST_EXPANDED
    shown = support if whole else joined
    return ExpansionClaim(tuple((c, site.coefficient(c)) for c in shown), complete=whole)


def _products(bra: Irrep, ket: Irrep, joined: tuple[Irrep, ...]) -> tuple[Claim, ...]:
    group = bra.group
    products = tuple(
        ProductClaim(
            factor,
            ket,
            tuple((group.irrep(*labels), n) for labels, n in multiply(factor.labels, ket.labels).items()),
        )
        for factor in joined
    )
    return (SelectionClaim(bra, ket, joined), *products)


def _projections(bra: Irrep, ket: Irrep, joined: dict[Irrep, int], value: sympy.Expr) -> tuple[Claim, ...]:
    overlaps = tuple(OverlapClaim(bra, factor, ket, count) for factor, count in joined.items())
    return (*overlaps, SiteElementClaim(bra, ket, value))


def _dressing(model: RingModel, bra: Irrep, ket: Irrep, site_value: sympy.Expr) -> tuple[Claim, ...]:
    ends = (bra,) if bra == ket else (bra, ket)
    coefficients = {irrep: model.link.coefficient(irrep) for irrep in ends}
    factors = tuple(LinkFactorClaim(irrep, k, positive_root(k)) for irrep, k in coefficients.items())
    element = positive_root(coefficients[bra]) * site_value * positive_root(coefficients[ket])
    return (*factors, ElementClaim(bra, ket, element))
