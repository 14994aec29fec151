"""Products of link weights: strips one after the other, and couplings on top of a gauge action."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr, S, Symbol

from haarloom.actions.base import Link, stacked
from haarloom.actions.bilinear import BilinearCoupling, Pair
from haarloom.actions.loop_coupling import LoopCoupling
from haarloom.actions.parameters import Field, Values, evaluate, free_parameters
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.products import multiply
from haarloom.exceptions import GroupError, ParameterError

__all__ = ["CoupledLink", "StackedLinks", "coupled_link", "stacked_links"]

_LINKS = Field("links", "weights", "", "diagonal link weights of strips that are stacked in time")
_GAUGE = Field("gauge", "weights", "", "diagonal link weight")
_COUPLING = Field("coupling", "weights", "", "finite coupling of neighbouring loops")


def stacked_links(group: SU, links: Sequence[Link | Mapping[str, Any]]) -> StackedLinks:
    """Strips of different actions one after the other in time: k_r = ∏ k_r of the strips, written ``a @ b``.

    Integrating the links between two strips convolves their kernels as functions of P P′†, so plaquettes with
    different actions may follow one another.

    Parameters
    ----------
    group : SU
    links : sequence of Link
        Diagonal link weights, or descriptions of them.
    """
    built = [_rebuilt(group, link) for link in links]
    opened = [one for link in built for one in (link.links if isinstance(link, StackedLinks) else (link,))]
    _one_group(opened)
    for link in opened:
        if not link.diagonal:
            raise ParameterError(
                f"A link weight of kind '{link.kind}' is not diagonal in the irreps and cannot be stacked; "
                "multiply kernels with * instead."
            )
    return StackedLinks(group, tuple(opened))


def coupled_link(
    group: SU, gauge: Link | Mapping[str, Any], coupling: Link | Mapping[str, Any]
) -> CoupledLink:
    """A gauge action times a finite coupling of loops, K(P, P′) K′(P, P′) point by point; written ``a * b``.

    Parameters
    ----------
    group : SU
    gauge, coupling : Link
        A diagonal link weight and a `loop_coupling` or `bilinear_coupling`, in either order, or descriptions.

    Raises
    ------
    ParameterError
        If neither is a finite bilinear coupling of loops.
    """
    first, second = _rebuilt(group, gauge), _rebuilt(group, coupling)
    if not isinstance(second, BilinearCoupling | LoopCoupling):
        first, second = second, first
    if not isinstance(second, BilinearCoupling | LoopCoupling) or not first.diagonal:
        raise ParameterError(
            f"The kernels '{first.kind}' and '{second.kind}' cannot be multiplied pointwise: one must be a "
            f"finite "
            "coupling (loop_coupling or bilinear_coupling), the other diagonal. For strips one after the "
            "other "
            "use @."
        )
    _one_group([first, second])
    return CoupledLink(group, first, second)


def _rebuilt(group: SU, part: Any) -> Any:
    from haarloom.actions.registry import build

    return build(group, part) if isinstance(part, Mapping) else part


def _one_group(links: Sequence[Link]) -> None:
    groups = {link.group for link in links}
    if len(groups) > 1:
        raise GroupError(
            f"Link weights of {' and '.join(sorted(map(str, groups)))} given; build all on the same group."
        )


@dataclass(frozen=True)
class StackedLinks(Link):
    """∏ k_r over strips; see `stacked_links`."""

    group: SU
    links: tuple[Link, ...]

    kind: ClassVar[str] = "stacked strips"
    FIELDS: ClassVar[tuple[Field, ...]] = (_LINKS,)

    @property
    def plaquettes(self) -> int:  # type: ignore[override]
        """Plaquettes of all strips together."""
        return sum(link.plaquettes for link in self.links)

    @property
    def bounds_proven(self) -> bool:  # type: ignore[override]
        """True if those of the weights below are."""
        return all(link.bounds_proven for link in self.links)

    @property
    def parameters(self) -> tuple[Symbol, ...]:
        """Free symbols of all strips."""
        return free_parameters(symbol for link in self.links for symbol in link.parameters)

    def describe(self) -> dict[str, Any]:
        """Kind and the description of each strip."""
        return {"kind": self.kind, "links": [link.describe() for link in self.links]}

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact product of the k_r."""
        return sympy.Mul(*(link.coefficient(irrep) for link in self.links))

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """Products of k_r with their errors carried along."""
        k, error = self.links[0].coefficients_at(irreps, values)
        for link in self.links[1:]:
            other, slack = link.coefficients_at(irreps, values)
            error = error * np.abs(other) + np.abs(k) * slack + error * slack
            k = k * other
        return k, error

    def largest_outside(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Product of the bounds of the strips: as good as they are."""
        bounds = np.broadcast_arrays(*[link.largest_outside(cutoff, values) for link in self.links])
        return np.asarray(np.prod(bounds, axis=0))

    def formula(self) -> str:
        """The factors side by side."""
        return r"\cdot".join(rf"\left[{link.formula()}\right]" for link in self.links)


@dataclass(frozen=True)
class CoupledLink(Link):
    """K(P, P′) times a finite coupling Σ λ_ab χ_a(P) χ_b(P′)*; see `coupled_link`."""

    group: SU
    gauge: Link
    coupling: BilinearCoupling | LoopCoupling

    kind: ClassVar[str] = "coupled link"
    FIELDS: ClassVar[tuple[Field, ...]] = (_GAUGE, _COUPLING)
    diagonal: ClassVar[bool] = False

    @property
    def plaquettes(self) -> int:  # type: ignore[override]
        """Plaquettes of the gauge action."""
        return self.gauge.plaquettes

    @property
    def bounds_proven(self) -> bool:  # type: ignore[override]
        """True if those of the weights below are."""
        return all(link.bounds_proven for link in (self.gauge,))

    @property
    def parameters(self) -> tuple[Symbol, ...]:
        """Free symbols of both."""
        return free_parameters([*self.gauge.parameters, *self.coupling.parameters])

    def describe(self) -> dict[str, Any]:
        """Kind and both descriptions."""
        return {"kind": self.kind, "gauge": self.gauge.describe(), "coupling": self.coupling.describe()}

    def coefficient(self, irrep: Irrep) -> Expr:
        """The diagonal element."""
        return self.kernel([irrep])[0, 0]

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """Diagonal elements of the kernel."""
        kernel, error = self.kernel_at(irreps, values)
        return np.diagonal(kernel, axis1=-2, axis2=-1), np.diagonal(error, axis1=-2, axis2=-1)

    @property
    def pairs(self) -> tuple[tuple[Pair, Expr], ...]:
        """The coupling as (a, b), λ_ab of Σ λ_ab χ_a(P) χ_b(P′)*."""
        if isinstance(self.coupling, BilinearCoupling):
            return self.coupling.couplings
        ends = dict.fromkeys([self.group.trivial, self.group.fundamental, self.group.antifundamental])
        found = {r: self.coupling.coefficient(r) for r in ends}
        return tuple(((r, r), value) for r, value in found.items() if value is not S.Zero)

    def _terms(self, r: Irrep, s: Irrep) -> list[tuple[Expr, int, Irrep]]:
        """(λ_ab, N_{ua}^r N_{ub}^s, u) of the finite sum over a, b and u."""
        terms = []
        for (a, b), value in self.pairs:
            for labels, count in multiply(r.labels, a.conjugate.labels).items():
                other = multiply(labels, b.labels).get(s.labels, 0)
                if other:
                    terms.append((value, count * other, self.group.irrep(*labels)))
        return terms

    def kernel(self, irreps: Sequence[Irrep]) -> sympy.ImmutableMatrix:
        """Exact k_rs = Σ_ab λ_ab Σ_u k_u N_{ua}^r N_{ub}^s."""
        elements = [
            sympy.Add(*(count * value * self.gauge.coefficient(u) for value, count, u in self._terms(r, s)))
            for r in irreps
            for s in irreps
        ]
        return sympy.ImmutableMatrix(len(irreps), len(irreps), elements)

    def kernel_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """k_rs as numbers with their error."""
        sums = {(i, j): self._terms(r, s) for i, r in enumerate(irreps) for j, s in enumerate(irreps)}
        needed = tuple(sorted({u for terms in sums.values() for _, _, u in terms}))
        k, slack = self.gauge.coefficients_at(needed, values)
        place = {u: i for i, u in enumerate(needed)}
        expressions = sorted({value for terms in sums.values() for value, _, _ in terms}, key=str)
        numbers = dict(zip(expressions, evaluate(expressions, values), strict=True))
        shape = np.broadcast_shapes(k.shape[:-1], *(n.shape for n in numbers.values()))
        kind = np.result_type(k, *numbers.values())
        matrix = np.zeros((*shape, len(irreps), len(irreps)), dtype=kind)
        error = np.zeros(matrix.shape)
        for (i, j), terms in sums.items():
            for value, count, u in terms:
                factor = count * numbers[value]
                matrix[..., i, j] += factor * k[..., place[u]]
                error[..., i, j] += np.abs(factor) * (slack[..., place[u]] + 4e-16 * np.abs(k[..., place[u]]))
        return matrix, error

    def largest_outside(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Bound of the norm left out: k_u beyond the cutoff less the reach of the coupling, times Σ |λ_ab|
        d_a d_b: proven
        where the bound of the gauge action is.
        """
        reach = self.coupling.kernel_reach
        sizes = np.abs(stacked(evaluate([value for _, value in self.pairs], values)))
        dimensions = np.array([float(a.dimension * b.dimension) for (a, b), _ in self.pairs])
        total = (sizes * dimensions).sum(axis=-1)
        inner = self.gauge.largest_outside(cutoff - reach, values) if cutoff >= reach else np.ones(())
        return np.asarray(inner * total)

    def formula(self) -> str:
        """LaTeX of the sum over irreps."""
        sums = r"k_{rs}=\sum_{ab}\lambda_{ab}\sum_u k_u N_{ua}^r N_{ub}^s"
        return rf"{sums},\quad k_u={self.gauge.formula()}"

    def latex(self) -> str:
        """Both kernels multiplied."""
        gauge, coupling = (
            link.latex().split(r",\qquad")[0].removeprefix("K(P,P')=") for link in (self.gauge, self.coupling)
        )
        return rf"K(P,P')=\left[{gauge}\right]\left[{coupling}\right]"
