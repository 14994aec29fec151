"""The transfer matrix as a grid, and how each of its elements comes about."""

from __future__ import annotations

from collections.abc import Mapping
from html import escape
from typing import TYPE_CHECKING, Any

import ipywidgets
import sympy
import traitlets

from haarloom.exceptions import ParameterError
from haarloom.widgets.arguments import (
    MOST_ROWS,
    brisk_cutoff,
    checked_element,
    checked_mapping,
    checked_model,
    drawable_cutoff,
)
from haarloom.widgets.copy_code import call, model_lines, values_text
from haarloom.widgets.derivation_view import DerivationView, derivation_html
from haarloom.widgets.fields import Field, column, section
from haarloom.widgets.grid import MatrixGrid
from haarloom.widgets.pane import Pane
from haarloom.widgets.parameters import checked_start, ranges_of
from haarloom.widgets.sliders import ValueSliders

if TYPE_CHECKING:
    from haarloom.ring.derivation import Derivation
    from haarloom.ring.model import RingModel
    from haarloom.ring.replay import Verification
    from haarloom.ring.transfer import TransferMatrix

__all__ = ["ElementPane"]


class ElementPane(Pane):
    """The transfer matrix T_rs as a grid of r against s; choosing an element opens its derivation.

    Parameters
    ----------
    model
        The ring model.
    cutoff
        Irreps with Σ a_i ≤ cutoff; where left out, the largest cutoff up to 3 that a grid can show.
    element
        Names of the row and the column whose derivation is open.
    values
        Numbers for the parameters, for the sizes of the elements; where left out, some inside the
        domain.
    ranges
        {name: (lowest, highest)} for the sliders.

    Attributes
    ----------
    model, cutoff, element, values
        Observable, and may be set.
    transfer, derivation, verification
        What is on the screen: the matrix, the open derivation and its replay on the torus.
    """

    name = "Transfer matrix"
    dyes = (1, 2)

    model = traitlets.Any()
    cutoff = traitlets.Int()
    element = traitlets.Tuple(traitlets.Unicode(), traitlets.Unicode())

    transfer: TransferMatrix | None = None
    derivation: Derivation | None = None
    verification: Verification | None = None

    def __init__(
        self,
        model: RingModel,
        cutoff: int | None = None,
        element: tuple[str, str] | None = None,
        values: Mapping[str, float] | None = None,
        ranges: Mapping[str, tuple[float, float]] | None = None,
    ) -> None:
        group = checked_model(model).group
        cutoff = brisk_cutoff(group, 3, MOST_ROWS) if cutoff is None else drawable_cutoff(group, cutoff)
        self._ranges = checked_mapping("ranges", ranges)
        self._sliders = ValueSliders(checked_start(model, values), ranges_of(model, self._ranges))
        self._cutoff_field = Field("cutoff K", cutoff, self._read_cutoff, help="irreps with Σ a_i ≤ K")
        self._grid = MatrixGrid()
        self._heading = ipywidgets.HTMLMath()
        self._heading.add_class("hl-formula")
        self._steps = DerivationView()
        controls = column(self._cutoff_field, self._sliders, self.fault_line()).add_class("hl-across")
        body = ipywidgets.VBox(
            [controls, column(self._grid), column(section("derivation"), self._heading, self._steps)]
        )
        super().__init__(body.add_class("hl-matrix"))
        self.set_trait("model", model)
        self.set_trait("cutoff", cutoff)
        self.set_trait("element", checked_element(model, cutoff, element))
        traitlets.link((self, "cutoff"), (self._cutoff_field, "value"))
        traitlets.link((self._sliders, "values"), (self, "values"))
        self._grid.observe(self._choose, "selected")
        self.observe(self._follow_model, "model")
        self.observe(self.refresh, ["cutoff", "element", "values"])
        self.first_drawing()

    def _read_cutoff(self, text: str) -> int:
        if not text.strip().isdigit():
            raise ParameterError(f"cutoff K = {text!r} is no truncation: give a whole number ≥ 0.")
        return drawable_cutoff(self.model.group, int(text))

    def _follow_model(self, change: Any) -> None:
        values = checked_start(self.model, None, keep=self.values)
        group = self.model.group
        with self.one_drawing():
            if change.old.group != group:
                self.cutoff = brisk_cutoff(group, min(self.cutoff, 3), MOST_ROWS)
                self.element = checked_element(self.model, self.cutoff, None)
            self._sliders.rebuild(values, ranges_of(self.model, self._ranges))
            self.refresh()

    def _choose(self, change: Any) -> None:
        row, column = change.new
        if self.transfer and 0 <= row < len(self.transfer.basis) > column >= 0:
            basis = self.transfer.basis
            self.element = (basis[row].name, basis[column].name)

    def _draw(self) -> None:
        self._draw_matrix()
        self._draw_derivation()
        assert self.transfer is not None
        self._grid.show_numbers(self.transfer.numeric(**self.values))

    def _draw_matrix(self) -> None:
        cutoff = drawable_cutoff(self.model.group, self.cutoff)
        if self.transfer and self.transfer.model == self.model and self.transfer.cutoff == cutoff:
            return
        transfer = self.model.transfer_matrix(cutoff=cutoff)
        self._grid.show_pattern(transfer.basis, transfer.pattern())
        self.transfer = transfer
        size, filled = len(transfer.basis), len(transfer.elements)
        self.status = f"{self.model.group}, cutoff {cutoff}: {size} × {size}, {filled} elements not zero"

    def _draw_derivation(self) -> None:
        assert self.transfer is not None
        bra, ket = (self.model.group.irrep(name) for name in self.element)
        if bra not in self.transfer.basis or ket not in self.transfer.basis:
            bra = ket = self.model.group.trivial
            self.element = (bra.name, ket.name)
        place = (self.transfer.basis.index(bra), self.transfer.basis.index(ket))
        if self._grid.selected != place:
            self._grid.selected = place
        shown = self.derivation
        if shown and (shown.model, shown.bra, shown.ket) == (self.model, bra, ket):
            return
        derivation = self.transfer.derivation(bra, ket)
        self.verification = self._steps.show(derivation)
        self.derivation = derivation
        self._heading.value = f"$\\displaystyle {_element_latex(derivation)}$"

    @property
    def summary(self) -> str:
        """Size of the matrix."""
        if self.transfer is None:
            return ""
        size = len(self.transfer.basis)
        return f"{size} × {size}, cutoff {self.transfer.cutoff}"

    def _source(self) -> str:
        row, column = (f'"{name}"' for name in self.element)
        pane = call(
            "hl.ElementPane",
            "model",
            cutoff=str(self.cutoff),
            element=f"({row}, {column})",
            values=values_text(self.values),
        )
        return "\n".join(
            [
                *model_lines(self.model),
                f"T = model.transfer_matrix(cutoff={self.cutoff})",
                f"derivation = T.derivation({row}, {column})",
                "verification = derivation.verify()",
                f"pane = {pane}",
                "pane",
            ]
        )

    def _facts_text(self) -> str:
        return f"  {self.derivation!r}\n  {self.verification!r}" if self.derivation else ""

    def _facts_html(self) -> str:
        if not self.derivation:
            return ""
        heading = f"<p>$\\displaystyle {escape(_element_latex(self.derivation))}$</p>"
        return self._grid.still() + heading + derivation_html(self.derivation, self.verification)


def _element_latex(derivation: Derivation) -> str:
    bracket = rf"\langle {derivation.bra.latex()}|T|{derivation.ket.latex()}\rangle"
    return f"{bracket} = {sympy.latex(derivation.element)}"
