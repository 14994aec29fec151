"""What every pane has: a head, a body, a fault line, faces for a notebook without a kernel."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from html import escape
from threading import RLock
from typing import Any

import ipywidgets
import traitlets

from haarloom.exceptions import HaarloomError
from haarloom.widgets.dyes import selvedge
from haarloom.widgets.fields import FaultLine
from haarloom.widgets.head import PaneHead

__all__ = ["Pane"]

_ONE_AT_A_TIME = RLock()
"""Notebooks may deliver widget messages on a thread beside the one that runs cells (kernel subshells)."""


class Pane(ipywidgets.VBox):
    """Base of the panes.

    A subclass names itself, fills the body, and says in ``_draw`` how to bring the screen up to
    date. Where ``first_drawing`` is called, what is wrong with the input is raised; later drawings say
    it in the fault line. A pane that is not ``active`` (a closed station of a loom)
    waits with drawing until it is.

    Attributes
    ----------
    values
        Numbers for the parameters, by name. Observable.
    code
        Python that rebuilds what is on the screen. Observable.
    fault
        What is wrong with the present input, or "". The last good result stays on the screen.
    active
        Whether the pane draws.
    """

    name = "Pane"
    dyes = (0, 1)

    values = traitlets.Dict(value_trait=traitlets.Float(), key_trait=traitlets.Unicode())
    code = traitlets.Unicode()
    fault = traitlets.Unicode()
    active = traitlets.Bool(True)

    _line_is_placed = False

    def __init__(self, body: ipywidgets.Widget, **traits: Any) -> None:
        self._head = PaneHead(title=self.name, selvedge=selvedge(*self.dyes))
        self._late, self._held = False, 0
        body.add_class("hl-body")
        line = [] if self._line_is_placed else [self.fault_line()]
        super().__init__([self._head, *line, body], **traits)
        for css in ("haarloom", "hl-pane"):
            self.add_class(css)
        traitlets.dlink((self, "code"), (self._head, "code"))
        self.observe(self._catch_up, "active")

    def fault_line(self) -> FaultLine:
        """A line that shows ``fault``, for the place beside the controls.

        A subclass that does not ask for it before it calls the base's constructor has it below the head.
        """
        line = FaultLine()
        traitlets.dlink((self, "fault"), (line, "message"))
        self._line_is_placed = True
        return line

    def first_drawing(self) -> None:
        """Draw for the first time: what is wrong is raised, for there is no good result to keep."""
        self._draw()
        self.code = self._source()

    def refresh(self, *_: Any) -> None:
        """Draw now, or when the pane becomes active; bad input leaves the last good picture."""
        with _ONE_AT_A_TIME:
            self._late = not self.active or self._held > 0
            if self._late:
                return
            with self.excused():
                self._draw()
                self.code = self._source()

    @contextmanager
    def one_drawing(self) -> Iterator[None]:
        """Change several traits and draw once, at the end."""
        with _ONE_AT_A_TIME:
            self._held += 1
            try:
                yield
            finally:
                self._held -= 1
                self._catch_up()

    @contextmanager
    def excused(self) -> Iterator[None]:
        """Turn a :class:`HaarloomError` into the pane's fault line, and clear it on success."""
        try:
            yield
        except HaarloomError as problem:
            words, line, quoted = str(problem).partition("\n")
            self.fault = f"{words} What is shown is the last good result.{line}{quoted}"
        else:
            self.fault = ""

    @property
    def status(self) -> str:
        """The line of facts beside the title."""
        return str(self._head.status)

    @status.setter
    def status(self, text: str) -> None:
        self._head.status = text

    @property
    def summary(self) -> str:
        """A few words for the station strip of a loom."""
        return self.status

    def _draw(self) -> None:
        raise NotImplementedError

    def _source(self) -> str:
        raise NotImplementedError

    def _facts_html(self) -> str:
        """Body of the ``text/html`` face: what is on the screen, as static HTML."""
        return ""

    def _facts_text(self) -> str:
        """Lines of the ``text/plain`` face under the title."""
        return ""

    def _catch_up(self, *_: Any) -> None:
        if self._late:
            self.refresh()

    def __repr__(self) -> str:
        facts = self._facts_text()
        first = f"{self.name}: {self.status}" if self.status else self.name
        return f"{first}\n{facts}" if facts else first

    def _repr_html_(self) -> str:
        status = f' <span style="opacity:.75">{escape(self.status)}</span>' if self.status else ""
        return (
            '<section style="border-left:6px solid #5872b4;padding:2px 0 2px 12px">'
            f"<p><b>{escape(self.name)}</b>{status}</p>{self._facts_html()}"
            f"<details><summary>Python</summary><pre>{escape(self.code)}</pre></details></section>"
        )

    def _repr_mimebundle_(self, **kwargs: Any) -> dict[str, Any]:
        bundle = dict(super()._repr_mimebundle_(**kwargs) or {})
        return bundle | {"text/plain": repr(self), "text/html": self._repr_html_()}
