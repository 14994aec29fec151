"""The station strip of a loom: what each station holds, and which are open."""

from __future__ import annotations

import anywidget
import traitlets

from haarloom.widgets.head import FRONT

__all__ = ["StationStrip"]


class StationStrip(anywidget.AnyWidget):
    """A row of buttons in the order of the road, each with a summary.

    Attributes
    ----------
    stations
        For each: key, title, summary, thread (its colour).
    opened
        Keys of the open stations. Observable.
    """

    _esm = FRONT / "strip.js"
    _css = FRONT / "strip.css"

    stations = traitlets.List(traitlets.Dict()).tag(sync=True)
    opened = traitlets.List(traitlets.Unicode()).tag(sync=True)
