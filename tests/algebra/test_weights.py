"""Weight systems."""

from __future__ import annotations

from itertools import combinations

import pytest
from hypothesis import given

from algebra.strategies import irreps
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.weights import characters_in_contents, orbit_size, reflected, weight_system
from haarloom.exceptions import SizeError


def freudenthal(irrep: Irrep) -> dict[tuple[int, ...], int]:
    """Multiplicities of all contents by H. Freudenthal's recursion, from the highest weight down."""
    n, top = irrep.group.n, irrep.partition
    roots = list(combinations(range(n), 2))
    rho = [n - 1 - i for i in range(n)]
    norm = lambda content: sum((c + r) ** 2 for c, r in zip(content, rho, strict=True))  # noqa: E731
    found = {top: 1}
    level = {top}
    while level:
        below = {
            tuple(c - (k == i) + (k == i + 1) for k, c in enumerate(content))
            for content in level
            for i in range(n - 1)
        }
        level = set()
        for content in below - set(found):
            total = 0
            for i, j in roots:
                step = tuple((k == i) - (k == j) for k in range(n))
                above = tuple(c + s for c, s in zip(content, step, strict=True))
                while above in found:
                    total += 2 * found[above] * (above[i] - above[j])
                    above = tuple(c + s for c, s in zip(above, step, strict=True))
            gap = norm(top) - norm(content)
            if total and gap:
                assert total % gap == 0
                found[content] = total // gap
                level.add(content)
    return found


@given(irreps(largest=5))
def test_multiplicities_agree_with_freudenthal(irrep: Irrep) -> None:
    assert dict(weight_system(irrep.labels)) == freudenthal(irrep)


@given(irreps())
def test_orbits_of_dominant_weights_fill_the_irrep(irrep: Irrep) -> None:
    filled = sum(count * orbit_size(weight) for weight, count in irrep.dominant_weights().items())
    assert filled == irrep.dimension


@given(irreps())
def test_weights_add_up_to_zero_and_conjugation_negates_them(irrep: Irrep) -> None:
    weights = irrep.weights()
    assert all(
        sum(count * weight[i] for weight, count in weights.items()) == 0 for i in range(irrep.group.rank)
    )
    assert irrep.conjugate.weights() == {
        tuple(-m for m in weight): count for weight, count in weights.items()
    }


@given(irreps())
def test_weights_gather_into_their_irrep(irrep: Irrep) -> None:
    assert characters_in_contents(weight_system(irrep.labels)) == {irrep.labels: 1}


def test_highest_weight_comes_first() -> None:
    assert next(iter(SU(4).irrep(1, 0, 2).weights())) == (1, 0, 2)


def test_weights_of_the_octet() -> None:
    weights = SU(3).adjoint.weights()
    assert weights[0, 0] == 2
    assert len(weights) == 7
    assert all(count == 1 for weight, count in weights.items() if weight != (0, 0))


@pytest.mark.parametrize(
    ("shifted", "sign", "ordered"),
    [
        ((3, 1, 0), 1, (3, 1, 0)),
        ((1, 3, 0), -1, (3, 1, 0)),
        ((0, 3, 1), 1, (3, 1, 0)),
        ((2, 2, 0), 0, (2, 2, 0)),
    ],
)
def test_reflection_signs(shifted: tuple[int, ...], sign: int, ordered: tuple[int, ...]) -> None:
    assert reflected(shifted) == (sign, ordered)


def test_a_weight_system_beyond_memory_is_refused_with_its_size() -> None:
    with pytest.raises(SizeError, match="729,243,027,001"):
        SU(3).irrep(9_000, 9_000).weights()
