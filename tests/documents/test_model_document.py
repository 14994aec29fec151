"""Model documents: what is written reads back, and everything foreign is refused with its path."""

from __future__ import annotations

import copy
import json
import pickle
from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import pytest
import sympy

import haarloom as hl
from haarloom import actions
from haarloom.actions.base import Link
from haarloom.actions.registry import REGISTRY, build
from haarloom.documents.model_document import (
    ModelDocument,
    from_document,
    load,
    read_document,
    save,
    to_document,
)
from haarloom.documents.shipped import shipped_models
from haarloom.exceptions import DocumentError, HaarloomError

G = hl.SU(3)
z, t = sympy.symbols("z t")
LINKS = [
    hl.heat_kernel(G, "t"),
    hl.heat_kernel(G, sympy.Rational(1, 3), plaquettes=4),
    hl.wilson(G, sympy.sqrt(2) * sympy.Symbol("beta"), plaquettes=2),
    hl.loop_coupling(G, "1/7"),
    hl.link_from_coefficients(G, {"1": 1, "3": "k", "3bar": "k", "8": "k**2/2"}),
    actions.mixed_wilson(G, {"3": "beta", "8": "beta/4"}, plaquettes=2),
    actions.manton(G, "beta"),
    actions.link_from_plaquette(G, "exp(beta*(L + L*)/6 + g*chi(1, 1))", plaquettes=3),
    build(G, {"kind": "exponential loop coupling", "lam": "lam"}),
    actions.bilinear_coupling(G, {("1", "1"): 1, ("3", "3"): "a", ("3bar", "3bar"): "a", ("8", "1"): "1/9"}),
    build(G, {"kind": "stacked strips", "links": [hl.heat_kernel(G, "t"), hl.wilson(G, "beta")]}),
    build(G, {"kind": "coupled link", "gauge": hl.heat_kernel(G, "t"), "coupling": hl.loop_coupling(G, "k")}),
]
SITES = [
    hl.static_fermions(G, "z"),
    hl.static_fermions(G, z * sympy.exp(sympy.I * sympy.pi / 3), zbar="0.25", copies=4, irrep="6bar"),
    hl.static_bosons(G, "z", irrep="8"),
    hl.loop_field(G, {"8": "h", "3": "1/4", "3bar": "1/4"}),
    actions.polynomial_potential(G, "b2", "b3", "1/2", volume=2),
    actions.logarithmic_potential(G, "a", -1),
    actions.haar_power(G, "1/3"),
    actions.site_from(G, "1 + abs(L)^2/9 + h*(tr(P, 2) + conj(tr(P, 2)))"),
    hl.static_fermions(G, "z") * hl.loop_field(G, {"8": "h"}) * hl.static_fermions(G, "y", irrep="8"),
]


@pytest.fixture
def content() -> dict[str, Any]:
    model = hl.RingModel(LINKS[0], SITES[0] * SITES[3])
    return to_document(
        ModelDocument(model, {"t": 1, "z": "0.3", "h": 0.1}, name="A", notes="B", invented="C")
    )


MODELS = [*((link, SITES[0]) for link in LINKS), *((LINKS[0], site) for site in SITES)]


@pytest.mark.parametrize(("link", "site"), MODELS, ids=lambda weight: weight.kind)
def test_saved_model_loads_as_itself(link: Any, site: Any, tmp_path: Path) -> None:
    model = hl.RingModel(link, site)
    path = save(model, tmp_path / "x.loom.json")
    assert load(path) == model
    first = path.read_text()
    save(load(path), path)
    assert path.read_text() == first


def test_every_built_in_kind_is_covered() -> None:
    assert {weight.kind for weight in (*LINKS, *SITES)} >= set(REGISTRY)


def test_facts_are_kept_and_exact(content: dict[str, Any]) -> None:
    content["cutoff"] = 7
    document = from_document(content)
    assert dict(document.values) == {
        "t": sympy.Integer(1),
        "z": sympy.Rational(3, 10),
        "h": sympy.Rational(1, 10),
    }
    assert (document.name, document.notes, document.invented) == ("A", "B", "C")
    assert (document.levels, document.cutoff) == (6, 7)
    assert to_document(document) == content


def test_documents_are_values(content: dict[str, Any]) -> None:
    document, twin = from_document(content), from_document(content)
    assert document == twin
    assert hash(document) == hash(twin)
    assert pickle.loads(pickle.dumps(document)) == document
    assert replace(document, values={"t": 2}) != document
    with pytest.raises(TypeError):
        document.values["t"] = 2  # type: ignore[index]


def test_json_numbers_are_read_digit_for_digit(content: dict[str, Any], tmp_path: Path) -> None:
    text = json.dumps(content).replace('"3/10"', "0.30000000000000000001")
    path = tmp_path / "x.loom.json"
    path.write_text(text)
    assert read_document(path).values["z"] == sympy.Rational(30000000000000000001, 10**20)


def test_document_gives_the_spectrum_of_the_model() -> None:
    document = from_document(json.loads(shipped_models()[0].read_text()))
    direct = document.model.spectrum(levels=document.levels, **document.numbers())
    assert (document.spectrum().masses == direct.masses).all()


Change = Callable[[dict[str, Any]], Any]


@pytest.mark.parametrize(
    ("change", "complaint"),
    [
        (lambda d: d.pop("format"), r"^the document: the key 'format' is missing"),
        (lambda d: d.update(format="other"), r"^format: 'other' is not 'loom model'"),
        (lambda d: d.update(version=2), r"^version: 2 given; this Haarloom reads version 1"),
        (lambda d: d.pop("version"), r"^version: None given"),
        (lambda d: d.update(colour=1), r"^the document: unknown key 'colour'"),
        (lambda d: d.pop("site"), r"^the document: the key 'site' is missing"),
        (lambda d: d.update(name=3), r"^name: 3 given; text in quotes"),
        (lambda d: d.update(group="U(3)"), r"^group: 'U\(3\)' given; write it like 'SU\(3\)'"),
        (lambda d: d.update(group="SU(99)"), r"^group: .*99"),
        (lambda d: d.update(group=3), r"^group: 3 given"),
        (lambda d: d.update(link=[]), r"^link: \[\] given; an object"),
        (lambda d: d["link"].update(kind="heat"), r"^link\.kind: unknown kind 'heat'; known: .*heat kernel"),
        (lambda d: d["link"].update(kind="static fermions"), r"^link\.kind: unknown kind"),
        (lambda d: d["link"].update(kind=None), r"^link\.kind: None given"),
        (lambda d: d["link"]["parameters"].update(t="-1"), r"^link\.parameters\.t: .*≥ 0"),
        (lambda d: d["link"]["parameters"].update(t="t +"), r"^link\.parameters.*: .*is needed here"),
        (lambda d: d["link"]["parameters"].update(t=None), r"^link\.parameters\.t: None given"),
        (lambda d: d["link"]["parameters"].update(u="1"), r"^link\.parameters: unknown key 'u'"),
        (lambda d: d["link"]["parameters"].pop("t"), r"^link\.parameters: the key 't' is missing"),
        (lambda d: d["link"].pop("parameters"), r"^link\.parameters: the key 't' is missing"),
        (
            lambda d: d.update(link={"kind": "stacked strips", "parameters": {"links": [{"kind": "x"}]}}),
            r"^link\.parameters\.links\[0\]\.kind: unknown kind 'x'",
        ),
        (lambda d: d.update(site={}), r"^site: \{\} given; a list"),
        (lambda d: d.update(site=[]), r"^site: no site weight given"),
        (lambda d: d["site"][0].update(kind="product"), r"^site\[0\]\.kind: unknown kind 'product'"),
        (lambda d: d["site"][0]["parameters"].update(copies=0), r"^site\[0\]\.parameters\.copies: "),
        (lambda d: d["site"][0]["parameters"].update(irrep="3b"), r"^site\[0\]\.parameters"),
        (lambda d: d["site"][1]["parameters"].update(fields={"x": "h"}), r"^site\[1\]\.parameters"),
        (lambda d: d["values"].update(z="z"), r"^values\.z: the symbol 'z' is not known"),
        (lambda d: d["values"].update(z=True), r"^values\.z: a number is needed"),
        (lambda d: d["values"].update(z="1/0"), r"^values\.z: division by zero"),
        (lambda d: d["values"].update(z=float("nan")), r"^values\.z: NaN"),
        (lambda d: d["values"].update(beta="1"), r"^values\.beta: .*no such parameter \(it has: h, t, z\)"),
        (lambda d: d.update(values=[1]), r"^values: \[1\] given"),
        (lambda d: d.update(levels=1), r"^levels: 1 given; allowed are 2 to"),
        (lambda d: d.update(levels="6"), r"^levels: '6' given"),
        (lambda d: d.update(cutoff=-1), r"^cutoff: -1 given"),
        (lambda d: d.update(cutoff=2.5), r"^cutoff: 2.5 given"),
    ],
)
def test_refusal_begins_with_the_path(content: dict[str, Any], change: Change, complaint: str) -> None:
    spoiled = copy.deepcopy(content)
    change(spoiled)
    with pytest.raises(DocumentError, match=complaint):
        from_document(spoiled)
    assert from_document(content)  # the same document unspoiled is fine


def test_file_is_named(tmp_path: Path) -> None:
    path = tmp_path / "x.json"
    path.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(DocumentError, match=r"x\.json: no text in UTF-8"):
        load(path)
    path.write_text('{"format": "loom model", "format": "loom model"}')
    with pytest.raises(DocumentError, match=r"x\.json: the document: the key 'format' stands there twice"):
        load(path)


@pytest.mark.parametrize("content", [[], "x", 3, None])
def test_only_objects_are_documents(content: Any) -> None:
    with pytest.raises(DocumentError):
        from_document(content)


def test_weight_of_ones_own_is_not_written(tmp_path: Path) -> None:
    @dataclass(frozen=True)
    class Own(Link):
        group: Any
        kind = "own"

    with pytest.raises(DocumentError, match="kind 'own' cannot be written"):
        save(hl.RingModel(Own(G), SITES[0]), tmp_path / "x.loom.json")
    assert not list(tmp_path.iterdir())


@pytest.mark.parametrize(
    ("values", "facts"),
    [({"q": 1}, {}), ({"z": "y"}, {}), ({"z": float("inf")}, {}), ({"z": "1/0"}, {}), ({"z": None}, {})],
)
def test_bad_values_are_refused_before_anything_is_written(
    values: dict[str, Any], facts: dict[str, Any], tmp_path: Path
) -> None:
    with pytest.raises(HaarloomError, match=r"values\."):
        save(hl.RingModel(LINKS[0], SITES[0]), tmp_path / "x.loom.json", values=values, **facts)
    assert not list(tmp_path.iterdir())


def test_floats_in_a_model_are_saved_as_the_decimals_they_print_as(tmp_path: Path) -> None:
    model = hl.RingModel(hl.heat_kernel(G, 0.5), hl.static_fermions(G, 0.3))
    exact = hl.RingModel(hl.heat_kernel(G, "1/2"), hl.static_fermions(G, "3/10"))
    assert load(save(model, tmp_path / "x.loom.json")) == exact


@pytest.mark.parametrize("path", shipped_models(), ids=lambda path: path.name)
def test_shipped_model_is_marked_invented_and_complete(path: Path) -> None:
    document = read_document(path)
    assert "made-up" in document.invented
    assert set(document.values) == {symbol.name for symbol in document.model.parameters}
    assert to_document(document) == json.loads(path.read_text())
