"""The top edge of a pane: its title, a line of facts, and Copy as Python."""

from __future__ import annotations

from pathlib import Path

import anywidget
import traitlets

__all__ = ["FRONT", "PaneHead"]

FRONT = Path(__file__).parent / "front"


class PaneHead(anywidget.AnyWidget):
    """Title bar of a pane; it also carries the style sheet that all parts of the pane use."""

    _esm = FRONT / "head.js"
    _css = (FRONT / "pane.css").read_text("utf-8") + (FRONT / "head.css").read_text("utf-8")

    title = traitlets.Unicode().tag(sync=True)
    status = traitlets.Unicode().tag(sync=True)
    code = traitlets.Unicode().tag(sync=True)
    selvedge = traitlets.Unicode().tag(sync=True)
