"""Bases that spare a weight class most of its protocol.

A link weight of your own: derive a frozen dataclass from `Link`, with `group` and parameters as fields,
and write `coefficient`. A site weight: derive from `Site` and write `class_function`, or, where W is no
finite combination of characters, from `haarloom.actions.torus_site.TorusSite` and write `density_at`; with
`character_factors` beside it, proofs cover it too.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import fields
from typing import TYPE_CHECKING, Any, ClassVar

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr, Symbol

from haarloom.actions.character_factors import CharacterFactor, ExponentialFactor, FiniteFactor
from haarloom.actions.parameters import Field, Values, evaluate, exact_text, free_parameters
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ClassFunctionError, ConvergenceError, ParameterError

if TYPE_CHECKING:
    from haarloom.actions.link_products import CoupledLink, StackedLinks
    from haarloom.actions.product import SiteProduct
    from haarloom.actions.tensions import Tensions
    from haarloom.torus.determinant_forms import DeterminantForm

__all__ = ["Link", "Site", "stacked"]

ROUNDING = 64 * float(np.finfo(float).eps)
"""Relative error allowed for the float evaluation of one short exact expression."""

_MOST_IRREPS_SCANNED = 4000


class _Weight:
    """What both bases share: parameters and description read off the dataclass fields."""

    kind: ClassVar[str] = "custom"
    FIELDS: ClassVar[tuple[Field, ...]] = ()
    accuracy: ClassVar[str] = "Exact expressions; floats carry a rounding allowance."
    """How exact the coefficients are, in a sentence."""
    group: SU

    @property
    def parameters(self) -> tuple[Symbol, ...]:
        """Free symbols of all fields, sorted by name."""
        return free_parameters(self._expressions())

    def _expressions(self) -> list[Expr]:
        values = [getattr(self, field.name) for field in fields(self)]  # type: ignore[arg-type]
        tables = [value for value in values if _is_table(value)]
        return [
            *(value for value in values if isinstance(value, Expr)),
            *(entry for table in tables for _, entry in table),
        ]

    def describe(self) -> dict[str, Any]:
        """Kind and fields as exact strings; integers stay integers, tables by irrep become mappings."""
        described: dict[str, Any] = {"kind": self.kind}
        for field in fields(self):  # type: ignore[arg-type]
            if field.name != "group":
                described[field.name] = _described(getattr(self, field.name))
        return described

    def _value(self, name: str, values: Values) -> NDArray[Any]:
        """Numbers for one field, checked against its domain."""
        [number] = evaluate([getattr(self, name)], values)
        return self._field(name).check(number)

    def _field(self, name: str) -> Field:
        return next(field for field in self.FIELDS if field.name == name)

    def _repr_latex_(self) -> str:
        return f"${self.latex()}$"

    def latex(self) -> str:
        """The weight as a LaTeX formula."""
        raise NotImplementedError


def _described(value: Any) -> Any:
    if isinstance(value, Expr):
        return exact_text(value)
    if isinstance(value, Irrep):
        return value.name
    if _is_table(value):
        return {_key_text(key): exact_text(entry) for key, entry in value}
    return value


def _is_table(value: Any) -> bool:
    """Whether it is a tuple of (irrep or pair of irreps, expression)."""
    return isinstance(value, tuple) and all(
        isinstance(row, tuple) and len(row) == 2 and isinstance(row[1], Expr) for row in value
    )


def _key_text(key: Irrep | tuple[Irrep, Irrep]) -> str:
    return key.name if isinstance(key, Irrep) else f"({key[0].name}, {key[1].name})"


def stacked(numbers: Sequence[NDArray[Any]]) -> NDArray[Any]:
    """Arrays broadcast against one another and joined along a new last axis; no array gives shape (0,)."""
    if not numbers:
        return np.zeros((0,))
    return np.stack(np.broadcast_arrays(*numbers), axis=-1)


class Link(_Weight):
    """Base of link weights, diagonal in the irreps unless a class says otherwise."""

    diagonal: ClassVar[bool] = True
    bounds_proven: ClassVar[bool] = False
    """Whether `largest_outside` is a theorem rather than an estimate."""
    monotone: ClassVar[bool] = False
    """Whether that theorem holds between two values of a field if it holds at both: a proof over an interval
    then needs its ends alone."""
    positive: ClassVar[bool] = False
    """Whether every k_r ≥ 0 at all admissible parameters."""
    plaquettes: int = 1

    @property
    def kernel_reach(self) -> int | None:
        """Largest Σ a_i in K(P, P′), and in w(U) if there is one, where they are finite sums; else None."""
        return None

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact k_r."""
        raise NotImplementedError

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """k_r as floats from the exact expressions, with a rounding allowance of `ROUNDING`·|k_r|."""
        k = stacked(evaluate([self.coefficient(irrep) for irrep in irreps], values))
        return k, ROUNDING * np.abs(k)

    def largest_outside(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Largest |k_r| on the next N shells beyond the cutoff: an *estimate* for k_r that fall with the
        shell.

        Fewer shells, but at least one, are scanned where N would hold more than a few thousand irreps.
        """
        n, shells = self.group.n, self.group.n
        while shells > 1 and self.group.count_irreps(cutoff + shells) > _MOST_IRREPS_SCANNED:
            shells -= 1
        outside = [r for r in self.group.irreps(cutoff + shells) if sum(r.labels) > cutoff]
        k, error = self.coefficients_at(outside, values)
        assert n >= 2
        return np.asarray((np.abs(k) + error).max(axis=-1))

    def plaquette_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any] | None:
        """No plaquette weight is known in general."""
        return None

    def determinant_form(self, values: Values) -> DeterminantForm | None:
        """w(U), up to a constant, as a form whose coefficients are determinants; None if it has none."""
        return None

    def kernel_density_at(
        self, angles: NDArray[Any], others: NDArray[Any], values: Values
    ) -> NDArray[Any] | None:
        """K(P, P′) on two copies of the torus, all N eigenphases in each; None if no closed form is known."""
        return None

    def kernel(self, irreps: Sequence[Irrep]) -> sympy.ImmutableMatrix:
        """The diagonal matrix of exact k_r."""
        return sympy.ImmutableMatrix(sympy.diag(*[self.coefficient(irrep) for irrep in irreps]))

    def kernel_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """The diagonal matrix of k_r and of their errors, shape (...) + (n, n)."""
        k, error = self.coefficients_at(irreps, values)
        one = np.eye(len(irreps))
        return k[..., None, :] * one, error[..., None, :] * one

    def plaquette_factors(self) -> tuple[CharacterFactor, ...] | None:
        """Exact factors of w(U) of one plaquette, from which k_r and their tail can be proven; None if
        there are none.
        """
        exponent = self.exponent()
        return None if exponent is None else (ExponentialFactor(exponent),)

    def exponent(self) -> ClassFunction | None:
        """ln w(U) of one plaquette as a finite class function, up to a constant; None if it is none."""
        return None

    def inverse_width(self) -> tuple[Expr, Expr, Expr]:
        """(1/τ, a, b) of ln w = −p₂/2τ + a p₄ + b p₂² + O(θ⁶) about U = 1, p_k = Σ_j θ_j^k.

        Raises
        ------
        ClassFunctionError
            If no such expansion is known.
        """
        raise ClassFunctionError(
            f"No expansion about U = 1 is known for a link weight of kind '{self.kind}'; "
            "take the numbers of .coefficients_at at growing couplings."
        )

    def strong_coupling(self, irrep: Irrep, order: int) -> Expr:
        """k_r through a total order in the couplings, with rational coefficients.

        Raises
        ------
        ClassFunctionError
            If ln w(U) is no finite combination of characters.
        """
        from haarloom.actions.strong_coupling import strong_coupling_series

        return strong_coupling_series(self, irrep, order)

    def large_coupling(self, irrep: Irrep) -> Expr:
        """k_r through second order in the width of the plaquette weight about U = 1, exactly."""
        from haarloom.actions.large_coupling import approach_to_one

        return approach_to_one(self, irrep)

    def string_tensions(self, irreps: Sequence[Irrep], values: Values) -> Tensions:
        """σ_r = −ln(k_r)/N_t at one point of parameter space, beside Casimir scaling."""
        from haarloom.actions.tensions import string_tensions

        return string_tensions(self, irreps, values)

    def __matmul__(self, other: Any) -> StackedLinks:
        """One strip after the other in time: the k_r multiply."""
        if not isinstance(other, Link):
            return NotImplemented
        from haarloom.actions.link_products import stacked_links

        return stacked_links(self.group, [self, other])

    def __mul__(self, other: Any) -> CoupledLink:
        """The kernels multiplied point by point, one of them a finite coupling of loops."""
        if not isinstance(other, Link):
            return NotImplemented
        from haarloom.actions.link_products import coupled_link

        return coupled_link(self.group, self, other)

    def formula(self) -> str:
        """LaTeX of the general k_r."""
        return "k_r"

    def latex(self) -> str:
        """The kernel as a sum over characters, with the general k_r spelled out."""
        return rf"K(P,P')=\sum_r k_r\,\chi_r(P)\,\chi_r(P')^*,\qquad k_r={self.formula()}"


class Site(_Weight):
    """Base of site weights; what is written here serves finite ones."""

    finite: ClassVar[bool] = True
    bounds_proven: ClassVar[bool] = True
    """Whether `norm_bound` and `tail_bound` are theorems rather than estimates."""
    unproven: ClassVar[str] = (
        "its characters come from values on the torus of eigenphases, and nothing bounds what lies between "
        "the grid points;"
    )
    """Why there are no exact factors, where there are none."""

    def class_function(self) -> ClassFunction:
        """The exact class function."""
        raise ClassFunctionError(
            f"The site weight '{self.kind}' is not a finite combination of characters; "
            "ask for single coefficients with .coefficient(irrep), or for numbers with "
            ".coefficients_at(irreps, values)."
        )

    def coefficient(self, irrep: Irrep) -> Expr:
        """Exact w_c, zero where absent."""
        return self.class_function()[irrep]

    def support(self) -> tuple[Irrep, ...]:
        """Irreps of the class function in basis order."""
        return tuple(self.class_function())

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """w_c from the exact expressions, with a rounding allowance of `ROUNDING`·|w_c|."""
        support = set(self.support())
        present = [place for place, irrep in enumerate(irreps) if irrep in support]
        numbers = stacked(evaluate([self.coefficient(irreps[place]) for place in present], values))
        w = np.zeros((*numbers.shape[:-1], len(irreps)), dtype=numbers.dtype)
        w[..., present] = numbers
        return w, ROUNDING * np.abs(w)

    def norm_bound(self, values: Values) -> NDArray[Any]:
        """Σ |w_c| d_c, which bounds |W(P)| since |χ_c| ≤ d_c."""
        w, error = self.coefficients_at(self.support(), values)
        return np.asarray(((np.abs(w) + error) * _dimensions(self.support())).sum(axis=-1))

    def reach(self, values: Values) -> int | None:
        """Largest sum of labels in the support; None if infinite."""
        return max((sum(irrep.labels) for irrep in self.support()), default=0) if self.finite else None

    def tail_bound(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Σ |w_c| d_c beyond the cutoff, in full."""
        beyond = [irrep for irrep in self.support() if sum(irrep.labels) > cutoff]
        if not beyond:
            return np.zeros(())
        w, error = self.coefficients_at(beyond, values)
        return np.asarray(((np.abs(w) + error) * _dimensions(beyond)).sum(axis=-1))

    def character_factors(self) -> tuple[CharacterFactor, ...]:
        """Exact factors of W, from which its coefficients and their tail can be proven.

        Raises
        ------
        ConvergenceError
            If W is known by its values alone.
        """
        if not self.finite:
            raise ConvergenceError(
                f"no proven bound exists for the site weight {self.kind}: {self.unproven} "
                "spectrum(...) gives masses with an error that rests on refining the grid."
            )
        return (FiniteFactor(self.class_function()),)

    def density_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """W at the given eigenphases, from its characters unless a class knows a closed form."""
        scalars = {symbol.name: values[symbol.name] for symbol in self.parameters if symbol.name in values}
        return np.asarray(self.class_function().at(angles, **scalars))

    def __mul__(self, other: Any) -> SiteProduct:
        if not isinstance(other, Site):
            return NotImplemented
        from haarloom.actions.product import product_of

        return product_of(self, other)

    def latex(self) -> str:
        """The class function in characters."""
        return rf"W(P)={self.class_function().latex()}"


def _dimensions(irreps: Sequence[Irrep]) -> NDArray[np.float64]:
    return np.array([float(irrep.dimension) for irrep in irreps])


def refuse_group(name: str, group: Any) -> None:
    """Raise unless the first argument of a constructor is a group."""
    if not isinstance(group, SU):
        raise ParameterError(
            f"{name}({group!r}, …): the first argument must be the group; write SU(3) or SU(N)."
        )
