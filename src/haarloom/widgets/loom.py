"""All panes around one model: change a weight or a value, and everything follows."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from contextlib import ExitStack
from typing import TYPE_CHECKING, Any

import ipywidgets
import traitlets

from haarloom.exceptions import ParameterError
from haarloom.widgets.arguments import checked_mapping, checked_model
from haarloom.widgets.copy_code import call, model_lines, values_text
from haarloom.widgets.dyes import dye
from haarloom.widgets.element_pane import ElementPane
from haarloom.widgets.link_pane import LinkPane
from haarloom.widgets.pane import Pane
from haarloom.widgets.parameters import checked_start
from haarloom.widgets.site_pane import SitePane
from haarloom.widgets.spectrum_pane import SpectrumPane
from haarloom.widgets.strip import StationStrip

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["Loom"]

STATIONS = ("link", "site", "matrix", "spectrum")


class Loom(Pane):
    """The road from action to masses as one instrument.

    Parameters
    ----------
    model
        The ring model to start from.
    values
        Numbers for its parameters; sensible ones where left out.
    opened
        Stations on the screen, out of ``"link"``, ``"site"``, ``"matrix"``, ``"spectrum"``.
    matrix, spectrum
        Keywords for :class:`ElementPane` and :class:`SpectrumPane`.
    ranges
        {name: (lowest, highest)} for the sliders.

    Attributes
    ----------
    model, values, opened
        Observable, and may be set.
    link_pane, site_pane, element_pane, spectrum_pane
        The panes.
    """

    name = "Loom"
    dyes = (1, 4)

    model = traitlets.Any()
    opened = traitlets.List(traitlets.Unicode())

    def __init__(
        self,
        model: RingModel,
        values: Mapping[str, float] | None = None,
        opened: Sequence[str] = STATIONS,
        matrix: Mapping[str, Any] | None = None,
        spectrum: Mapping[str, Any] | None = None,
        ranges: Mapping[str, tuple[float, float]] | None = None,
    ) -> None:
        start = checked_start(checked_model(model), values)
        common: dict[str, Any] = {"values": start, "ranges": ranges}
        self.link_pane = LinkPane(model.link, values=_part(start, model.link), ranges=ranges)
        self.site_pane = SitePane(model.site, values=_part(start, model.site), ranges=ranges)
        self.element_pane = ElementPane(model, **(common | dict(checked_mapping("matrix", matrix))))
        self.spectrum_pane = SpectrumPane(model, **(common | dict(checked_mapping("spectrum", spectrum))))
        panes: tuple[Pane, ...] = (self.link_pane, self.site_pane, self.element_pane, self.spectrum_pane)
        self._panes = dict(zip(STATIONS, panes, strict=True))
        self._strip = StationStrip(opened=_checked_stations(opened))
        super().__init__(ipywidgets.VBox([self._strip, self.fault_line(), *panes]).add_class("hl-loom"))
        self.model = model
        self.values = start
        traitlets.link((self._strip, "opened"), (self, "opened"))
        self._connect()
        self._show_open()
        self.refresh()

    def _connect(self) -> None:
        self.link_pane.observe(lambda change: self._weave(self.model.with_link(change.new)), "weight")
        self.site_pane.observe(lambda change: self._weave(self.model.with_site(change.new)), "weight")
        for pane in self._panes.values():
            pane.observe(self._gather_values, "values")
            pane.observe(self.refresh, "code")
        self.observe(self._spread_model, "model")
        self.observe(self._spread_values, "values")
        self.observe(self._show_open, "opened")

    def _weave(self, model: RingModel) -> None:
        if model != self.model:
            self.model = model

    def _spread_model(self, _: Any) -> None:
        with ExitStack() as held:
            for pane in (self, *self._panes.values()):
                held.enter_context(pane.one_drawing())
            self.link_pane.weight, self.site_pane.weight = self.model.link, self.model.site
            self.element_pane.model = self.spectrum_pane.model = self.model
            self.values = checked_start(self.model, None, keep=self.values)
            self.refresh()

    def _gather_values(self, change: Any) -> None:
        # a pane may still show parameters of the model before: only those of the present one count
        names = {symbol.name for symbol in self.model.parameters}
        news = {name: value for name, value in change.new.items() if name in names}
        if any(self.values.get(name) != value for name, value in news.items()):
            self.values = {**self.values, **news}

    def _spread_values(self, _: Any) -> None:
        for pane in self._panes.values():
            shared = {name: self.values.get(name, value) for name, value in pane.values.items()}
            if shared != pane.values:
                pane.values = shared
        self.refresh()

    def _show_open(self, *_: Any) -> None:
        """Closed stations leave the screen and stop drawing; they catch up when they are opened."""
        for key, pane in self._panes.items():
            pane.layout.display = None if key in self.opened else "none"
            pane.active = key in self.opened
        self.refresh()

    def _draw(self) -> None:
        self._strip.stations = [
            {"key": key, "title": pane.name, "summary": pane.summary, "thread": dye(pane.dyes[0])}
            for key, pane in self._panes.items()
        ]
        point = ", ".join(f"{name} = {value:.4g}" for name, value in self.values.items())
        self.status = f"{self.model.group}; {point or 'no parameters'}"

    def _source(self) -> str:
        matrix, spectrum = self.element_pane, self.spectrum_pane
        element = ", ".join(f'"{name}"' for name in matrix.element)
        loom = call(
            "hl.Loom",
            "model",
            values=values_text(self.values),
            opened=str(self.opened).replace("'", '"'),
            matrix=call("dict", cutoff=str(matrix.cutoff), element=f"({element})"),
            spectrum=call("dict", **spectrum.settings()),
        )
        return "\n".join([*model_lines(self.model), f"loom = {loom}", "loom"])

    def _facts_text(self) -> str:
        return "\n".join(repr(pane) for pane in self._panes.values())

    def _facts_html(self) -> str:
        return "".join(pane._repr_html_() for pane in self._panes.values())


def _part(values: Mapping[str, float], weight: Any) -> dict[str, float]:
    return {symbol.name: values[symbol.name] for symbol in weight.parameters}


def _checked_stations(names: Sequence[str]) -> list[str]:
    foreign = [name for name in names if name not in STATIONS]
    if foreign:
        raise ParameterError(f"opened names {foreign[0]!r}; the stations are {', '.join(STATIONS)}.")
    return [name for name in STATIONS if name in names]
