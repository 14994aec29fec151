"""⟨r|W|s⟩ = Σ_c w_c N_{cs}^r with balls w_c: the smaller set of characters acts on the larger one.

A finite W has few characters, which act on the irreps of the basis. Of an infinite one every c that can
connect a ket s and a bra r enters, and N_{cs}^r = N_{sc}^r is found by letting the few χ_s act on those.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.ball_characters import CharacterBalls
from haarloom.numerics.fusion import FusionPattern, fusion_pattern
from haarloom.numerics.labels import positions

if TYPE_CHECKING:
    from haarloom.actions.protocols import SiteWeight

__all__ = ["site_elements"]

Element = tuple[int, int, Any]


def site_elements(site: SiteWeight, characters: CharacterBalls, cutoff: int, outer: int) -> Iterator[Element]:
    """(bra, ket, ball) for kets with Σ s ≤ cutoff and bras with Σ r ≤ outer; what is missing is 0.

    Parameters
    ----------
    characters
        Of an infinite W as far as cutoff + outer, of a finite one to its end.
    """
    rank = characters.rank
    weights = np.array(characters.coefficients, dtype=object)
    kets = tuple(site.group.irreps(cutoff))
    support = tuple(site.support()) if site.finite else None
    if support is not None and len(support) <= len(kets):
        labels = np.array([irrep.labels for irrep in support], dtype=np.int64).reshape(-1, rank)
        chosen = weights[positions(labels, characters.reach)]
        return _by_characters(fusion_pattern(support, rank, cutoff, outer), chosen)
    return _by_kets(fusion_pattern(kets, rank, characters.reach, outer), weights)


def _by_characters(pattern: FusionPattern, weights: NDArray[Any]) -> Iterator[Element]:
    """Rows of the components are the c: multiples of w_c are put where N_{cs}^r says."""
    found = np.zeros(len(pattern.rows), dtype=object)
    components = pattern.components
    for weight, start, stop in zip(weights, components.indptr, components.indptr[1:], strict=False):
        places, counts = components.indices[start:stop], components.data[start:stop].astype(int)
        for count in np.unique(counts).tolist():
            found[places[counts == count]] += weight * count
    return zip(pattern.rows.tolist(), pattern.columns.tolist(), found, strict=True)


def _by_kets(pattern: FusionPattern, weights: NDArray[Any]) -> Iterator[Element]:
    """Rows of the components are the kets, columns of the pattern the c: summed for each bra."""
    components = pattern.components
    for ket, (start, stop) in enumerate(zip(components.indptr, components.indptr[1:], strict=False)):
        places, counts = components.indices[start:stop], components.data[start:stop].astype(int)
        order = np.argsort(pattern.rows[places], kind="stable")
        bras, starts = np.unique(pattern.rows[places][order], return_index=True)
        terms = weights[pattern.columns[places][order]] * counts[order].astype(object)
        for bra, element in zip(bras.tolist(), np.add.reduceat(terms, starts), strict=True):
            yield bra, ket, element
