"""Input fields: a control with its help, and the line beside it that says what is wrong."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from html import escape
from typing import Any

import ipywidgets
import traitlets

from haarloom.exceptions import HaarloomError

__all__ = ["LABEL", "FaultLine", "Field", "column", "section"]

LABEL = {"description_width": "88px"}
"""Style of every labelled control: names in one column."""


class FaultLine(ipywidgets.HTML):
    """One line for one problem; it takes no room while there is none."""

    message = traitlets.Unicode()

    def __init__(self) -> None:
        super().__init__(layout={"display": "none"})
        self.add_class("hl-note")
        self.observe(self._show, "message")

    def _show(self, _: Any) -> None:
        words, _, quoted = self.message.partition("\n")
        excerpt = f"<pre>{escape(quoted)}</pre>" if quoted else ""
        self.value = f'<div class="hl-fault-line" role="alert">{escape(words)}{excerpt}</div>'
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
    choices
        The only texts there are; they make the control a menu.

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
        choices: Sequence[str] = (),
    ) -> None:
        self._parse, self._text_of = parse, show
        common = {"value": show(value), "description": label, "tooltip": help, "style": LABEL}
        if choices:
            self.control = ipywidgets.Dropdown(options=list(choices), **common)
        else:
            self.control = ipywidgets.Text(continuous_update=False, **common)
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
            value = self._parse(self.control.value)
        except HaarloomError as problem:
            self.fault = str(problem)
            return
        # first the line, then the value: whoever uses the value may still find fault with it
        self.fault = ""
        self.value = value

    def _write(self, _: Any) -> None:
        self.control.value = self._text_of(self.value)


def section(title: str) -> ipywidgets.HTML:
    """A small heading inside a column of controls."""
    heading = ipywidgets.HTML(escape(title))
    heading.add_class("hl-section")
    return heading


def column(*children: ipywidgets.Widget) -> ipywidgets.VBox:
    """Widgets one below the other, which may shrink to the width of the column."""
    return ipywidgets.VBox(list(children)).add_class("hl-column")
