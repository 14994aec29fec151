"""Link coefficients and link elements found on the maximal torus, whatever the algebra says of them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from haarloom.actions.link_products import CoupledLink, StackedLinks
from haarloom.actions.parameters import evaluate
from haarloom.actions.protocols import LinkWeight
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ConvergenceError, SizeError
from haarloom.ring.torus_function import TorusFunction, double_overlap, form_scale
from haarloom.torus.alcove import alcove_grid
from haarloom.torus.characters import character, characters
from haarloom.torus.determinant_forms import DeterminantForm

__all__ = ["LinkOnTorus", "NotReplayable"]

ABSENT = 1e-9
"""Overlaps of three characters are whole numbers; below this they are 0."""


class NotReplayable(Exception):
    """A statement for which this model has no independent route; carries the reason."""


@dataclass(frozen=True, eq=False)
class LinkOnTorus:
    """A link weight at fixed values, seen through w(U) or K(P, P′) at given eigenphases only.

    Parameters
    ----------
    link, values
        A link weight, and a number for each of its parameters.
    """

    link: LinkWeight
    values: Mapping[str, float]

    def coefficient(self, irrep: Irrep) -> complex:
        """k_r: (w_r/w_0)^{N_t} from w(U) = Σ_r d_r w_r χ_r(U), or ∫∫ χ_r* K χ_r where there is no w(U)."""
        if isinstance(self.link, StackedLinks):
            return complex(np.prod([strip.coefficient(irrep) for strip in self._strips]))
        if self.link.plaquette_at(np.zeros((1, irrep.group.n)), self.values) is None:
            return self.kernel_element(irrep, irrep)
        if irrep == self.link.group.trivial:
            return 1.0  # w_0 / w_0, for which no integral is needed
        return complex((self._plaquette_ratio(irrep) / irrep.dimension) ** self.link.plaquettes)

    def kernel_element(self, bra: Irrep, ket: Irrep) -> complex:
        """∫dP ∫dP′ χ_bra(P)* K(P, P′) χ_ket(P′)."""
        if isinstance(self.link, CoupledLink):
            return self._through_the_gauge_link(self.link, bra, ket)
        density = getattr(self.link, "kernel_density_at", None)
        one = np.zeros((1, bra.group.n))
        if density is None or density(one, one, self.values) is None:
            raise NotReplayable(
                f"a link weight of kind '{self.link.kind}' that gives its coefficients as they are; give it "
                "a plaquette weight (plaquette_at) or a kernel (kernel_density_at) to have them replayed"
            )
        reach = getattr(self.link, "kernel_reach", None)
        return double_overlap(bra.group, lambda a, b: density(a, b, self.values), bra, ket, reach)

    @cached_property
    def _strips(self) -> tuple[LinkOnTorus, ...]:
        assert isinstance(self.link, StackedLinks)
        return tuple(LinkOnTorus(strip, self.values) for strip in self.link.links)

    @cached_property
    def _plaquette(self) -> TorusFunction:
        """The un-normalised plaquette weight w(U)."""
        return TorusFunction(
            self.link.group,
            lambda angles: self.link.plaquette_at(angles, self.values),
            reach=getattr(self.link, "kernel_reach", None),
            creased=getattr(self.link, "creased", False),
        )

    def _plaquette_ratio(self, irrep: Irrep) -> complex:
        """∫ χ_r* w / ∫ w, by quadrature, or by determinants where no grid is fine enough."""
        trivial = self.link.group.trivial
        try:
            return self._plaquette.coefficient(irrep) / self._plaquette.coefficient(trivial)
        except (ConvergenceError, SizeError):
            form = self._form
            if form is None:
                raise
            return form.coefficient(irrep) / form.coefficient(trivial)

    @cached_property
    def _form(self) -> DeterminantForm | None:
        maker = getattr(self.link, "determinant_form", None)
        form: DeterminantForm | None = None if maker is None else maker(self.values)
        if form is None or form_scale(form, self._plaquette.function) is None:
            return None
        return form

    def _through_the_gauge_link(self, link: CoupledLink, bra: Irrep, ket: Irrep) -> complex:
        """Σ_u k_u Σ_ab λ_ab ⟨bra|χ_a|u⟩ ⟨u|χ_b*|ket⟩, K(P, P′) = Σ_u k_u χ_u(P) χ_u(P′)* of the gauge link.

        Every irrep u that could occur by its labels is integrated; no product is decomposed.
        """
        irreps = link.group.irreps(sum(bra.labels) + link.coupling.kernel_reach)
        numbers = evaluate([value for _, value in link.pairs], self.values)
        sums = np.zeros(len(irreps), dtype=complex)
        for ((a, b), _), number in zip(link.pairs, numbers, strict=True):
            sums += number * _overlaps(bra, a, irreps) * _overlaps(ket, b, irreps).conj()
        gauge = LinkOnTorus(link.gauge, self.values)
        found = (s * gauge.coefficient(u) for u, s in zip(irreps, sums, strict=True) if abs(s) > ABSENT)
        return complex(sum(found))


def _overlaps(bra: Irrep, factor: Irrep, irreps: tuple[Irrep, ...]) -> np.ndarray:
    """∫dP χ_bra* χ_factor χ_u for each u."""
    reach = sum(bra.labels) + sum(factor.labels) + max(sum(u.labels) for u in irreps)
    angles, weights = alcove_grid(bra.group, reach + 2 * bra.group.rank + 1)
    product = np.conj(character(bra, angles)) * character(factor, angles) * weights
    return np.asarray(product @ characters(irreps, angles))
