"""What every pane has: a head, a body, a fault line, faces for a notebook without a kernel."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from html import escape
from typing import Any

import ipywidgets
import traitlets

from haarloom.exceptions import HaarloomError
from haarloom.widgets.dyes import selvedge
from haarloom.widgets.fields import FaultLine
from haarloom.widgets.head import PaneHead

__all__ = ["Pane", "column"]


class Pane(ipywidgets.VBox):
    """Base of the panes.

    A subclass names itself, fills the body, and says in ``_draw`` how to bring the screen up to
    date. A pane that is not ``active`` (a closed station of a loom) waits with drawing until it is.

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

    def __init__(self, body: ipywidgets.Widget, **traits: Any) -> None:
        self._head = PaneHead(title=self.name, selvedge=selvedge(*self.dyes))
        self._fault_line = FaultLine()
        self._late = False
        body.add_class("hl-body")
        super().__init__([self._head, self._fault_line, body], **traits)
        for css in ("haarloom", "hl-pane"):
            self.add_class(css)
        traitlets.dlink((self, "code"), (self._head, "code"))
        traitlets.dlink((self, "fault"), (self._fault_line, "message"))
        self.observe(self._catch_up, "active")

    def refresh(self, *_: Any) -> None:
        """Draw now, or when the pane becomes active; bad input leaves the last good picture."""
        if not self.active:
            self._late = True
            return
        self._late = False
        with self.excused():
            self._draw()
            self.code = self._source()

    @contextmanager
    def excused(self) -> Iterator[None]:
        """Turn a :class:`HaarloomError` into the pane's fault line, and clear it on success."""
        try:
            yield
        except HaarloomError as problem:
            self.fault = str(problem)
        else:
            self.fault = ""

    @property
    def status(self) -> str:
        """The line of facts beside the title."""
        return str(self._head.status)

    @status.setter
    def status(self, text: str) -> None:
        self._head.status = text

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

    def _catch_up(self, _: Any) -> None:
        if self.active and self._late:
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


def column(*children: ipywidgets.Widget) -> ipywidgets.VBox:
    """Widgets one below the other, which may shrink to the width of the column."""
    return ipywidgets.VBox(list(children)).add_class("hl-column")
