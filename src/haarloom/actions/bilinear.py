"""General bilinear couplings of neighbouring loops, Σ λ_rs χ_r(P) χ_s(P′)*."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr, S

from haarloom.actions.base import ROUNDING, Link, refuse_group, stacked
from haarloom.actions.irrep_words import irrep_of
from haarloom.actions.parameters import Field, Parameter, Values, as_parameter, evaluate
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ParameterError

__all__ = ["BilinearCoupling", "Pair", "bilinear_coupling"]

_TABLE = Field(
    "couplings",
    "irrep pair table",
    "(trivial, trivial): 1, (fundamental, fundamental): lam",
    "λ_rs by pair of irreps, Σ λ_rs χ_r(P) χ_s(P')*",
)
_ENTRY = Field("lam", "complex", "lam", "coupling of one pair of irreps")

Pair = tuple[Irrep, Irrep]


def bilinear_coupling(
    group: SU, couplings: Mapping[tuple[Irrep | str, Irrep | str], Parameter] | str
) -> BilinearCoupling:
    """Link weight Σ_rs λ_rs χ_r(P) χ_s(P′)*, in general not diagonal in the irreps.

    Parameters
    ----------
    group : SU
    couplings : mapping, or text
        From a pair of irreps to λ_rs, ``{("3", "3"): "lam"}``; or text ``"(3, 3): lam, (3, 6bar): mu"``.
        Pairs that are not listed have λ_rs = 0, the pair of trivial irreps included.

    Raises
    ------
    ParameterError
        If the table is empty, names a pair twice, or cannot be read.
    """
    refuse_group("bilinear_coupling", group)
    table = _table_of_text(couplings) if isinstance(couplings, str) else couplings
    if not isinstance(table, Mapping) or not table:
        raise ParameterError(
            f"couplings = {couplings!r}: a table of pairs is needed, for instance {_TABLE.default}."
        )
    found: dict[Pair, Expr] = {}
    for key, value in table.items():
        pair = _pair(group, key)
        if pair in found:
            raise ParameterError(
                f"couplings names ({pair[0].name}, {pair[1].name}) twice; keep one of the two."
            )
        found[pair] = as_parameter(value, _ENTRY)
    return BilinearCoupling(group, tuple(sorted(found.items(), key=lambda item: item[0])))


def _pair(group: SU, key: Any) -> Pair:
    if isinstance(key, str):
        key = [part.strip() for part in _split(key.strip().removeprefix("(").removesuffix(")"))]
    if not isinstance(key, Sequence) or len(key) != 2:
        raise ParameterError(f"couplings: {key!r} is no pair of irreps; write ('3', '3bar').")
    return irrep_of(group, key[0]), irrep_of(group, key[1])


def _table_of_text(text: str) -> dict[str, str]:
    """Entries ``(r, s): value``, separated by commas."""
    table: dict[str, str] = {}
    for entry in _split(text):
        key, colon, value = entry.rpartition(":")
        if not colon or key.strip() in table:
            raise ParameterError(
                f"couplings: {entry.strip()!r} is no new entry; write (irrep, irrep): value, separated by "
                f"commas."
            )
        table[key.strip()] = value.strip()
    return table


def _split(text: str) -> list[str]:
    """Pieces between commas that stand outside all brackets."""
    pieces, depth = [""], 0
    for letter in text:
        depth += (letter == "(") - (letter == ")")
        if letter == "," and depth == 0:
            pieces.append("")
        else:
            pieces[-1] += letter
    return pieces


@dataclass(frozen=True)
class BilinearCoupling(Link):
    """Σ_rs λ_rs χ_r(P) χ_s(P′)*; see `bilinear_coupling`."""

    group: SU
    couplings: tuple[tuple[Pair, Expr], ...]

    kind: ClassVar[str] = "bilinear coupling"
    FIELDS: ClassVar[tuple[Field, ...]] = (_TABLE,)
    bounds_proven: ClassVar[bool] = True

    @property
    def diagonal(self) -> bool:  # type: ignore[override]
        """True if only pairs (r, r) are coupled."""
        return all(first == second for (first, second), _ in self.couplings)

    def coefficient(self, irrep: Irrep) -> Expr:
        """The diagonal element λ_rr."""
        return dict(self.couplings).get((irrep, irrep), S.Zero)

    def kernel(self, irreps: Sequence[Irrep]) -> sympy.ImmutableMatrix:
        """The matrix λ_rs on the given irreps."""
        table = dict(self.couplings)
        rows = [[table.get((r, s), S.Zero) for s in irreps] for r in irreps]
        return sympy.ImmutableMatrix(len(irreps), len(irreps), [value for row in rows for value in row])

    def kernel_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """λ_rs as numbers, and a rounding allowance."""
        place = {irrep: i for i, irrep in enumerate(irreps)}
        inside = [((place[r], place[s]), v) for (r, s), v in self.couplings if r in place and s in place]
        numbers = stacked(evaluate([value for _, value in inside], values))
        matrix = np.zeros((*numbers.shape[:-1], len(irreps), len(irreps)), dtype=numbers.dtype)
        for index, ((i, j), _) in enumerate(inside):
            matrix[..., i, j] = numbers[..., index]
        return matrix, ROUNDING * np.abs(matrix)

    def largest_outside(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Σ |λ_rs| over pairs with a label sum beyond the cutoff: a proven bound of the norm left out."""
        outside = [v for pair, v in self.couplings if max(sum(r.labels) for r in pair) > cutoff]
        return np.asarray(np.abs(stacked(evaluate(outside, values))).sum(axis=-1) * (1 + ROUNDING))

    @property
    def kernel_reach(self) -> int:
        """Largest Σ a_i of the irreps coupled."""
        return max(sum(irrep.labels) for pair, _ in self.couplings for irrep in pair)

    def kernel_density_at(self, angles: NDArray[Any], others: NDArray[Any], values: Values) -> NDArray[Any]:
        """K(P, P′) on two copies of the torus, all N eigenphases in each, the two broadcast."""
        from haarloom.torus.characters import character

        numbers = evaluate([value for _, value in self.couplings], values)
        terms = (
            number * character(r, angles) * character(s, others).conj()
            for ((r, s), _), number in zip(self.couplings, numbers, strict=True)
        )
        return np.asarray(sum(terms))

    def formula(self) -> str:
        """LaTeX of the couplings."""
        listed = r",\ ".join(
            rf"\lambda_{{{r.latex()},{s.latex()}}}={sympy.latex(value)}" for (r, s), value in self.couplings
        )
        return rf"\lambda_{{rs}}:\ {listed}"

    def latex(self) -> str:
        """The kernel as a double sum."""
        return rf"K(P,P')=\sum_{{rs}}\lambda_{{rs}}\,\chi_r(P)\,\chi_s(P')^*,\qquad {self.formula()}"
