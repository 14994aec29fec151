"""Statements about a weight: what was found, in words, and whether it was proven or measured."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal

from haarloom.actions.base import Link, Site
from haarloom.actions.coefficient_table import CoefficientTable
from haarloom.actions.parameters import Values, named_values
from haarloom.actions.pictures import table_html
from haarloom.exceptions import MissingValueError

__all__ = ["ROUNDING", "Statement", "WeightAnalysis", "accuracy_statement", "numbers_for"]

Basis = Literal["exact", "measured", "not known"]

ROUNDING = 1e-11
"""Relative size below which a number counts as zero in a measured statement."""


@dataclass(frozen=True)
class Statement:
    """One property of a weight.

    Attributes
    ----------
    name : str
        Short key, such as ``"positive"``.
    holds : bool or None
        None where the question does not apply or was not decided.
    words : str
        What was found, in a sentence.
    basis : {"exact", "measured", "not known"}
        Proven from the exact expressions, or seen in numbers at the given point.
    """

    name: str
    holds: bool | None
    words: str
    basis: Basis


@dataclass(frozen=True)
class WeightAnalysis:
    """Statements about one weight or one pair, at one point of parameter space.

    ``analysis["positive"]`` is the statement of that name; in a notebook the analysis shows a table and the
    picture.
    """

    title: str
    values: Mapping[str, complex]
    statements: tuple[Statement, ...]
    picture: str = ""

    def __getitem__(self, name: str) -> Statement:
        for statement in self.statements:
            if statement.name == name:
                return statement
        raise KeyError(
            f"{name!r} is no statement; ask for one of {', '.join(s.name for s in self.statements)}"
        )

    def __repr__(self) -> str:
        given = ", ".join(f"{name} = {value:g}" for name, value in self.values.items())
        lines = [f"{self.title}" + (f" at {given}" if given else "")]
        return "\n".join(
            lines + [f"  {s.name}: {_answer(s)} ({s.basis}). {s.words}" for s in self.statements]
        )

    def _repr_html_(self) -> str:
        rows = [[s.name, _answer(s), s.words, s.basis] for s in self.statements]
        return self.picture + table_html(
            ["property", "holds", "what was found", "how"], rows, self.title, words=True
        )


def _answer(statement: Statement) -> str:
    return {True: "yes", False: "no", None: "—"}[statement.holds]


def numbers_for(weight: Any, values: Values) -> dict[str, complex]:
    names = {symbol.name for symbol in weight.parameters}
    missing = sorted(names - set(values))
    if missing:
        raise MissingValueError(
            f"No value for {', '.join(missing)}: an analysis needs a number for each, {missing[0]}=0.5."
        )
    return {name: value.item() for name, value in named_values(values).items() if name in names}


def accuracy_statement(weight: Link | Site) -> Statement:
    bounds = (
        "Bounds on what a cutoff leaves out are proven."
        if weight.bounds_proven
        else ("Bounds on what a cutoff leaves out are estimates.")
    )
    words = " ".join(
        [weight.accuracy, bounds, *([weight.note] if isinstance(weight, CoefficientTable) else [])]
    )
    return Statement("proven bounds", weight.bounds_proven, words, "exact")
