"""The HTML faces hold the pictures, for notebooks that are read without a kernel."""

from __future__ import annotations

import base64
import re
import xml.etree.ElementTree as ET

import numpy as np

import haarloom as hl
from haarloom.widgets.stills import curves_svg, grid_svg

G = hl.SU(3)
MODEL = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
SVG = "{http://www.w3.org/2000/svg}"


def drawn(html: str) -> list[ET.Element]:
    """The SVG pictures in a piece of HTML, parsed."""
    found = re.findall(r'src="data:image/svg\+xml;base64,([^"]+)"', html)
    return [ET.fromstring(base64.b64decode(data)) for data in found]


def test_spectrum_face_draws_each_branch_twice_and_shades_the_stretches() -> None:
    pane = hl.SpectrumPane(MODEL, cutoff=4, levels=4, values={"t": 1.0, "z": 0.3})
    pictures = drawn(pane._repr_html_())
    assert len(pictures) == 2
    for picture in pictures:
        assert len(picture.findall(f"{SVG}path")) == 3 + 2  # branches, current point, axes
        assert len(picture.findall(f"{SVG}rect")) == len(pane.stretches) == 2


def test_matrix_face_has_a_square_for_each_element_that_is_not_zero() -> None:
    pane = hl.ElementPane(MODEL, cutoff=2)
    (picture,) = drawn(pane._repr_html_())
    assert len(picture.findall(f"{SVG}rect")) == len(pane.transfer.elements) + 1


def test_link_face_has_a_bar_for_each_irrep() -> None:
    pane = hl.LinkPane(MODEL.link)
    (picture,) = drawn(pane._repr_html_())
    assert len(picture.findall(f"{SVG}rect")) == len(pane.irreps)


def test_site_face_holds_the_map_or_the_line() -> None:
    assert "data:image/png;base64," in hl.SitePane(MODEL.site)._repr_html_()
    line = hl.SitePane(hl.static_fermions(hl.SU(2), "z"))
    assert len(drawn(line._repr_html_())) == 1


def test_a_curve_breaks_where_it_is_not_finite() -> None:
    (picture,) = drawn(curves_svg(np.arange(4.0), np.array([[0.0, 1.0, np.nan, 2.0]]), "x", "<y>"))
    path = picture.find(f"{SVG}path")
    assert path is not None
    assert path.attrib["d"].count("M") == 2


def test_a_large_matrix_shows_its_first_rows_and_says_so() -> None:
    size = 50
    names, zero = [str(k) for k in range(size)], np.zeros((size, size), dtype=int)
    html = grid_svg(names, zero, np.eye(size, dtype=int), np.eye(size), 3)
    assert len(drawn(html)[0].findall(f"{SVG}rect")) == 36 + 1
    assert "The first 36 of 50 irreps" in html
