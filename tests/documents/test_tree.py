"""JSON read strictly, every complaint with the path of the place."""

from __future__ import annotations

from decimal import Decimal

import pytest

from haarloom.documents.tree import read_tree
from haarloom.exceptions import DocumentError


def test_decimals_stay_exact() -> None:
    root = read_tree('{"a": [0.1, 3, 0.30000000000000000001]}')
    assert [node.value for node in root.child("a").items()] == [
        Decimal("0.1"),
        3,
        Decimal("0.30000000000000000001"),
    ]


@pytest.mark.parametrize(
    ("text", "complaint"),
    [
        ('{"site": [{"z": NaN}]}', r"^site\[0\]\.z: NaN is no number"),
        ('{"a": -Infinity}', r"^a: -Infinity"),
        ('{"values": {"t": 1, "t": 2}}', r"^values: the key 't' stands there twice"),
        ('{"a": 1, "a": 1}', r"^the document: the key 'a' stands there twice"),
        ('{"a": }', r"no JSON: .* line 1, column 7"),
        ("", "no JSON"),
        ("[" * 100_000, "nested more than 20 deep"),
        ("[" * 30 + "]" * 30, "nested more than 20 deep"),
        ('{"a": ' + "9" * 5000 + "}", "^a: a number with too many digits"),
        ('{"a": 0.' + "9" * 5000 + "}", "^a: a number with too many digits"),
        (" " * 1_000_001, "1,000,001 characters"),
    ],
)
def test_refusal(text: str, complaint: str) -> None:
    with pytest.raises(DocumentError, match=complaint):
        read_tree(text)


def test_keys_are_checked_both_ways() -> None:
    root = read_tree('{"link": {"kind": "x", "colour": 1}}')
    with pytest.raises(DocumentError, match=r"^link: unknown key 'colour'; allowed: kind, parameters"):
        root.child("link").keys(["kind"], ["parameters"])
    with pytest.raises(DocumentError, match=r"^link: the key 'group' is missing"):
        root.child("link").keys(["group"])


@pytest.mark.parametrize("text", ["true", "1.5", '"2"', "0", "99", "null", "[1]"])
def test_whole_number_within_bounds(text: str) -> None:
    with pytest.raises(DocumentError, match=r"^levels: .*1 to 50"):
        read_tree(f'{{"levels": {text}}}').child("levels").whole(1, 50)
