"""Copy as Python: the code runs in a fresh namespace and rebuilds what is on the screen."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

import haarloom as hl
from haarloom.actions.base import Site
from haarloom.widgets.copy_code import number_text, weight_lines

G = hl.SU(3)


def rebuilt(pane: Any, name: str = "pane") -> tuple[Any, dict[str, Any]]:
    """Run the code of a pane in an empty namespace."""
    namespace: dict[str, Any] = {}
    exec(pane.code, namespace)
    return namespace[name], namespace


WEIGHTS = [
    hl.heat_kernel(G, "t"),
    hl.heat_kernel(G, "t/2 + 1/3", plaquettes=4),
    hl.wilson(hl.SU(4), "beta", plaquettes=2),
    hl.loop_coupling(G, "lam"),
    hl.link_from_coefficients(G, {"1": 1, "3": "k", "3bar": "k"}),
    hl.static_fermions(G, "z"),
    hl.static_fermions(G, "z", zbar="zbar", copies=2, irrep="6"),
    hl.static_fermions(hl.SU(2), "0.1"),
    hl.static_bosons(G, "z", irrep="8"),
    hl.loop_field(G, {(1, 1): "h"}),
    hl.static_fermions(G, "z") * hl.static_fermions(G, "y") * hl.loop_field(G, {"3": "h", "3bar": "h"}),
]


@pytest.mark.parametrize("weight", WEIGHTS, ids=lambda weight: weight.kind)
def test_the_line_of_a_weight_rebuilds_it(weight: Any) -> None:
    namespace = {"hl": hl, "G": weight.group}
    exec("\n".join(weight_lines("weight", weight)), namespace)
    assert namespace["weight"] == weight


def test_optional_fields_that_change_nothing_are_left_out() -> None:
    assert weight_lines("site", hl.static_fermions(G, "z")) == ['site = hl.static_fermions(G, "z")']


def test_numbers_lose_the_dust_of_slider_arithmetic() -> None:
    assert number_text(0.1 + 0.2) == "0.3"
    assert number_text(1e-20) == "1e-20"


def test_a_weight_of_the_users_own_class_is_asked_for() -> None:
    class Own(Site):
        group = G
        kind = "own"

        def describe(self) -> dict[str, Any]:
            return {"kind": "own"}

    [line] = weight_lines("site", Own())
    assert line.startswith("# site: a weight of the class Own")


def test_link_pane() -> None:
    pane = hl.LinkPane(hl.wilson(G, "beta"), values={"beta": 2.5})
    again, _ = rebuilt(pane)
    assert (again.weight, again.values) == (pane.weight, pane.values)
    np.testing.assert_array_equal(again.coefficients, pane.coefficients)


def test_site_pane() -> None:
    pane = hl.SitePane(hl.static_fermions(G, "z") * hl.loop_field(G, {"3": "h"}), quantity="Im W")
    pane.values = {**pane.values, "h": 0.25}
    again, _ = rebuilt(pane)
    assert (again.weight, again.values, again.quantity) == (pane.weight, pane.values, "Im W")


def test_element_pane() -> None:
    model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    pane = hl.ElementPane(model, cutoff=2)
    pane.element = ("8", "3bar")
    again, names = rebuilt(pane)
    assert (again.model, again.cutoff, again.element) == (model, 2, ("8", "3bar"))
    assert names["derivation"].element == pane.derivation.element
    assert names["verification"].passed


def test_spectrum_pane() -> None:
    model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    pane = hl.SpectrumPane(model, values={"t": 0.7, "z": 0.4}, scan="t", span=(0.5, 1.5), cutoff=4, levels=4)
    again, names = rebuilt(pane)
    assert (again.model, again.values, again.scan, again.span) == (model, pane.values, "t", (0.5, 1.5))
    np.testing.assert_array_equal(again.branches.masses, pane.branches.masses)
    np.testing.assert_array_equal(names["spectrum"].masses, pane.spectrum.masses)


def test_loom() -> None:
    model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    loom = hl.Loom(model, values={"t": 1.2, "z": 0.5}, opened=("site", "spectrum"))
    loom.element_pane.active = True
    loom.element_pane.element = ("3", "8")
    loom.spectrum_pane.span = (0.0, 2.0)
    again, _ = rebuilt(loom, "loom")
    assert (again.model, again.values, again.opened) == (model, loom.values, loom.opened)
    assert again.element_pane.element == ("3", "8")
    assert again.spectrum_pane.span == (0.0, 2.0)
    assert again.spectrum_pane.code == loom.spectrum_pane.code
