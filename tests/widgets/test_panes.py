"""What all panes promise: faces, last good result, and traits that can be set."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import ipywidgets
import numpy as np
import pytest

import haarloom as hl
from haarloom.exceptions import ParameterError

G = hl.SU(3)
MODEL = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))

MAKERS: dict[str, Callable[[], Any]] = {
    "link": lambda: hl.LinkPane(MODEL.link),
    "site": lambda: hl.SitePane(MODEL.site),
    "element": lambda: hl.ElementPane(MODEL, cutoff=2, element=("3", "1")),
    "spectrum": lambda: hl.SpectrumPane(MODEL, cutoff=4, levels=4),
    "loom": lambda: hl.Loom(MODEL, spectrum={"cutoff": 4}),
}


@pytest.fixture(params=list(MAKERS))
def pane(request: pytest.FixtureRequest) -> Any:
    """Each pane in turn, for Ember-I (an invented model)."""
    return MAKERS[request.param]()


def test_bundle_holds_view_html_and_text(pane: Any) -> None:
    bundle = pane._repr_mimebundle_()
    assert bundle["application/vnd.jupyter.widget-view+json"]["model_id"] == pane.model_id
    assert pane.name in bundle["text/html"]
    assert "import haarloom as hl" in bundle["text/html"]
    assert bundle["text/plain"].startswith(pane.name)
    assert len(bundle["text/html"]) < 60_000


def test_state_of_everything_below_is_serialisable(pane: Any) -> None:
    import json

    for widget in descendants(pane):
        state, _, buffers = ipywidgets.widgets.widget._remove_buffers(widget.get_state())
        json.dumps(state, allow_nan=False)
        assert sum(memoryview(buffer).nbytes for buffer in buffers) < 200_000


def descendants(widget: Any) -> list[Any]:
    """A widget and its children, all the way down."""
    return [widget, *(below for child in getattr(widget, "children", ()) for below in descendants(child))]


def test_no_fault_at_the_start(pane: Any) -> None:
    assert pane.fault == ""


def test_values_that_are_no_parameters_are_refused() -> None:
    with pytest.raises(ParameterError, match="no parameter here"):
        hl.SpectrumPane(MODEL, values={"beta": 1.0})


def test_link_pane_keeps_the_last_good_weight_on_bad_input() -> None:
    pane = hl.LinkPane(MODEL.link)
    field = pane._form._fields["t"]
    field.control.value = "-1"
    assert "t = -1" in field.fault
    assert pane.weight == MODEL.link
    assert pane.fault == ""
    field.control.value = "t*(1 +"
    assert field.fault
    field.control.value = "s/2"
    assert field.fault == ""
    assert pane.weight == hl.heat_kernel(G, "s/2")
    assert set(pane.values) == {"s"}


def test_a_bad_field_does_not_spoil_its_neighbour() -> None:
    pane = hl.LinkPane(MODEL.link)
    fields = pane._form._fields
    fields["t"].control.value = "oops ("
    fields["plaquettes"].control.value = "4"
    assert pane.weight == hl.heat_kernel(G, "t", plaquettes=4)
    assert fields["t"].fault
    fields["plaquettes"].control.value = "four"
    assert "plaquettes = 'four'" in fields["plaquettes"].fault


def test_link_pane_changes_kind_and_shows_its_coefficients() -> None:
    pane = hl.LinkPane(MODEL.link)
    pane._form._choice.value = "Wilson"
    assert pane.weight == hl.wilson(G, "beta")
    expected, _ = hl.wilson(G, "beta").coefficients_at(pane.irreps, pane.values)
    np.testing.assert_array_equal(pane._chart._bars.y, expected)
    assert 'hl.wilson(G, "beta")' in pane.code


def test_link_pane_shows_a_weight_that_is_set_from_outside() -> None:
    pane = hl.LinkPane(MODEL.link)
    pane.weight = hl.wilson(G, "b", plaquettes=3)
    assert pane._form._choice.value == "Wilson"
    assert {name: field.value for name, field in pane._form._fields.items()} == {
        "beta": "b",
        "plaquettes": "3",
    }


@pytest.mark.parametrize("n", [2, 4, 5])
@pytest.mark.parametrize("kind", ["heat kernel", "Wilson", "loop coupling", "coefficient table"])
def test_every_kind_of_link_weight_opens_for_other_groups(kind: str, n: int) -> None:
    pane = hl.LinkPane(hl.heat_kernel(hl.SU(n), "t"))
    pane._form._choice.value = kind
    assert pane._form._line.message == ""
    assert (pane.weight.kind, pane.fault) == (kind, "")


@pytest.mark.parametrize("n", [2, 3, 4])
@pytest.mark.parametrize("kind", ["static fermions", "static bosons", "loop field"])
def test_every_kind_of_site_weight_opens_and_multiplies(kind: str, n: int) -> None:
    pane = hl.SitePane(hl.static_fermions(hl.SU(n), "z"))
    pane._new.value = kind
    pane._add(None)
    assert [form.weight.kind for form in pane._forms] == ["static fermions", kind]
    assert pane.fault == ""


def test_site_pane_removes_a_factor() -> None:
    pane = hl.SitePane(hl.static_fermions(G, "z") * hl.loop_field(G, {"3": "h"}))
    pane._keep(pane._forms[:1])
    assert pane.weight == hl.static_fermions(G, "z")
    assert set(pane.values) == {"z"}


def test_site_pane_says_where_the_boson_series_ends_and_keeps_the_picture() -> None:
    pane = hl.SitePane(hl.static_bosons(G, "z"), values={"z": 0.5})
    before = pane._picture._map.image.value
    pane.values = {"z": 1.5}
    assert "|z| < 1" in pane.fault
    assert pane._picture._map.image.value == before
    assert pane.values == {"z": 1.5}
    pane.values = {"z": 0.4}
    assert pane.fault == ""


def test_site_picture_is_the_density_on_the_torus() -> None:
    pane = hl.SitePane(MODEL.site, values={"z": 0.3})
    picture = pane._picture
    centre = picture._angles[len(picture._angles) // 2, len(picture._angles) // 2]
    np.testing.assert_allclose(centre, 0, atol=1e-12)
    assert picture._colours.max == pytest.approx(1.3**3)  # |det(1 + z)| at P = 1, where it is largest


def test_element_pane_follows_the_grid_and_the_grid_follows_it() -> None:
    pane = hl.ElementPane(MODEL, cutoff=2)
    pane._grid.selected = (1, 2)
    assert pane.element == ("3", "3bar")
    assert str(pane.derivation.element) == "z**2*exp(-4*t/3)"
    pane.element = ("8", "6")
    assert pane._grid.selected == (4, 3)


def test_element_grid_holds_the_numbers_of_the_matrix() -> None:
    pane = hl.ElementPane(MODEL, cutoff=2, values={"t": 0.5, "z": 0.7})
    shown = np.frombuffer(pane._grid.re).reshape(6, 6)
    np.testing.assert_array_equal(shown, MODEL.transfer_matrix(2).numeric(t=0.5, z=0.7))
    # all elements of Ember-I are positive unless they vanish identically
    pattern = np.frombuffer(pane._grid.pattern, dtype=np.uint8).reshape(6, 6)
    np.testing.assert_array_equal(pattern.astype(bool), shown > 0)


def test_element_pane_refuses_a_cutoff_too_large_to_draw() -> None:
    pane = hl.ElementPane(MODEL, cutoff=2)
    pane._cutoff_field.control.value = "40"
    assert "861 irreps" in pane._cutoff_field.fault
    assert len(pane.transfer.basis) == 6
    pane._cutoff_field.control.value = "1.5"
    assert "whole number" in pane._cutoff_field.fault


def test_element_outside_a_smaller_basis_gives_way_to_the_first() -> None:
    pane = hl.ElementPane(MODEL, cutoff=3, element=("10", "8"))
    pane._cutoff_field.control.value = "1"
    assert pane.element == ("1", "1")
    assert pane.fault == ""


def test_spectrum_pane_marks_the_point_without_a_new_scan() -> None:
    pane = hl.SpectrumPane(MODEL, cutoff=4, levels=4)
    scan = pane.branches
    pane.values = {**pane.values, "z": 0.6}
    assert pane.branches is scan
    assert pane.spectrum.values["z"] == 0.6
    pane.values = {**pane.values, "t": 0.8}
    assert pane.branches is not scan


def test_spectrum_pane_shades_the_complex_stretches() -> None:
    pane = hl.SpectrumPane(MODEL, values={"t": 1.0, "z": 0.3}, cutoff=5, levels=4)
    (first, last), (again, end) = pane.stretches
    inside, outside = (
        MODEL.spectrum(levels=4, cutoff=5, t=1.0, z=z) for z in ((first + last) / 2, (last + again) / 2)
    )
    assert inside.verdicts[0] == "complex pair"
    assert outside.verdicts[0] == "real"
    assert end == 3.0
    # particle–hole symmetry z ↔ 1/z maps one end of the real window to the other
    assert last * again == pytest.approx(1, abs=0.05)


@pytest.mark.parametrize(
    ("text", "words"),
    [("2 … 1", "below the second"), ("here", "no range"), ("0 … inf", "finite")],
)
def test_spectrum_pane_says_what_is_wrong_with_a_range(text: str, words: str) -> None:
    pane = hl.SpectrumPane(MODEL, cutoff=3, levels=3)
    pane._span_field.control.value = text
    assert words in pane._span_field.fault
    assert pane.span == (0.0, 3.0)


def test_spectrum_pane_keeps_the_scan_when_a_range_leaves_the_domain() -> None:
    pane = hl.SpectrumPane(MODEL, scan="t", cutoff=3, levels=3)
    scan = pane.branches
    pane._span_field.control.value = "-1 … 1"
    assert "t = -1" in pane._span_field.fault
    assert pane.branches is scan
    assert "span=(0.1, 3.0)" in pane.code
    pane._span_field.control.value = "0.5 … 1"
    assert pane._span_field.fault == ""
    assert pane.branches.grid[-1] == 1.0


def test_spectrum_pane_takes_a_cutoff_from_the_bound() -> None:
    pane = hl.SpectrumPane(MODEL, cutoff=None, levels=3)
    assert pane.spectrum.cutoff == MODEL.spectrum(levels=3, t=1.0, z=0.3).cutoff
    pane._cutoff_field.control.value = "90"
    assert "4,186 irreps" in pane._cutoff_field.fault


def test_spectrum_pane_without_parameters_shows_the_point_alone() -> None:
    pane = hl.SpectrumPane(hl.RingModel(hl.heat_kernel(G, 1), hl.static_fermions(G, "1/2")), cutoff=4)
    assert pane.fault == ""
    assert pane.branches is None
    assert pane.spectrum.masses.shape == (5,)


def test_loom_change_a_weight_and_all_follow() -> None:
    loom = hl.Loom(MODEL, spectrum={"cutoff": 4, "levels": 4})
    loom.link_pane._form._choice.value = "Wilson"
    changed = MODEL.with_link(hl.wilson(G, "beta"))
    assert loom.model == loom.element_pane.model == loom.spectrum_pane.model == changed
    assert set(loom.values) == {"beta", "z"}
    assert loom.element_pane.transfer.model == changed
    assert loom.spectrum_pane.spectrum.model == changed
    loom.site_pane._add(None)
    assert loom.model.site == MODEL.site * hl.static_fermions(G, "z")


def test_loom_change_a_value_anywhere_and_all_follow() -> None:
    loom = hl.Loom(MODEL, spectrum={"cutoff": 4, "levels": 4})
    loom.site_pane._sliders.children[0].value = 0.75
    assert loom.values["z"] == 0.75
    assert loom.spectrum_pane.spectrum.values["z"] == 0.75
    assert loom.element_pane.values["z"] == 0.75
    loom.values = {"t": 2.0, "z": 0.75}
    assert loom.link_pane.values == {"t": 2.0}


def test_loom_model_set_from_outside_reaches_every_pane() -> None:
    loom = hl.Loom(MODEL, spectrum={"cutoff": 4, "levels": 4})
    loom.model = hl.RingModel(hl.wilson(G, "beta"), hl.static_fermions(G, "y"))
    assert loom.site_pane.weight == hl.static_fermions(G, "y")
    assert set(loom.values) == {"beta", "y"}
    assert loom.spectrum_pane.fault == loom.element_pane.fault == ""


def test_closed_stations_wait_and_catch_up() -> None:
    loom = hl.Loom(MODEL, opened=["spectrum"], spectrum={"cutoff": 4, "levels": 4})
    derivation = loom.element_pane.derivation
    loom.link_pane.weight = hl.wilson(G, "beta")
    assert loom.element_pane.derivation is derivation
    assert loom.element_pane.layout.display == "none"
    loom.opened = ["matrix", "spectrum"]
    assert loom.element_pane.derivation.model == loom.model
    assert loom.element_pane.layout.display is None


def test_loom_refuses_a_station_that_is_none() -> None:
    with pytest.raises(ParameterError, match="stations are"):
        hl.Loom(MODEL, opened=["weather"])


def test_a_pane_that_cannot_draw_at_all_says_so_where_it_is_built() -> None:
    with pytest.raises(ParameterError, match=r"\|z\| < 1"):
        hl.SitePane(hl.static_bosons(G, "z"), values={"z": 1.2})


def test_the_fault_line_stands_beside_the_sliders() -> None:
    pane = hl.SitePane(hl.static_bosons(G, "z"), values={"z": 0.5})
    pane.values = {"z": 1.2}
    lines = [widget for widget in descendants(pane) if getattr(widget, "message", "") == pane.fault]
    assert len(lines) == 1
    assert pane.fault.endswith("What is shown is the last good result.")
    parent = next(w for w in descendants(pane) if lines[0] in getattr(w, "children", ()))
    assert pane._sliders in parent.children


@pytest.mark.parametrize("n", [2, 4, 8])
def test_loom_follows_a_model_of_another_group(n: int) -> None:
    loom = hl.Loom(MODEL, spectrum={"cutoff": 4, "levels": 3}, matrix={"element": ("3", "3bar")})
    group = hl.SU(n)
    loom.model = hl.RingModel(hl.wilson(group, "beta"), hl.static_fermions(group, "z"))
    assert {pane.fault for pane in (loom, *loom._panes.values())} == {""}
    assert loom.element_pane.transfer.model == loom.spectrum_pane.spectrum.model == loom.model
    assert loom.element_pane.element == (group.trivial.name,) * 2
    loom.model = MODEL
    assert loom.element_pane.transfer.model == MODEL


def test_site_pane_gives_numbers_where_the_sum_is_too_long_to_write() -> None:
    pane = hl.SitePane(hl.static_fermions(G, "z"))
    pane._forms[0]._fields["copies"].control.value = "20"
    assert pane.fault == ""
    assert "231 characters" in pane._sums.value
    assert repr(pane).startswith("Site weight")


def test_a_fault_shows_its_excerpt_below_the_words() -> None:
    pane = hl.LinkPane(MODEL.link)
    pane._form._fields["t"].control.value = "__import__('os')"
    (line,) = [w for w in descendants(pane) if getattr(w, "message", "")]
    words, _, excerpt = line.value.partition("<pre>")
    assert "has no meaning here" in words
    assert "__import__" in excerpt
    assert pane.weight == MODEL.link


def test_imaginary_chemical_potential_has_a_slider_for_its_phase() -> None:
    site = hl.static_fermions(G, "exp(I*theta)", zbar="exp(-I*theta)")
    pane = hl.SpectrumPane(hl.RingModel(MODEL.link, site), cutoff=3, levels=3, scan="theta")
    assert (pane.fault, pane._span_field.fault) == ("", "")
    # C-symmetric up to conjugation: T is Hermitian there, and so all masses are real
    assert abs(pane.spectrum.masses.imag).max() == 0


def test_complex_matrix_is_said_to_have_no_pairs() -> None:
    model = hl.RingModel(MODEL.link, hl.static_fermions(G, "z*exp(I*theta)"))
    pane = hl.SpectrumPane(model, values={"theta": 0.3}, cutoff=3, levels=3)
    assert "need not come in conjugate pairs" in pane._note.value
