"""A gauge action: its kind and parameters, its coefficients as formulas and as pictures."""

from __future__ import annotations

from collections.abc import Mapping
from html import escape
from typing import TYPE_CHECKING, Any

import ipywidgets
import numpy as np
import sympy
import traitlets

from haarloom.widgets.arguments import checked_mapping, checked_weight
from haarloom.widgets.coefficient_chart import CoefficientChart
from haarloom.widgets.copy_code import call, opening_lines, values_text, weight_lines
from haarloom.widgets.fields import column, section
from haarloom.widgets.names import short_error
from haarloom.widgets.pane import Pane
from haarloom.widgets.parameters import checked_start, ranges_of
from haarloom.widgets.sliders import ValueSliders
from haarloom.widgets.stills import bars_svg
from haarloom.widgets.weight_form import WeightForm

if TYPE_CHECKING:
    from haarloom.actions.protocols import LinkWeight
    from haarloom.algebra.irrep import Irrep

__all__ = ["LinkPane"]

SHOWN_CUTOFF = {2: 8, 3: 4, 4: 2}
"""Σ a_i of the irreps in the pictures: a dozen or so for each N, and 1 for the larger groups."""

LISTED = 6
"""Coefficients written out; the others follow from the general formula."""

LONGEST = 240
"""Characters of LaTeX up to which a coefficient is written out."""


class LinkPane(Pane):
    """The weight between neighbouring loops, K = Σ k_r χ_r(P) χ_r(P′)*.

    Parameters
    ----------
    weight
        The link weight to start from.
    values
        Numbers for its parameters, for the pictures; sensible ones where left out.
    ranges
        {name: (lowest, highest)} for the sliders.

    Attributes
    ----------
    weight, values
        Observable, and may be set.
    irreps, coefficients
        What the pictures show: irreps, and their k_r at the present values, shape (n,); None for a
        weight that is not diagonal in the irreps.
    """

    name = "Link weight"
    dyes = (0, 1)

    weight = traitlets.Any()

    irreps: tuple[Irrep, ...] = ()
    coefficients: Any = None

    def __init__(
        self,
        weight: LinkWeight,
        values: Mapping[str, float] | None = None,
        ranges: Mapping[str, tuple[float, float]] | None = None,
    ) -> None:
        checked_weight("link", weight)
        self._ranges = checked_mapping("ranges", ranges)
        self._form = WeightForm("link", weight)
        self._sliders = ValueSliders(checked_start(weight, values), ranges_of(weight, self._ranges))
        self._formula = ipywidgets.HTMLMath().add_class("hl-formula")
        self._listed = ipywidgets.HTMLMath().add_class("hl-formula")
        self._chart = CoefficientChart()
        controls = column(section("action"), self._form, section("values"), self._sliders, self.fault_line())
        shown = column(self._formula, self._chart, section("coefficients"), self._listed)
        super().__init__(ipywidgets.Box([controls, shown]))
        self.weight = weight
        traitlets.link((self._form, "weight"), (self, "weight"))
        traitlets.link((self._sliders, "values"), (self, "values"))
        self.observe(self._follow_weight, "weight")
        self.observe(self.refresh, "values")
        self.first_drawing()

    def _follow_weight(self, _: Any) -> None:
        values = checked_start(self.weight, None, keep=self.values)
        with self.one_drawing():
            self._sliders.rebuild(values, ranges_of(self.weight, self._ranges))
            self.refresh()

    def _draw(self) -> None:
        group = self.weight.group
        self.irreps = group.irreps(SHOWN_CUTOFF.get(group.n, 1))
        self.status = f"{group}, {self.weight.kind}"
        self._formula.value = f"$\\displaystyle {escape(self.weight.latex())}$"
        if self.weight.diagonal:
            self._listed.value = _table_html(self.weight, self.irreps[:LISTED], self.values)
            self.coefficients, _ = self.weight.coefficients_at(self.irreps, self.values)
            self._chart.draw(self.irreps, self.coefficients)
        else:
            self._listed.value = "This weight mixes irreps: a kernel takes the place of one coefficient each."
            self.coefficients = None
            self._chart.clear()

    @property
    def summary(self) -> str:
        """Kind and parameters."""
        return ", ".join([self.weight.kind, *map(str, self.weight.parameters)])

    def _source(self) -> str:
        pane = call("hl.LinkPane", "link", values=values_text(self.values))
        return "\n".join(
            [
                *opening_lines(self.weight.group),
                *weight_lines("link", self.weight),
                f"pane = {pane}",
                "pane",
            ]
        )

    def _facts_text(self) -> str:
        lines = [
            f"  k_{r.name} = {self.weight.coefficient(r)}"
            for r in self.irreps[:LISTED]
            if self.weight.diagonal
        ]
        return "\n".join(lines)

    def _facts_html(self) -> str:
        picture = ""
        if self.coefficients is not None:
            names, shades = zip(*((irrep.name, irrep.nality) for irrep in self.irreps), strict=True)
            picture = bars_svg(names, np.real(self.coefficients), shades, "kᵣ")
        return f"<p>$\\displaystyle {escape(self.weight.latex())}$</p>{picture}{self._listed.value}"


def _table_html(weight: LinkWeight, irreps: tuple[Irrep, ...], values: Mapping[str, float]) -> str:
    """Irrep, Casimir, exact k_r where it is short, and its value with the error."""
    numbers, errors = weight.coefficients_at(irreps, values)
    rows = "".join(
        f"<tr><td>{irrep.html()}</td><td>{irrep.casimir(2)}</td>"
        f'<td class="hl-left">{_exact_html(weight, irrep)}</td>'
        f"<td>{number:.10g}</td><td>{short_error(error)}</td></tr>"
        for irrep, number, error in zip(irreps, numbers, errors, strict=True)
    )
    head = '<th>r</th><th>C₂</th><th class="hl-left">k<sub>r</sub></th><th>value</th><th>error ≤</th>'
    return f'<table class="hl-table"><tr>{head}</tr>{rows}</table>'


def _exact_html(weight: LinkWeight, irrep: Irrep) -> str:
    text = sympy.latex(weight.coefficient(irrep))
    return f"${escape(text)}$" if len(text) <= LONGEST else "as in the general formula"
