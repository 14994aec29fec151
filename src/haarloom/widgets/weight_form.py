"""A weight as a form: its kind, and one field for each of its parameters."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import ipywidgets
import traitlets

from haarloom.actions.registry import REGISTRY, Entry
from haarloom.exceptions import HaarloomError
from haarloom.widgets.field_text import choices_of, default_text, read_text, shown_text
from haarloom.widgets.fields import LABEL, FaultLine, Field, column

if TYPE_CHECKING:
    from haarloom.actions import parameters
    from haarloom.actions.protocols import Weight
    from haarloom.algebra.group import SU

__all__ = ["WeightForm", "default_weight", "kinds_of"]


class WeightForm(ipywidgets.VBox):
    """Choose a kind of weight and fill in its fields.

    Parameters
    ----------
    family
        ``"link"`` or ``"site"``: whose kinds the registry offers.
    weight
        What to start from. A weight of a kind that is not on offer is kept, and shown without fields.

    Attributes
    ----------
    weight
        The last good weight. Observable, may be set; untouched by bad input.
    """

    weight = traitlets.Any()

    def __init__(self, family: str, weight: Weight) -> None:
        self._kinds = kinds_of(family)
        self._fields: dict[str, Field] = {}
        self._own_change = False
        self._choice = ipywidgets.Dropdown(description="kind", style=LABEL)
        self._line = FaultLine()
        self._rows = column()
        super().__init__([self._choice, self._line, self._rows])
        self.add_class("hl-column")
        self.weight = weight
        self._show()
        self._choice.observe(self._change_kind, "value")
        self.observe(self._follow, "weight")

    def _follow(self, _: Any) -> None:
        if not self._own_change:
            self._show()

    def _show(self) -> None:
        """Lay the form out for the present weight."""
        described = dict(self.weight.describe())
        kind = described.pop("kind")
        self._own_change = True
        try:
            self._choice.options = [*self._kinds, *([] if kind in self._kinds else [kind])]
            self._choice.value = kind
        finally:
            self._own_change = False
        entry = self._kinds.get(kind)
        self._lay_out(entry, {name: shown_text(value) for name, value in described.items()})

    def _lay_out(self, entry: Entry | None, texts: Mapping[str, str]) -> None:
        self._line.message = ""
        self._fields = {
            field.name: self._row(field, texts[field.name]) for field in (entry.fields if entry else ())
        }
        self._rows.children = list(self._fields.values())

    def _row(self, field: parameters.Field, text: str) -> Field:
        return Field(
            field.name,
            text,
            lambda typed: self._with_text(field.name, typed),
            help=field.help,
            choices=choices_of(field),
        )

    def _with_text(self, name: str, text: str) -> str:
        """Rebuild the weight with one field changed; what the constructor refuses is raised."""
        texts = {key: field.value for key, field in self._fields.items()} | {name: text}
        self._set_weight(self._built(self._choice.value, texts))
        return text

    def _change_kind(self, _: Any) -> None:
        if self._own_change or self._choice.value not in self._kinds:
            return
        try:
            weight = default_weight(self._choice.value, self.weight.group)
        except HaarloomError as problem:
            self._line.message = str(problem)
            return
        self._set_weight(weight)
        self._show()

    def _built(self, kind: str, texts: Mapping[str, str]) -> Weight:
        entry = self._kinds[kind]
        arguments = {field.name: read_text(field, texts[field.name]) for field in entry.fields}
        return entry.constructor(self.weight.group, **arguments)

    def _set_weight(self, weight: Weight) -> None:
        self._own_change = True
        try:
            self.weight = weight
        finally:
            self._own_change = False


def kinds_of(family: str) -> dict[str, Entry]:
    """Entries of a family that a form can fill in; a product is made of several forms."""
    return {
        kind: entry
        for kind, entry in REGISTRY.items()
        if entry.family == family and not any(field.domain == "weights" for field in entry.fields)
    }


def default_weight(kind: str, group: SU) -> Weight:
    """A weight of a kind with every field at its default."""
    entry = REGISTRY[kind]
    arguments = {field.name: read_text(field, default_text(field, group)) for field in entry.fields}
    return entry.constructor(group, **arguments)
