"""What an analysis says about weights whose properties are known."""

from __future__ import annotations

import pytest

from haarloom.actions import (
    analyse_link,
    analyse_site,
    analyse_transfer,
    haar_power,
    heat_kernel,
    link_from_coefficients,
    loop_coupling,
    loop_field,
    mixed_wilson,
    site_from,
    static_bosons,
    static_fermions,
    wilson,
)
from haarloom.algebra.group import SU
from haarloom.exceptions import MissingValueError

G = SU(3)
PROPERTIES = (
    "real",
    "positive",
    "CK symmetric",
    "charge symmetric",
    "non-negative coefficients",
    "N-alities",
)


@pytest.mark.parametrize(
    ("site", "values", "holds"),
    [
        (static_fermions(G, "z"), {"z": 0.4}, (False, False, True, False, True, True)),
        (static_fermions(G, "z", "y"), {"z": 0.4, "y": 0.4}, (True, True, True, True, True, True)),
        (static_fermions(G, "z", irrep="8"), {"z": 0.4}, (True, True, True, True, True, False)),
        (static_fermions(G, "z", "y"), {"z": 0.4j, "y": -0.4j}, (True, True, False, False, False, True)),
        (loop_field(G, {"8": "h"}), {"h": -0.4}, (True, True, True, True, False, False)),
        (static_bosons(G, "z"), {"z": 0.3}, (False, False, True, False, True, True)),
        (site_from(G, "L + conj(L)"), {}, (True, False, True, True, True, True)),
        (site_from(G, "1 + I*(L - conj(L))/20"), {}, (True, True, False, False, False, True)),
        (haar_power(G, 1), {}, (True, True, True, True, False, False)),
    ],
)
def test_site_properties(site: object, values: dict[str, complex], holds: tuple[bool, ...]) -> None:
    found = analyse_site(site, **values)  # type: ignore[arg-type]
    assert tuple(found[name].holds for name in PROPERTIES) == holds


def test_exact_statements_are_marked_so() -> None:
    found = analyse_site(static_fermions(G, "z"), z=0.4)
    assert found["CK symmetric"].basis == "exact"
    assert found["real"].basis == "measured"
    assert "z^3" in found["particle–hole"].words
    assert "radius 1" in analyse_site(static_bosons(G, "z"), z=0.2)["series"].words


@pytest.mark.parametrize(
    ("link", "values", "positive", "diagonal"),
    [
        (heat_kernel(G, "t"), {"t": 1.0}, True, True),
        (wilson(G, "beta", 2), {"beta": 6.0}, True, True),
        (mixed_wilson(G, {"3": "b", "8": "c"}), {"b": 2.0, "c": -2.0}, False, True),
        (loop_coupling(G, "lam", "exponential"), {"lam": 0.2}, True, False),
        (loop_coupling(G, "lam"), {"lam": -0.2}, False, True),
        (link_from_coefficients(G, {"1": 1, "3": "I*k", "3bar": "-I*k"}), {"k": 0.1}, False, True),
    ],
)
def test_link_properties(link: object, values: dict[str, float], positive: bool, diagonal: bool) -> None:
    found = analyse_link(link, **values)  # type: ignore[arg-type]
    assert found["positive kernel"].holds is positive
    assert found["diagonal"].holds is diagonal


def test_casimir_scaling_is_seen_where_it_holds() -> None:
    assert analyse_link(heat_kernel(G, "t"), t=1.0)["Casimir scaling"].holds is True
    assert analyse_link(wilson(G, "beta"), beta=6.0)["Casimir scaling"].holds is False
    assert "8.205214" in analyse_link(wilson(G, "beta"), beta=6.0)["strong-coupling series"].words


@pytest.mark.parametrize(
    ("site", "values", "expected"),
    [
        (static_fermions(G, "z"), {"z": 0.4}, (True, False, True)),
        (static_fermions(G, "z", "y"), {"z": 0.4, "y": 0.4}, (True, True, True)),
        (loop_field(G, {"8": "h"}), {"h": -0.4}, (True, True, False)),
    ],
)
def test_transfer_matrix_properties(
    site: object, values: dict[str, float], expected: tuple[bool, ...]
) -> None:
    found = analyse_transfer(heat_kernel(G, "t"), site, t=1.0, **values)  # type: ignore[arg-type]
    assert tuple(found[name].holds for name in ("T real", "T Hermitian", "T non-negative")) == expected


def test_faces_are_complete_small_and_escaped() -> None:
    found = analyse_site(static_fermions(G, "z"), z=0.4)
    page = found._repr_html_()
    assert page.count("<tr>") == 1 + len(found.statements)
    assert page.startswith("<svg role=")
    assert "data:image/png;base64," in page
    assert len(page) < 60_000
    assert "at z = 0.4" in repr(found)
    line = analyse_site(static_fermions(SU(2), "z"), z=0.4).picture
    assert "<path" in line
    assert "<img src=x>" not in analyse_site(site_from(G, "1"))._repr_html_()


def test_missing_values_and_unknown_properties() -> None:
    with pytest.raises(MissingValueError, match="z"):
        analyse_site(static_fermions(G, "z"))
    with pytest.raises(KeyError, match="is no statement; ask for one of"):
        analyse_site(static_fermions(G, "z"), z=0.1)["beautiful"]


def test_accuracy_says_what_is_proven_and_what_is_measured() -> None:
    assert analyse_link(wilson(G, "beta"), beta=1.0)["proven bounds"].holds is True
    assert analyse_link(mixed_wilson(G, {"3": "b"}), b=1.0)["proven bounds"].holds is False
    table = analyse_link(link_from_coefficients(G, {"1": 1, "3": "k"}), k=0.1)["proven bounds"]
    assert "every other k_r is set to zero" in table.words
    assert (
        analyse_site(static_fermions(G, "z") * loop_field(G, {"8": "h"}), z=0.1, h=0.1)["proven bounds"].holds
        is True
    )
    assert "measured by refining" in analyse_site(site_from(G, "exp(L*conj(L)/9)"))["proven bounds"].words
