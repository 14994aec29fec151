"""Python source that rebuilds what a pane shows."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from haarloom.actions.registry import REGISTRY, Entry, build

if TYPE_CHECKING:
    from haarloom.actions.protocols import Weight
    from haarloom.algebra.group import SU
    from haarloom.ring.model import RingModel

__all__ = ["call", "model_lines", "number_text", "opening_lines", "values_text", "weight_lines"]


def opening_lines(group: SU) -> list[str]:
    """The import, and the group under the name ``G``."""
    return ["import haarloom as hl", "", f"G = hl.{group!r}"]


def model_lines(model: RingModel) -> list[str]:
    """Lines that rebuild a model under the name ``model``."""
    return [
        *opening_lines(model.group),
        *weight_lines("link", model.link),
        *weight_lines("site", model.site),
        "model = hl.RingModel(link, site)",
    ]


def weight_lines(name: str, weight: Weight) -> list[str]:
    """Lines that rebuild a weight under a name.

    A weight that the registry does not know cannot be written down: a comment asks for it.
    """
    description = dict(weight.describe())
    if not _known(description):
        return [
            f"# {name}: a weight of the class {type(weight).__name__}, to be defined under this name first"
        ]
    return [f"{name} = {_weight_text(description, weight.group)}"]


def values_text(values: Mapping[str, float]) -> str:
    """``{"t": 1.0, "z": 0.3}``."""
    return "{" + ", ".join(f'"{name}": {number_text(value)}' for name, value in values.items()) + "}"


def number_text(value: float) -> str:
    """A number without the dust that a slider's arithmetic leaves behind."""
    return repr(float(f"{value:.12g}"))


def call(name: str, *arguments: str, **keywords: str | None) -> str:
    """``name(a, b, key=c)`` from pieces that are Python source already; None leaves a keyword out."""
    given = [f"{key}={text}" for key, text in keywords.items() if text is not None]
    return f"{name}({', '.join([*arguments, *given])})"


def _known(description: Mapping[str, Any]) -> bool:
    if description["kind"] == "product":
        return all(_known(factor) for factor in description["factors"])
    return description["kind"] in REGISTRY


def _weight_text(description: Mapping[str, Any], group: SU) -> str:
    if description["kind"] == "product":
        return " * ".join(_weight_text(factor, group) for factor in description["factors"])
    entry = REGISTRY[description["kind"]]
    fields = _needed(entry, description, group)
    required = [field.name for field in entry.fields if not field.optional]
    texts = {name: json.dumps(value, ensure_ascii=False) for name, value in fields.items()}
    positional = [texts.pop(name) for name in required]
    return call(f"hl.{entry.name}", "G", *positional, **texts)


def _needed(entry: Entry, description: Mapping[str, Any], group: SU) -> dict[str, Any]:
    """The described fields, without the optional ones that change nothing."""
    weight = build(group, description)
    fields = {name: value for name, value in description.items() if name != "kind"}
    for field in entry.fields:
        fewer = {name: value for name, value in fields.items() if name != field.name}
        if field.optional and entry.constructor(group, **fewer) == weight:
            fields = fewer
    return fields
