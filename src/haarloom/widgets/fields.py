"""Input fields: a control with its help, and the line beside it that says what is wrong."""

from __future__ import annotations

from collections.abc import Callable
from html import escape
from typing import Any

import ipywidgets
import traitlets

from haarloom.exceptions import HaarloomError

__all__ = ["FaultLine", "Field", "section"]


class FaultLine(ipywidgets.HTML):
    """One line for one problem; it takes no room while there is none."""

    message = traitlets.Unicode()

    def __init__(self) -> None:
        super().__init__(layout={"display": "none"})
        self.add_class("hl-note")
        self.observe(self._show, "message")

    def _show(self, _: Any) -> None:
        self.value = f'<div class="hl-fault-line" role="alert">{escape(self.message)}</div>'
        self.layout.display = None if self.message else "none"


class Field(ipywidgets.VBox):
    """A line of text that is read by ``parse``; what ``parse`` refuses is said below it.

    Parameters
    ----------
    label
        Name of the field.
    value
        Starting value.
    parse
        Turns text into a value; raises :class:`HaarloomError` for what it does not accept.
    show
        Turns a value into text that ``parse`` reads back.
    help
        One sentence on meaning and domain.

    Attributes
    ----------
    value
        The last good value. Observable, may be set; untouched by bad text.
    fault
        What is wrong with the text, or "".
    """

    value = traitlets.Any()
    fault = traitlets.Unicode()

    def __init__(
        self,
        label: str,
        value: Any,
        parse: Callable[[str], Any],
        show: Callable[[Any], str] = str,
        help: str = "",
    ) -> None:
        self._parse, self._text_of = parse, show
        self.control = ipywidgets.Text(
            value=show(value), description=label, tooltip=help, continuous_update=False, style={"description_width": "88px"}
        )  # fmt: skip
        line = FaultLine()
        hint = ipywidgets.HTML(f'<div class="hl-hint">{escape(help)}</div>')
        hint.add_class("hl-note")
        super().__init__([self.control, line, hint] if help else [self.control, line])
        self.add_class("hl-field")
        traitlets.dlink((self, "fault"), (line, "message"))
        self.value = value
        self.control.observe(self._read, "value")
        self.observe(self._write, "value")

    def _read(self, _: Any) -> None:
        if self.control.value == self._text_of(self.value):
            self.fault = ""
            return
        try:
            self.value = self._parse(self.control.value)
        except HaarloomError as problem:
            self.fault = str(problem)
        else:
            self.fault = ""

    def _write(self, _: Any) -> None:
        self.control.value = self._text_of(self.value)


def section(title: str) -> ipywidgets.HTML:
    """A small heading inside a column of controls."""
    heading = ipywidgets.HTML(escape(title))
    heading.add_class("hl-section")
    return heading
