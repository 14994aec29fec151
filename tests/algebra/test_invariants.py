"""Dimension, Casimirs, index and N-ality."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given

from algebra.strategies import irreps
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ParameterError


@given(irreps())
def test_dimension_is_the_number_of_weights(irrep: Irrep) -> None:
    assert irrep.dimension == sum(irrep.weights().values())


@given(irreps())
def test_index_is_the_trace_of_a_generator_squared(irrep: Irrep) -> None:
    """T = tr H² with H = diag(½, −½, 0, …): half the first Dynkin label, squared, summed over the weights."""
    trace = sum(count * Fraction(weight[0], 2) ** 2 for weight, count in irrep.weights().items())
    assert trace == irrep.index


@given(irreps())
def test_cubic_trace_fixes_the_cubic_casimir(irrep: Irrep) -> None:
    """tr {T_a, T_b}T_c = A d_abc with A·(N²−1)(N²−4)/N = 2·d·C₃, read off from H = diag(1, …, 1, −(N−1))."""
    n = irrep.group.n
    if n == 2:
        assert irrep.casimir(3) == 0
        return

    def cubic(weights: dict[tuple[int, ...], int]) -> int:
        return sum(
            count * (sum(i * m for i, m in enumerate(weight, start=1))) ** 3
            for weight, count in weights.items()
        )

    anomaly = Fraction(cubic(irrep.weights()), cubic(irrep.group.fundamental.weights()))
    expected = anomaly * Fraction((n**2 - 1) * (n**2 - 4), 4 * n) / irrep.dimension
    assert irrep.casimir(3) == expected


@given(irreps())
def test_conjugation_keeps_all_but_the_cubic_casimir_and_the_nality(irrep: Irrep) -> None:
    other = irrep.conjugate
    assert other.conjugate == irrep
    assert (other.dimension, other.casimir(2), other.index) == (
        irrep.dimension,
        irrep.casimir(2),
        irrep.index,
    )
    assert other.casimir(3) == -irrep.casimir(3)
    assert (other.nality + irrep.nality) % irrep.group.n == 0


@pytest.mark.parametrize("n", range(2, 9))
def test_fundamental_and_adjoint(n: int) -> None:
    group = SU(n)
    assert group.fundamental.dimension == n
    assert group.fundamental.casimir(2) == Fraction(n**2 - 1, 2 * n)
    assert group.fundamental.index == Fraction(1, 2)
    assert group.adjoint.dimension == n**2 - 1
    assert group.adjoint.casimir(2) == group.adjoint.index == n
    assert group.adjoint.casimir(3) == 0


@pytest.mark.parametrize(("p", "q"), [(p, q) for p in range(6) for q in range(6)])
def test_closed_forms_of_su3(p: int, q: int) -> None:
    irrep = SU(3).irrep(p, q)
    assert irrep.dimension == (p + 1) * (q + 1) * (p + q + 2) // 2
    assert irrep.casimir(2) == Fraction(p * p + q * q + p * q, 3) + p + q
    assert irrep.casimir(3) == Fraction((p - q) * (p + 2 * q + 3) * (q + 2 * p + 3), 18)
    assert irrep.nality == (p + 2 * q) % 3


@pytest.mark.parametrize("spin", range(8))
def test_su2_is_angular_momentum(spin: int) -> None:
    irrep = SU(2).irrep(spin)
    assert irrep.dimension == spin + 1
    assert irrep.casimir(2) == Fraction(spin, 2) * (Fraction(spin, 2) + 1)


@pytest.mark.parametrize("degree", [0, 1, 4, "2", None])
def test_other_casimirs_are_refused(degree: object) -> None:
    with pytest.raises(ParameterError, match="degree"):
        SU(3).fundamental.casimir(degree)
