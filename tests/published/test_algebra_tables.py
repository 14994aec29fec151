"""Published tables of SU(N) irreps and their products.

Source: R. Slansky, *Phys. Rep.* 79 (1981) 1, tables of irreps of SU(3) to SU(6) and of their products; the
SU(3) part also in the Particle Data Group review *SU(n) multiplets and Young diagrams*. Typed from memory.
The index there is twice ours (1 for the fundamental). Slansky's SU(3) bars differ for some large irreps;
labels and names here follow the rules of haarloom.algebra.names.
"""

from __future__ import annotations

import pytest

from haarloom.algebra.decomposition import product_of
from haarloom.algebra.group import SU

# name, Dynkin labels, N-ality, index
IRREPS = {
    3: (
        "1 00 0 0",
        "3 10 1 1",
        "6 20 2 5",
        "8 11 0 6",
        "10 30 0 15",
        "15 21 1 20",
        "15' 40 1 35",
        "21 50 2 70",
        "24 31 2 50",
        "27 22 0 54",
        "28 60 0 126",
        "35 41 0 105",
        "36 70 1 210",
        "42 32 1 119",
        "48 51 1 196",
        "60 42 2 230",
        "64 33 0 240",
    ),
    4: (
        "1 000 0 0",
        "4 100 1 1",
        "6 010 2 2",
        "10 200 2 6",
        "15 101 0 8",
        "20 011 1 13",
        "20' 020 0 16",
        "20'' 003 1 21",
        "35 400 0 56",
        "36 201 1 33",
        "45 210 0 48",
        "50 030 2 70",
        "60 120 1 71",
        "64 111 2 64",
        "70 301 2 98",
        "84 202 0 112",
    ),
    5: (
        "1 0000 0 0",
        "5 1000 1 1",
        "10 0100 2 3",
        "15 2000 2 7",
        "24 1001 0 10",
        "35 0003 2 28",
        "40 0011 2 22",
        "45 0101 1 24",
        "50 0020 1 35",
        "70 2001 1 49",
        "75 0110 0 50",
        "126 2010 0 105",
        "175 1101 2 140",
    ),
    6: (
        "1 00000 0 0",
        "6 10000 1 1",
        "15 01000 2 4",
        "20 00100 3 6",
        "21 20000 2 8",
        "35 10001 0 12",
        "56 30000 3 36",
        "70 11000 3 33",
        "84 01001 1 38",
        "105 00101 2 52",
        "105' 00020 2 64",
        "120 20001 1 68",
        "175 00200 0 120",
        "189 01010 0 108",
    ),
}
TABLES = [
    pytest.param(n, *entry.split(), id=f"Slansky 1981, SU({n}), {entry.split()[0]}")
    for n, entries in IRREPS.items()
    for entry in entries
]


@pytest.mark.parametrize(("n", "name", "labels", "nality", "index"), TABLES)
def test_irreps(n: int, name: str, labels: str, nality: str, index: str) -> None:
    irrep = SU(n).irrep([int(label) for label in labels])
    assert irrep.dimension == int(name.rstrip("'"))
    assert irrep.nality == int(nality)
    assert 2 * irrep.index == int(index)
    assert irrep.name == name
    assert SU(n).irrep(name) == irrep


# factors = irreps of the product, repeated as often as they occur
PRODUCTS = {
    3: (
        "3 3 = 3bar 6",
        "3 3bar = 1 8",
        "3 6 = 8 10",
        "3bar 6 = 3 15",
        "3 8 = 3 6bar 15",
        "6 6 = 6bar 15 15'",
        "6 6bar = 1 8 27",
        "6 8 = 3bar 6 15bar 24",
        "8 8 = 1 8 8 10 10bar 27",
        "8 10 = 8 10 27 35",
        "3 10 = 15 15'",
        "10 10 = 10bar 27 28 35",
        "10 10bar = 1 8 27 64",
        "3 3 3 = 1 8 8 10",
        "3 3bar 8 = 1 8 8 8 10 10bar 27",
    ),
    4: (
        "4 4 = 6 10",
        "4 4bar = 1 15",
        "4 6 = 4bar 20bar",
        "6 6 = 1 15 20'",
        "4 10 = 20bar 20''bar",
        "4 15 = 4 20 36",
        "6 10 = 15 45",
        "10 10bar = 1 15 84",
        "10 10 = 20' 35 45",
        "15 15 = 1 15 15 20' 45 45bar 84",
        "4 4 4 4 = 1 15 15 15 20' 20' 35 45 45 45",
    ),
    5: (
        "5 5 = 10 15",
        "5 5bar = 1 24",
        "5bar 10 = 5 45",
        "5 10 = 10bar 40bar",
        "10 10 = 5bar 45bar 50bar",
        "10 10bar = 1 24 75",
        "5 24 = 5 45 70",
        "10 24 = 10 15 40 175",
        "24 24 = 1 24 24 75 126 126bar 200",
    ),
    6: (
        "6 6 = 15 21",
        "6 6bar = 1 35",
        "6bar 15 = 6 84",
        "6 15 = 20 70",
        "15 15 = 15bar 105bar 105'bar",
        "15 15bar = 1 35 189",
        "20 20 = 1 35 175 189",
        "6 35 = 6 84 120",
        "35 35 = 1 35 35 189 280 280bar 405",
    ),
}
LINES = [
    pytest.param(n, *(side.split() for side in line.split("=")), id=f"Slansky 1981, SU({n}), {line}")
    for n, lines in PRODUCTS.items()
    for line in lines
]


@pytest.mark.parametrize(("n", "factors", "names"), LINES)
def test_products(n: int, factors: list[str], names: list[str]) -> None:
    group = SU(n)
    product = product_of(group, [group.irrep(name) for name in factors])
    expected = {group.irrep(name): names.count(name) for name in names}
    assert product == expected


@pytest.mark.parametrize(
    ("name", "symmetric", "antisymmetric"),
    [
        pytest.param("3", "6", "3bar", id="3"),
        pytest.param("6", "6bar 15'", "15", id="6"),
        pytest.param("8", "1 8 27", "8 10 10bar", id="8, PDG: symmetric and antisymmetric octet"),
        pytest.param("10", "27 28", "10bar 35", id="10"),
    ],
)
def test_squares_of_su3_by_symmetry(name: str, symmetric: str, antisymmetric: str) -> None:
    """Slansky marks the symmetric and antisymmetric parts of squares; typed from memory."""
    irrep = SU(3).irrep(name)
    assert {r.name for r in irrep.symmetric_power(2)} == set(symmetric.split())
    assert {r.name for r in irrep.antisymmetric_power(2)} == set(antisymmetric.split())


CASIMIR_RATIOS = {
    "3": "1",
    "8": "9/4",
    "6": "5/2",
    "15": "4",
    "10": "9/2",
    "27": "6",
    "24": "25/4",
    "15'": "7",
}


@pytest.mark.parametrize(("name", "ratio"), CASIMIR_RATIOS.items())
def test_casimir_scaling_ratios(name: str, ratio: str) -> None:
    """C₂(r)/C₂(3) as in G. S. Bali, *Phys. Rev. D* 62 (2000) 114503; typed from memory."""
    group = SU(3)
    assert str(group.irrep(name).casimir(2) / group.fundamental.casimir(2)) == ratio
