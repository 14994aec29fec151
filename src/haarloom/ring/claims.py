"""What one line of a derivation states, as data: each claim can be shown and replayed.

A claim holds both sides of an equation in the form in which the algebra produced it. Its LaTeX is a
view (``ring.faces``), its check an independent computation on the maximal torus (``ring.replay``).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import sympy

if TYPE_CHECKING:
    from haarloom.algebra.irrep import Irrep

__all__ = [
    "Claim",
    "ElementClaim",
    "ExpansionClaim",
    "KernelClaim",
    "LinkFactorClaim",
    "OverlapClaim",
    "ProductClaim",
    "RowClaim",
    "SelectionClaim",
    "SiteElementClaim",
]


@dataclass(frozen=True)
class ExpansionClaim:
    """W(P) = Σ_c w_c χ_c(P); with ``complete`` the listed terms are all there are."""

    terms: tuple[tuple[Irrep, sympy.Expr], ...]
    complete: bool


@dataclass(frozen=True)
class SelectionClaim:
    """No component of W outside ``components`` can join bra and ket, by N-ality or by the product."""

    bra: Irrep
    ket: Irrep
    components: tuple[Irrep, ...]


@dataclass(frozen=True)
class ProductClaim:
    """χ_c χ_s = Σ_a N_cs^a χ_a, all terms listed."""

    factor: Irrep
    ket: Irrep
    terms: tuple[tuple[Irrep, int], ...]


@dataclass(frozen=True)
class OverlapClaim:
    """∫dP χ_r* χ_c χ_s = N_cs^r, from the orthogonality of characters."""

    bra: Irrep
    factor: Irrep
    ket: Irrep
    value: int


@dataclass(frozen=True)
class SiteElementClaim:
    """⟨r|W|s⟩ = ∫dP χ_r* W χ_s equals ``value``."""

    bra: Irrep
    ket: Irrep
    value: sympy.Expr


@dataclass(frozen=True)
class LinkFactorClaim:
    """k_r equals ``value``, and ``root`` is its square root."""

    irrep: Irrep
    value: sympy.Expr
    root: sympy.Expr


@dataclass(frozen=True)
class ElementClaim:
    """T_rs = √k_r ⟨r|W|s⟩ √k_s equals ``value``."""

    bra: Irrep
    ket: Irrep
    value: sympy.Expr


@dataclass(frozen=True)
class KernelClaim:
    """k_rq = ∫dP ∫dP′ χ_r(P)* K(P, P′) χ_q(P′) equals ``value``, for a link that mixes irreps."""

    bra: Irrep
    middle: Irrep
    value: sympy.Expr


@dataclass(frozen=True)
class RowClaim:
    """(K W)_rs = Σ_q k_rq ⟨q|W|s⟩ over the irreps ``through`` of the basis equals ``value``."""

    bra: Irrep
    through: tuple[Irrep, ...]
    ket: Irrep
    value: sympy.Expr


Claim = (
    ExpansionClaim
    | SelectionClaim
    | ProductClaim
    | OverlapClaim
    | SiteElementClaim
    | LinkFactorClaim
    | ElementClaim
    | KernelClaim
    | RowClaim
)
