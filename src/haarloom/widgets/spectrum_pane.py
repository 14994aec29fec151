"""Masses against a parameter and in the complex plane."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from time import perf_counter
from typing import TYPE_CHECKING, Any, Literal

import ipywidgets
import numpy as np
import traitlets

from haarloom.exceptions import HaarloomError, ParameterError
from haarloom.numerics.branches import MassBranches, masses_along
from haarloom.numerics.faces import spectrum_html
from haarloom.widgets.arguments import (
    brisk_cutoff,
    checked_choice,
    checked_mapping,
    checked_model,
    checked_span,
    scannable_cutoff,
)
from haarloom.widgets.copy_code import call, model_lines, number_text, values_text
from haarloom.widgets.fields import LABEL, Field, column, section
from haarloom.widgets.masses_chart import MassesChart
from haarloom.widgets.names import parameter_face, short_error
from haarloom.widgets.pane import Pane
from haarloom.widgets.parameters import checked_start, ranges_of
from haarloom.widgets.plane_chart import PlaneChart
from haarloom.widgets.sliders import ValueSliders
from haarloom.widgets.stills import curves_svg

if TYPE_CHECKING:
    from haarloom.numerics.spectrum import Spectrum
    from haarloom.ring.model import RingModel

__all__ = ["SpectrumPane"]

MOST_CUTOFF = 6
"""The brisk cutoff where the group leaves the choice: masses of SU(3) to ten digits and more at t = 1."""

POINTS = 200
"""Points of a scan: one every two or three pixels of the chart."""


class SpectrumPane(Pane):
    """Screening masses of a model: Re m and Im m against one parameter, and the current point.

    Parameters
    ----------
    model
        The ring model.
    values
        The current point; sensible numbers where left out.
    scan
        Name of the parameter along the horizontal axis.
    span
        Its lowest and highest value.
    cutoff
        K of the basis Σ a_i ≤ K, or None for the one that the truncation bound asks for. ``"brisk"``: the
        largest K ≤ 6 with which a scan follows the slider (6 for SU(3), 5 for SU(4), 3 for SU(5)).
    levels
        Eigenvalues, the leading one included: one more than the masses on the screen.
    ranges
        {name: (lowest, highest)} for the sliders.

    Attributes
    ----------
    model, values, scan, span, cutoff, levels
        Observable, and may be set.
    spectrum
        The spectrum at the current point.
    branches
        The masses along the scan, as continuous branches.
    stretches
        Ends of the stretches of the scan on which the lowest mass is one of a complex pair.

    Notes
    -----
    Sliders hold real numbers. Write a complex fugacity in real parameters, for instance an imaginary
    chemical potential as ``static_fermions(G, "exp(I*theta)", zbar="exp(-I*theta)")``, or ask
    ``model.spectrum(z=0.6+0.8j, ...)`` for a single point.
    """

    name = "Spectrum"
    dyes = (2, 4)

    model = traitlets.Any()
    scan = traitlets.Unicode()
    span = traitlets.Tuple(traitlets.Float(), traitlets.Float())
    cutoff = traitlets.Int(None, allow_none=True)
    levels = traitlets.Int(6)

    spectrum: Spectrum | None = None
    branches: MassBranches | None = None
    stretches: tuple[tuple[float, float], ...] = ()

    def __init__(
        self,
        model: RingModel,
        values: Mapping[str, float] | None = None,
        scan: str | None = None,
        span: tuple[float, float] | None = None,
        cutoff: int | Literal["brisk"] | None = "brisk",
        levels: int = 6,
        ranges: Mapping[str, tuple[float, float]] | None = None,
    ) -> None:
        group = checked_model(model).group
        if cutoff == "brisk":
            cutoff = brisk_cutoff(group, MOST_CUTOFF)
        elif cutoff is not None:
            cutoff = scannable_cutoff(group, cutoff, POINTS)
        self._ranges = checked_mapping("ranges", ranges)
        self._scanned: tuple[Any, ...] | None = None
        bounds = ranges_of(model, self._ranges)
        start = checked_start(model, values)
        scan = _preferred_scan(start) if scan is None else checked_choice("scan", scan, start)
        span = bounds.get(scan, (0.0, 1.0)) if span is None else checked_span("span", span)
        self._build(start, bounds, scan, span, cutoff)
        super().__init__(self._layout())
        self.set_trait("model", model)
        self.set_trait("levels", levels)
        self._connect()
        self.first_drawing()

    def _build(
        self,
        start: Mapping[str, float],
        bounds: Mapping[str, tuple[float, float]],
        scan: str,
        span: tuple[float, float],
        cutoff: int | None,
    ) -> None:
        self._sliders = ValueSliders(start, bounds)
        self._scan_choice = ipywidgets.Dropdown(
            options=_choices(start), value=scan, description="scan over", style=LABEL
        )
        self._span_field = Field(
            "from … to", span, _read_span, show=_span_text, help="two numbers, e.g. 0 … 2"
        )
        self._cutoff_field = Field(
            "cutoff K", cutoff, self._read_cutoff, show=lambda k: "auto" if k is None else str(k),
            help="irreps with Σ a_i ≤ K; “auto”: from the truncation bound",
        )  # fmt: skip
        self._chart = MassesChart()
        self._plane = PlaneChart()
        self._table = ipywidgets.HTML().add_class("hl-scroll")
        self._note = ipywidgets.HTML().add_class("hl-note")

    def _layout(self) -> ipywidgets.Widget:
        controls = column(
            section("point"),
            self._sliders,
            self.fault_line(),
            section("scan"),
            self._scan_choice,
            self._span_field,
            section("truncation"),
            self._cutoff_field,
        )
        pictures = ipywidgets.Box([self._chart, self._plane.figure]).add_class("hl-pictures")
        return ipywidgets.Box([controls, column(pictures, self._note, section("current point"), self._table)])

    def _connect(self) -> None:
        traitlets.link((self._sliders, "values"), (self, "values"))
        traitlets.link((self._scan_choice, "value"), (self, "scan"))
        traitlets.link((self._span_field, "value"), (self, "span"))
        traitlets.link((self._cutoff_field, "value"), (self, "cutoff"))
        self.observe(self._follow_model, "model")
        self.observe(self._follow_scan, "scan")
        self.observe(self.refresh, ["values", "span", "cutoff", "levels"])

    def _read_cutoff(self, text: str) -> int | None:
        word = text.strip().lower()
        if word == "auto":
            return None
        if not word.isdigit():
            raise ParameterError(f"cutoff K = {text!r} is no truncation: give a whole number ≥ 0, or auto.")
        return scannable_cutoff(self.model.group, int(word), POINTS)

    def _follow_model(self, change: Any) -> None:
        values = checked_start(self.model, None, keep=self.values)
        scan = self.scan if self.scan in values else _preferred_scan(values)
        with self.one_drawing():
            if self.cutoff is not None and change.old.group != self.model.group:
                self.cutoff = brisk_cutoff(self.model.group, MOST_CUTOFF)
            self._sliders.rebuild(values, ranges_of(self.model, self._ranges))
            self._scan_choice.options = _choices(values)
            self.scan = scan
            self.refresh()

    def _follow_scan(self, _: Any) -> None:
        with self.one_drawing():
            self.span = self._sliders.ranges.get(self.scan, self.span)
            self.refresh()

    def _draw(self) -> None:
        started = perf_counter()
        spectrum = self.model.spectrum(levels=self.levels, cutoff=self.cutoff, **self.values)
        self._draw_scan(spectrum.cutoff)
        self._draw_point(spectrum)
        self._sliders.pace(perf_counter() - started)

    def _draw_scan(self, cutoff: int) -> None:
        fixed = {name: value for name, value in self.values.items() if name != self.scan}
        wanted = (self.model, self.scan, self.span, self.levels, cutoff, tuple(fixed.items()))
        if not self.scan or wanted == self._scanned:
            return
        try:
            grid = np.linspace(self.span[0], self.span[1], POINTS)
            branches = masses_along(self.model, self.scan, grid, self.levels, cutoff, **fixed)
        except HaarloomError as problem:
            self._span_field.fault = str(problem)
            return
        self._span_field.fault = ""
        self.branches = branches
        self.stretches = stretches_of_lowest(branches)
        self._chart.draw(parameter_face(self.scan), grid, branches.masses.T, self.stretches)
        self._plane.draw(branches.masses.T)
        self._note.value = _scan_sentence(branches, self.stretches)
        self._scanned = wanted

    def _draw_point(self, spectrum: Spectrum) -> None:
        self.spectrum = spectrum
        if self.scan:
            self._chart.mark(self.values[self.scan], spectrum.masses)
        self._plane.mark(spectrum.masses)
        self._table.value = _masses_table(spectrum)
        self.status = (
            f"{self.model.group}, cutoff {spectrum.cutoff}: {len(spectrum.basis)} irreps; "
            "masses in units of 1/a, the inverse spatial lattice spacing"
        )

    def settings(self) -> dict[str, str | None]:
        """Keywords that hold scan and truncation as source text; those of the scan on the screen."""
        scan: dict[str, str | None] = {"scan": None, "span": None}
        if self.branches is not None:
            ends = (float(self.branches.grid[0]), float(self.branches.grid[-1]))
            scan = {"scan": f'"{self.branches.parameter}"', "span": f"({', '.join(map(number_text, ends))})"}
        return scan | {"cutoff": str(self.cutoff), "levels": str(self.levels)}

    @property
    def summary(self) -> str:
        """The lowest mass."""
        if not self.spectrum:
            return ""
        mass, error = self.spectrum.masses[0], self.spectrum.error[0]
        imaginary = f" {'+' if mass.imag > 0 else '−'} {abs(mass.imag):.4f} i" if mass.imag else ""
        return f"m₁ = {mass.real:.4f}{imaginary}, error ≤ {short_error(error)}"

    def _source(self) -> str:
        pane = call("hl.SpectrumPane", "model", values="values", **self.settings())
        return "\n".join(
            [
                *model_lines(self.model),
                f"values = {values_text(self.values)}",
                f"spectrum = model.spectrum(levels={self.levels}, cutoff={self.cutoff}, **values)",
                f"pane = {pane}",
                "pane",
            ]
        )

    def _facts_text(self) -> str:
        return repr(self.spectrum) if self.spectrum else ""

    def _facts_html(self) -> str:
        if not self.spectrum:
            return ""
        return self._still() + spectrum_html(self.spectrum)

    def _still(self) -> str:
        if self.branches is None:
            return ""
        grid, masses, name = self.branches.grid, self.branches.masses.T, self.branches.parameter
        marks: dict[str, Any] = {"here": self.values.get(name), "shaded": self.stretches}
        charts = (
            curves_svg(grid, part, parameter_face(name), up, **marks)
            for part, up in ((masses.real, "Re m [1/a]"), (masses.imag, "Im m [1/a]"))
        )
        return f"{''.join(charts)}<p>{self._note.value}</p>"


def _preferred_scan(values: Mapping[str, float]) -> str:
    """The fugacity when there is one, for its masses merge; else the first parameter."""
    return "z" if "z" in values else next(iter(values), "")


def _choices(names: Mapping[str, float]) -> list[tuple[str, str]]:
    return [(parameter_face(name), name) for name in names] or [("no parameter", "")]


def _span_text(span: tuple[float, float]) -> str:
    return f"{span[0]:.6g} … {span[1]:.6g}"


def _read_span(text: str) -> tuple[float, float]:
    parts = text.replace("...", "…").replace("to", "…").split("…")
    try:
        low, high = (float(part) for part in parts)
    except ValueError:
        raise ParameterError(f"{text!r} is no range: give two numbers, e.g. 0 … 2.") from None
    return checked_span("from … to", (low, high))


def _masses_table(spectrum: Spectrum) -> str:
    rows = "".join(
        f"<tr><td>m<sub>{level}</sub></td><td>{mass.real:.8f}</td><td>{_imaginary(mass)}</td>"
        f'<td>{short_error(error)}</td><td class="hl-left">{verdict}</td></tr>'
        for level, (mass, error, verdict) in enumerate(
            zip(spectrum.masses, spectrum.error, spectrum.verdicts, strict=True), start=1
        )
    )
    head = '<tr><th></th><th>Re m</th><th>Im m</th><th>error ≤</th><th class="hl-left">verdict</th></tr>'
    return f'<table class="hl-table">{head}{rows}</table>'


def _imaginary(mass: complex) -> str:
    return f"{mass.imag:+.8f}".replace("-", "−") if mass.imag else "0"


def stretches_of_lowest(branches: MassBranches) -> tuple[tuple[float, float], ...]:
    """First and last grid value of each run of points whose lowest mass is one of a complex pair."""
    lowest = np.argmin(branches.masses.real, axis=1)
    paired = np.take_along_axis(branches.complex_pair, lowest[:, None], axis=1)[:, 0]
    edges = np.diff(np.concatenate([[0], paired.astype(int), [0]]))
    first, last = np.flatnonzero(edges == 1), np.flatnonzero(edges == -1) - 1
    return tuple((float(branches.grid[a]), float(branches.grid[b])) for a, b in zip(first, last, strict=True))


def _scan_sentence(branches: MassBranches, stretches: Sequence[tuple[float, float]]) -> str:
    name = parameter_face(branches.parameter)
    worst = f"errors along the scan ≤ {short_error(branches.error.max())}"
    if not np.isfinite(branches.error).all():
        worst = "on part of the scan the cutoff is too small for a bound on the error"
    if (branches.verdicts == "complex").any():
        return (
            "T is complex along the scan, so that masses need not come in conjugate pairs: nothing is "
            f"shaded; {worst}."
        )
    if not stretches:
        return (
            f"At none of the {len(branches.grid)} points is the lowest mass one of a complex pair "
            f"beyond its error; {worst}."
        )
    parts = ", ".join(f"{a:.4g} ≤ {name} ≤ {b:.4g}" for a, b in stretches)
    step = branches.grid[1] - branches.grid[0]
    return f"Shaded: the lowest mass is one of a complex pair, {parts} (grid step {step:.2g}); {worst}."
