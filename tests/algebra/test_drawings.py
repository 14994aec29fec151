"""Young diagrams and weight diagrams as SVG."""

from __future__ import annotations

import xml.etree.ElementTree as ET

import pytest

from haarloom.algebra.group import SU

SVG = "{http://www.w3.org/2000/svg}"


def parts(svg: str, tag: str) -> list[ET.Element]:
    return ET.fromstring(svg).findall(f".//{SVG}{tag}")


@pytest.mark.parametrize(
    ("n", "labels"), [(2, (3,)), (3, (2, 1)), (4, (1, 0, 1)), (8, (0, 0, 1, 0, 0, 0, 0))]
)
def test_a_box_for_each_box(n: int, labels: tuple[int, ...]) -> None:
    irrep = SU(n).irrep(labels)
    drawing = irrep.young_diagram()
    assert len(parts(drawing.svg, "rect")) == sum(irrep.partition)
    assert irrep.name in parts(drawing.svg, "title")[0].text


@pytest.mark.parametrize("name", ["1", "3", "6bar", "8", "10", "27"])
def test_a_disc_for_each_weight_and_a_ring_for_each_further_state(name: str) -> None:
    irrep = SU(3).irrep(name)
    discs = parts(irrep.weight_diagram().svg, "circle")
    assert len(discs) == irrep.dimension


def test_threads_follow_the_multiplicities() -> None:
    """One outline for every multiplicity that occurs: 27 has 1, 2 and 3."""
    assert len(parts(SU(3).irrep("27").weight_diagram().svg, "polygon")) == 3
    assert len(parts(SU(3).irrep("10").weight_diagram().svg, "polygon")) == 1


def test_weights_that_fall_on_one_point_add_up() -> None:
    assert "15 states on 9 points" in str(SU(4).adjoint.weight_diagram())


def test_crowded_pictures_use_discs_of_different_size() -> None:
    svg = SU(3).irrep(12, 9).weight_diagram().svg
    discs = parts(svg, "circle")
    assert len(discs) == len(SU(3).irrep(12, 9).weights())
    assert len({disc.get("r") for disc in discs}) > 3


def test_the_highest_weight_is_marked_once() -> None:
    svg = SU(3).irrep(2, 1).weight_diagram().svg
    marked = [disc for disc in parts(svg, "circle") if "brand" in (disc.get("fill") or "")]
    assert len(marked) == 1


def test_a_picture_too_large_falls_back_to_words() -> None:
    assert not parts(SU(3).irrep(300, 300).young_diagram().svg, "rect")
    drawing = SU(3).irrep(70, 70).weight_diagram()
    assert not parts(drawing.svg, "circle")
    assert "too many" in drawing.description
    assert len(drawing.svg) < 1000


def test_drawings_show_themselves() -> None:
    drawing = SU(3).adjoint.young_diagram()
    assert drawing._repr_html_() == drawing.svg
    assert str(drawing) == "Young diagram of 8: rows 2, 1"
    assert "trivial" in str(SU(3).trivial.young_diagram())
    assert len(repr(drawing)) < 80
