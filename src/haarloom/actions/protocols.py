"""The two protocols of this station: what a link weight and a site weight must offer.

A class of your own needs none of Haarloom's base classes as long as it has these members; deriving
from `haarloom.actions.base.Link` or `Site` spares you most of them.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any, Protocol, runtime_checkable

import sympy
from numpy.typing import NDArray
from sympy import Expr, Symbol

from haarloom.actions.character_factors import CharacterFactor
from haarloom.actions.parameters import Values
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep

__all__ = ["LinkWeight", "SiteWeight", "Weight"]


@runtime_checkable
class Weight(Protocol):
    """What link weights and site weights share."""

    @property
    def group(self) -> SU:
        """The gauge group."""

    @property
    def kind(self) -> str:
        """The trade name of the weight, a key of the registry for built-in ones."""

    @property
    def parameters(self) -> tuple[Symbol, ...]:
        """Free symbols, sorted by name."""

    def latex(self) -> str:
        """The weight as a LaTeX formula."""

    def __hash__(self) -> int:
        """Weights are values: equal ones have equal hashes."""

    def describe(self) -> Mapping[str, Any]:
        """Kind and fields as exact strings (lists and mappings of such), enough to rebuild it."""


@runtime_checkable
class LinkWeight(Weight, Protocol):
    """Weight K(P, P′) between neighbouring loops.

    Diagonal ones are K = Σ_r k_r χ_r(P) χ_r(P′)*, k_r = (w_r/w_0)^{N_t} for a strip of N_t
    plaquettes with weight w(U) = Σ_r d_r w_r χ_r(U).
    """

    @property
    def diagonal(self) -> bool:
        """False for couplings Σ k_rs χ_r(P) χ_s(P′)* that mix irreps."""

    @property
    def plaquettes(self) -> int:
        """N_t, the number of plaquettes of the strip."""

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact k_r."""

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """k_r and a bound on its error, both of shape (values of its own parameters broadcast) + (n,)."""

    def largest_outside(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Upper bound of |k_r| over all irreps whose labels sum to more than the cutoff."""

    def plaquette_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any] | None:
        """Un-normalised w(U) of one plaquette on the maximal torus, never via the k_r; None if unknown."""

    def kernel(self, irreps: Sequence[Irrep]) -> sympy.ImmutableMatrix:
        """Exact k_rs, a diagonal matrix for diagonal weights."""

    def kernel_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """k_rs and a bound on its error, shape (...) + (n, n)."""

    def formula(self) -> str:
        """LaTeX of the general k_r."""


@runtime_checkable
class SiteWeight(Weight, Protocol):
    """Weight W(P) = Σ_c w_c χ_c(P) of one loop."""

    @property
    def finite(self) -> bool:
        """True for a finite combination of characters."""

    def class_function(self) -> ClassFunction:
        """The exact class function; raises `ClassFunctionError` unless finite."""

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact w_c; zero where absent."""

    def support(self) -> tuple[Irrep, ...]:
        """Irreps with w_c not identically zero, in basis order; raises unless finite."""

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """w_c and a bound on its error, both of shape (values of its own parameters broadcast) + (n,)."""

    def norm_bound(self, values: Values) -> NDArray[Any]:
        """Upper bound of sup |W(P)|."""

    def reach(self, values: Values) -> int | None:
        """Largest sum of labels in the support, None if infinite."""

    def tail_bound(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Bound or estimate of Σ |w_c| d_c over irreps whose labels sum to more than the cutoff."""

    def character_factors(self) -> tuple[CharacterFactor, ...]:
        """Exact factors of W for proofs; raises `ConvergenceError` with the reason where there are none."""

    def density_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """W on the maximal torus from its closed form, never via the w_c; values are scalars."""

    def __mul__(self, other: SiteWeight) -> SiteWeight:
        """The product, again a site weight."""
