"""Python source that rebuilds what a pane shows."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from haarloom.actions.protocols import Weight
    from haarloom.ring.model import RingModel

__all__ = ["call", "model_lines", "number_text", "values_text", "weight_text"]

OPENING = ("import haarloom as hl", "")


def number_text(value: float) -> str:
    """A number without the dust that a slider's arithmetic leaves behind."""
    return repr(float(f"{value:.12g}"))


def values_text(values: Mapping[str, float]) -> str:
    """``{"t": 1.0, "z": 0.3}``."""
    return "{" + ", ".join(f'"{name}": {number_text(value)}' for name, value in values.items()) + "}"


def call(name: str, *arguments: str, **keywords: str | None) -> str:
    """``name(a, b, key=c)`` from pieces that are Python source already; None leaves a keyword out."""
    given = [f"{key}={text}" for key, text in keywords.items() if text is not None]
    return f"{name}({', '.join([*arguments, *given])})"


def model_lines(model: RingModel) -> list[str]:
    """Lines that rebuild a model under the name ``model``."""
    return [
        *OPENING,
        f"G = hl.{model.group!r}",
        f"link = {weight_text(model.link)}",
        f"site = {weight_text(model.site)}",
        "model = hl.RingModel(link, site)",
    ]


def weight_text(weight: Weight) -> str:
    return repr(weight)
