"""The matter on a site: its factors, what they make in characters, and the picture on the torus."""

from __future__ import annotations

from collections.abc import Mapping
from functools import reduce
from html import escape
from operator import mul
from typing import TYPE_CHECKING, Any

import ipywidgets
import traitlets

from haarloom.widgets.arguments import checked_choice, checked_mapping, checked_weight
from haarloom.widgets.copy_code import call, opening_lines, values_text, weight_lines
from haarloom.widgets.fields import LABEL, column, section
from haarloom.widgets.pane import Pane
from haarloom.widgets.parameters import checked_start, ranges_of
from haarloom.widgets.site_formulas import MOST_TERMS, characters_html, loops_html
from haarloom.widgets.sliders import ValueSliders
from haarloom.widgets.torus_picture import QUANTITIES, picture_for
from haarloom.widgets.weight_form import WeightForm, default_weight, kinds_of

if TYPE_CHECKING:
    from haarloom.actions.protocols import SiteWeight
    from haarloom.algebra.group import SU

__all__ = ["SitePane"]


NARROW = {"description_width": "34px"}
"""Style of the menu that shares its line with a button."""


class SitePane(Pane):
    """The site weight W(P), a product of factors.

    Parameters
    ----------
    weight
        The site weight to start from.
    values
        Numbers for its parameters, for the picture; sensible ones where left out.
    quantity
        What the picture shows: ``"|W|"``, ``"Re W"``, ``"Im W"`` or ``"arg W"``.
    ranges
        {name: (lowest, highest)} for the sliders.

    Attributes
    ----------
    weight, values, quantity
        Observable, and may be set.
    """

    name = "Site weight"
    dyes = (3, 2)

    weight = traitlets.Any()
    quantity = traitlets.Enum(tuple(QUANTITIES), default_value="|W|")

    def __init__(
        self,
        weight: SiteWeight,
        values: Mapping[str, float] | None = None,
        quantity: str = "|W|",
        ranges: Mapping[str, tuple[float, float]] | None = None,
    ) -> None:
        checked_weight("site", weight)
        checked_choice("quantity", quantity, QUANTITIES)
        self._ranges = checked_mapping("ranges", ranges)
        self._forms: list[WeightForm] = []
        self._own_change = False
        self._cards = column()
        self._sliders = ValueSliders(checked_start(weight, values), ranges_of(weight, self._ranges))
        self._formula = ipywidgets.HTMLMath().add_class("hl-formula")
        self._sums = ipywidgets.HTMLMath().add_class("hl-formula")
        self._canvas = column()
        self._hang_picture(weight.group)
        super().__init__(ipywidgets.Box([self._controls(), self._shown()]))
        self.set_trait("quantity", quantity)
        self.weight = weight
        self._lay_out()
        traitlets.link((self._sliders, "values"), (self, "values"))
        traitlets.link((self, "quantity"), (self._choice, "value"))
        self.observe(self._follow_weight, "weight")
        self.observe(self.refresh, ["values", "quantity"])
        self.first_drawing()

    def _controls(self) -> ipywidgets.Widget:
        self._new = ipywidgets.Dropdown(options=list(kinds_of("site")), description="add", style=NARROW)
        add = ipywidgets.Button(description="Add factor", tooltip="Multiply W by a factor of the chosen kind")
        add.on_click(self._add)
        row = ipywidgets.VBox([self._new, add]).add_class("hl-add")
        values = column(section("values"), self._sliders, self.fault_line())
        return column(section("factors"), self._cards, row, values)

    def _shown(self) -> ipywidgets.Widget:
        self._choice = ipywidgets.Dropdown(
            options=list(QUANTITIES), description="picture of", style=LABEL, layout={"width": "220px"}
        )
        return column(self._formula, self._sums, self._choice, self._canvas)

    def _hang_picture(self, group: SU) -> None:
        """The picture that suits the group, with its caption."""
        self._pictured = group
        self._picture = picture_for(group)
        caption = ipywidgets.HTML(escape(self._picture.caption)).add_class("hl-note")
        self._canvas.children = [self._picture.figure, caption]

    def _lay_out(self) -> None:
        """One card for each factor of the present weight."""
        sites = getattr(self.weight, "sites", (self.weight,))
        self._forms = [WeightForm("site", site) for site in sites]
        for form in self._forms:
            form.observe(self._multiply, "weight")
        self._cards.children = [self._card(form) for form in self._forms]

    def _card(self, form: WeightForm) -> ipywidgets.Widget:
        if len(self._forms) == 1:
            return ipywidgets.VBox([form]).add_class("hl-card")
        remove = ipywidgets.Button(description="Remove", tooltip="Take this factor out of W")
        remove.on_click(lambda _: self._keep([other for other in self._forms if other is not form]))
        return ipywidgets.VBox([form, remove]).add_class("hl-card")

    def _add(self, _: Any) -> None:
        with self.excused():
            self.weight = self.weight * default_weight(self._new.value, self.weight.group)

    def _keep(self, forms: list[WeightForm]) -> None:
        self.weight = _product(forms)

    def _multiply(self, _: Any) -> None:
        self._own_change = True
        try:
            self.weight = _product(self._forms)
        finally:
            self._own_change = False

    def _follow_weight(self, _: Any) -> None:
        if not self._own_change:
            self._lay_out()
        values = checked_start(self.weight, None, keep=self.values)
        with self.one_drawing():
            self._sliders.rebuild(values, ranges_of(self.weight, self._ranges))
            self.refresh()

    def _draw(self) -> None:
        if self._pictured != self.weight.group:
            self._hang_picture(self.weight.group)
        self._picture.draw(self.weight, self.values, self.quantity)
        self._formula.value = f"$\\displaystyle {escape(self.weight.latex())}$"
        self._sums.value = characters_html(self.weight, self.values) + loops_html(self.weight)
        reach = self.weight.reach(self.values)
        size = "infinitely many characters" if reach is None else f"characters up to Σ a_i = {reach}"
        self.status = f"{self.weight.group}, {self.weight.kind}: {size}"

    @property
    def summary(self) -> str:
        """Kinds of the factors."""
        return " × ".join(form.weight.kind for form in self._forms)

    def _source(self) -> str:
        pane = call("hl.SitePane", "site", values=values_text(self.values), quantity=f'"{self.quantity}"')
        return "\n".join(
            [
                *opening_lines(self.weight.group),
                *weight_lines("site", self.weight),
                f"pane = {pane}",
                "pane",
            ]
        )

    def _facts_text(self) -> str:
        short = self.weight.finite and len(self.weight.support()) <= MOST_TERMS
        return f"  W = {self.weight.class_function().in_characters()}" if short else ""

    def _facts_html(self) -> str:
        caption = f"<p>{escape(self.quantity)}. {escape(self._picture.still_caption)}</p>"
        return f"<p>{self._formula.value}</p>{self._sums.value}{self._picture.still()}{caption}"


def _product(forms: list[WeightForm]) -> SiteWeight:
    return reduce(mul, (form.weight for form in forms))
