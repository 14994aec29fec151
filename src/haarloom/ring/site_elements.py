"""Matrix elements of the site weight: ⟨r|W|s⟩ = Σ_c w_c N_cs^r, exact."""

from __future__ import annotations

from collections import defaultdict
from typing import TYPE_CHECKING

import sympy

from haarloom.algebra.products import fusion_tensor, multiply

if TYPE_CHECKING:
    from haarloom.actions.protocols import SiteWeight
    from haarloom.algebra.irrep import Irrep

__all__ = ["contributions", "site_elements"]


def contributions(site: SiteWeight, bra: Irrep, ket: Irrep) -> dict[Irrep, int]:
    """The irreps c of W with N_cs^r > 0, and that multiplicity.

    N_cs^r is also the multiplicity of c in r ⊗ s̄, which lists them for an infinite W as well.
    Those whose coefficient vanishes identically are left out.
    """
    product = multiply(bra.labels, ket.conjugate.labels)
    found = {bra.group.irrep(*labels): count for labels, count in product.items()}
    return {c: n for c, n in sorted(found.items(), key=_basis_order) if site.coefficient(c) != 0}


def _basis_order(item: tuple[Irrep, int]) -> tuple[int, tuple[int, ...]]:
    labels = item[0].labels
    return sum(labels), tuple(-a for a in labels)


def site_elements(site: SiteWeight, basis: tuple[Irrep, ...]) -> dict[tuple[int, int], sympy.Expr]:
    """All non-zero ⟨r|W|s⟩ on a basis, keyed by (row, column)."""
    terms: dict[tuple[int, int], list[sympy.Expr]] = defaultdict(list)
    labels = tuple(irrep.labels for irrep in basis)
    for component in _components(site, basis):
        weight = site.coefficient(component)
        if weight == 0:
            continue
        for row, column, multiplicity in fusion_tensor(labels, component.labels):
            terms[row, column].append(multiplicity * weight)
    return {place: sympy.Add(*summands) for place, summands in terms.items()}


def _components(site: SiteWeight, basis: tuple[Irrep, ...]) -> tuple[Irrep, ...]:
    """The irreps of W that can connect two irreps of the basis: at most twice its cutoff."""
    farthest = 2 * sum(basis[-1].labels)
    if site.finite:
        return tuple(irrep for irrep in site.support() if sum(irrep.labels) <= farthest)
    return tuple(basis[0].group.irreps(farthest))
