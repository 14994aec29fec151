"""Weights of a model document: kind and parameters on one side, link and site weights on the other."""

from __future__ import annotations

from collections.abc import Mapping
from decimal import Decimal
from functools import reduce
from operator import mul
from typing import TYPE_CHECKING, Any

from haarloom.documents.tree import Node
from haarloom.exceptions import DocumentError, HaarloomError

if TYPE_CHECKING:
    from haarloom.actions.protocols import LinkWeight, SiteWeight, Weight
    from haarloom.actions.registry import Entry
    from haarloom.algebra.group import SU

__all__ = ["link_from", "site_from_list", "weight_entries", "weight_entry"]

PRODUCT = "product"


def weight_entry(weight: Weight) -> dict[str, Any]:
    """``{"kind": …, "parameters": {…}}`` of one weight.

    Raises
    ------
    DocumentError
        If the kind is not one of the built-in ones, so that nobody could open the document.
    """
    return _entry(weight.describe())


def weight_entries(site: SiteWeight) -> list[dict[str, Any]]:
    """The entry of each factor of a site weight."""
    facts = site.describe()
    return [_entry(factor) for factor in facts["factors"]] if facts["kind"] == PRODUCT else [_entry(facts)]


def _entry(description: Mapping[str, Any]) -> dict[str, Any]:
    from haarloom.actions.registry import REGISTRY

    facts = dict(description)
    kind = facts.pop("kind")
    known = sorted({*_kinds("link"), *_kinds("site")})
    if kind not in known:
        raise DocumentError(
            f"a weight of kind {kind!r} cannot be written to a document: only built-in kinds can be read "
            f"back ({', '.join(known)}); keep the code that builds it instead"
        )
    for name in _nested(REGISTRY[kind]) & set(facts):
        inner = facts[name]
        facts[name] = _entry(inner) if isinstance(inner, Mapping) else [_entry(part) for part in inner]
    return {"kind": kind, "parameters": facts}


def link_from(place: Node, group: SU) -> LinkWeight:
    """The link weight of an entry."""
    return _weight(place, group, _kinds("link"))


def site_from_list(place: Node, group: SU) -> SiteWeight:
    """The product of the site weights of a list of entries."""
    factors = [_weight(entry, group, _kinds("site")) for entry in place.items()]
    if not factors:
        place.refuse("no site weight given; at least one is needed")
    return reduce(mul, factors)


def _kinds(family: str) -> dict[str, Entry]:
    from haarloom.actions.registry import REGISTRY

    # A product is a list of entries in a document, so that there is one way to write it.
    return {kind: entry for kind, entry in REGISTRY.items() if entry.family == family and kind != PRODUCT}


def _weight(place: Node, group: SU, kinds: Mapping[str, Entry]) -> Any:
    place.keys(["kind"], ["parameters"])
    kind = place.child("kind").text()
    if kind not in kinds:
        place.child("kind").refuse(f"unknown kind {kind!r}; known: {', '.join(sorted(kinds))}")
    entry = kinds[kind]
    parameters = Node({}, f"{place.path}.parameters")
    if "parameters" in place.value:
        parameters = place.child("parameters")
    required = [field.name for field in entry.fields if not field.optional]
    parameters.keys(required, [field.name for field in entry.fields if field.optional])
    nested = _nested(entry)
    given = {
        name: _weights(node, group, kinds) if name in nested else _plain(node)
        for name, node in parameters.children()
    }
    try:
        return entry.constructor(group, **given)
    except HaarloomError as problem:
        _blamed(parameters, given, str(problem)).refuse(str(problem))


def _nested(entry: Entry) -> set[str]:
    """Fields that hold weights themselves, such as the strips of a stack."""
    return {field.name for field in entry.fields if field.domain == "weights"}


def _weights(place: Node, group: SU, kinds: Mapping[str, Entry]) -> Any:
    if isinstance(place.value, list):
        return [_weight(member, group, kinds) for member in place.items()]
    return _weight(place, group, kinds)


def _blamed(parameters: Node, given: Mapping[str, Any], complaint: str) -> Node:
    """The parameter that the complaint begins with, or all of them."""
    word = complaint.replace("=", " ").split()[0] if complaint else ""
    return parameters.child(word) if word in given else parameters


def _plain(node: Node) -> Any:
    """Text and whole numbers as they are, decimals as their text, objects and lists member by member."""
    if isinstance(node.value, bool) or node.value is None:
        node.refuse(f"{node.value!r} given; text or a number is needed")
    if isinstance(node.value, Decimal):
        return str(node.value)
    if isinstance(node.value, dict):
        return {key: _plain(child) for key, child in node.children()}
    if isinstance(node.value, list):
        return [_plain(member) for member in node.items()]
    return node.value
