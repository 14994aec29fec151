"""How a tensor product comes about, told step by step in one of two forms.

``"weights"``: each weight of the smaller factor, where it lands, what is reflected and with what sign, what
drops out on a wall, what cancels. ``"tableaux"``: each filling of Littlewood and Richardson and the irrep
it stands for.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise
from typing import TYPE_CHECKING

from haarloom.algebra.faces import story_table
from haarloom.algebra.invariants import dimension
from haarloom.algebra.labels import Labels, Rows, labels_from_rows, rows_from_labels
from haarloom.algebra.names import name_from_labels
from haarloom.algebra.products import check_product_size, multiply
from haarloom.algebra.tableaux import Filling, fillings
from haarloom.algebra.weights import reflected, weight_system
from haarloom.exceptions import ParameterError, SizeError

if TYPE_CHECKING:
    from haarloom.algebra.irrep import Irrep

__all__ = ["ProductStory", "TableauStep", "WeightStep", "stories"]

_SHOWN = 40
_MOST_FILLINGS = 200_000


@dataclass(frozen=True)
class WeightStep:
    """One weight of the smaller factor at work.

    Attributes
    ----------
    weight : Dynkin labels of the weight
    multiplicity : how often it occurs in the smaller factor
    landing : labels of the larger factor's highest weight plus this weight; may be negative
    result : labels of the irrep it counts for, None on a wall
    sign : +1 inside the chamber or after an even reflection, −1 after an odd one, 0 on a wall
    """

    weight: Labels
    multiplicity: int
    landing: Labels
    result: Labels | None
    sign: int

    def text(self) -> str:
        """One line of plain text."""
        head = f"{self.weight} ×{self.multiplicity} → {self.landing}"
        if self.result is None:
            return f"{head}: on a wall, drops out"
        target = f"{self.sign * self.multiplicity:+d} {name_from_labels(self.result)} {self.result}"
        return f"{head}: {target}" if self.result == self.landing else f"{head}: reflected, {target}"


@dataclass(frozen=True)
class TableauStep:
    """One admissible filling and the irrep it stands for."""

    filling: Filling
    result: Labels

    def text(self) -> str:
        """The tableau in one line, rows separated by bars."""
        drawn = self.filling.text().replace("\n", " | ") or "(empty)"
        return f"{drawn} → {name_from_labels(self.result)} {self.result}"


@dataclass(frozen=True)
class ProductStory:
    """The steps of one product of two irreps.

    Attributes
    ----------
    left, right : Irrep
    form : "weights" or "tableaux"
    steps : tuple of WeightStep or TableauStep
    """

    left: Irrep
    right: Irrep
    form: str
    steps: tuple[WeightStep, ...] | tuple[TableauStep, ...]

    @cached_property
    def result(self) -> dict[Labels, int]:
        """The product as the steps give it."""
        total: Counter[Labels] = Counter()
        for step in self.steps:
            if step.result is not None:
                total[step.result] += step.sign * step.multiplicity if isinstance(step, WeightStep) else 1
        return {labels: count for labels, count in total.items() if count}

    def cancelled(self) -> dict[Labels, int]:
        """How many copies of each irrep were taken away by reflected weights; empty for tableaux."""
        removed: Counter[Labels] = Counter()
        for step in self.steps:
            if isinstance(step, WeightStep) and step.sign < 0 and step.result is not None:
                removed[step.result] += step.multiplicity
        return dict(removed)

    def summary(self) -> str:
        """What happened, in one sentence."""
        if self.form == "tableaux":
            return f"{len(self.steps)} fillings, {len(self.result)} different irreps."
        weights = [step for step in self.steps if isinstance(step, WeightStep)]
        walls = sum(step.multiplicity for step in weights if step.sign == 0)
        moved = sum(step.multiplicity for step in weights if step.sign and step.result != step.landing)
        total = sum(step.multiplicity for step in weights)
        return (
            f"{total} weights: {total - walls - moved} land in the chamber, {moved} are reflected, "
            f"{walls} drop out on walls; {sum(self.cancelled().values())} pairs cancel, "
            f"{len(self.result)} different irreps stay."
        )

    def text(self, shown: int = _SHOWN) -> str:
        """The story as plain text; of more than ``shown`` steps only the first ones, then the summary."""
        lines = [f"{self.left.name} ⊗ {self.right.name} by {self.form}"]
        lines += [f"  {step.text()}" for step in self.steps[:shown]]
        if len(self.steps) > shown:
            lines.append(f"  … and {len(self.steps) - shown} more steps")
        return "\n".join([*lines, f"  {self.summary()}"])

    def __str__(self) -> str:
        return self.text()

    def _repr_html_(self) -> str:
        return story_table(self, _SHOWN)


def stories(factors: Sequence[Irrep], form: str) -> tuple[ProductStory, ...]:
    """The product of several irreps, two at a time from the left: one story for each pair that is multiplied.

    An irrep that occurs several times on the way is told once; its multiplicity stands in the story before.

    Raises
    ------
    ParameterError
        For an unknown form, or fewer than two factors.
    SizeError
        When a product has more than 200,000 fillings to list.
    """
    if form not in ("weights", "tableaux"):
        raise ParameterError(f'form {form!r} given; steps are told by "weights" or by "tableaux".')
    if len(factors) < 2:
        raise ParameterError(
            "the factors of this decomposition are not known; steps() needs a product of irreps."
        )
    told: list[ProductStory] = []
    current = [factors[0]]
    for factor in factors[1:]:
        stage = [_story(left, factor, form) for left in current]
        told += stage
        labels = {found for story in stage for found in story.result}
        current = sorted(factor.group.irrep(found) for found in labels)
    return tuple(told)


def _story(left: Irrep, right: Irrep, form: str) -> ProductStory:
    check_product_size(left.labels, right.labels)
    steps = _weight_steps(left, right) if form == "weights" else _tableau_steps(left, right)
    return ProductStory(left, right, form, steps)


def _weight_steps(left: Irrep, right: Irrep) -> tuple[WeightStep, ...]:
    small, large = sorted((left.labels, right.labels), key=dimension)
    start = rows_from_labels(large)
    system = weight_system(small)
    return tuple(_weight_step(start, content, system[content]) for content in sorted(system, reverse=True))


def _weight_step(start: Rows, content: Rows, multiplicity: int) -> WeightStep:
    size = len(start)
    moved = tuple(a + b for a, b in zip(start, content, strict=True))
    sign, ordered = reflected(tuple(row + size - 1 - i for i, row in enumerate(moved)))
    result = tuple(a - b - 1 for a, b in pairwise(ordered)) if sign else None
    return WeightStep(labels_from_rows(content), multiplicity, labels_from_rows(moved), result, sign)


def _tableau_steps(left: Irrep, right: Irrep) -> tuple[TableauStep, ...]:
    count = sum(multiply(left.labels, right.labels).values())
    if count > _MOST_FILLINGS:
        raise SizeError(
            f"{left!r} ⊗ {right!r} has {count:,} fillings, more than {_MOST_FILLINGS:,} to list: "
            'use form="weights", or smaller irreps.'
        )
    small, large = sorted((left.labels, right.labels), key=dimension)
    return tuple(TableauStep(filling, filling.labels) for filling in fillings(large, small))
