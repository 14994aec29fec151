"""Powers of irreps: tensor, symmetric, antisymmetric and general Schur-functor powers, and Adams operations.

All rest on power sums: p_k[χ](P) = χ(P^k) stretches every weight by k. Newton's identities then give the
complete and elementary symmetric functions h_n, e_n of the eigenvalues of P in the irrep, and Jacobi and
Trudi's determinant every other Schur function (I. G. Macdonald, *Symmetric Functions and Hall Polynomials*,
§§ I.2, I.3).
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from types import MappingProxyType
from typing import Any

from haarloom.algebra.bounded_cache import cached_terms
from haarloom.algebra.decomposition import Decomposition, product_of
from haarloom.algebra.invariants import dimension
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import Labels, Rows, validated_rows
from haarloom.algebra.products import act_on, multiply_sums
from haarloom.algebra.weights import characters_in_contents, weight_system
from haarloom.algebra.whole_numbers import whole_number
from haarloom.exceptions import SizeError

__all__ = [
    "adams",
    "antisymmetric",
    "antisymmetric_power",
    "schur_power",
    "symmetric",
    "symmetric_power",
    "tensor_power",
    "validated_power",
]

_HIGHEST = 512


def tensor_power(irrep: Irrep, n: int) -> Decomposition:
    """The n-fold tensor product of an irrep with itself."""
    return product_of(irrep.group, (irrep,) * validated_power(n))


def symmetric_power(irrep: Irrep, n: int) -> Decomposition:
    """S^n of an irrep: of dimension (d + n − 1 over n)."""
    return Decomposition(irrep.group, symmetric(irrep.labels, 1, validated_power(n)))


def antisymmetric_power(irrep: Irrep, n: int) -> Decomposition:
    """Λ^n of an irrep: of dimension (d over n), empty when n > d."""
    return Decomposition(irrep.group, antisymmetric(irrep.labels, 1, validated_power(n)))


def schur_power(irrep: Irrep, rows: Sequence[int]) -> Decomposition:
    """The Schur functor of a Young diagram applied to an irrep: det h_{λ_i − i + j}[χ].

    >>> from haarloom.algebra.group import SU
    >>> print(schur_power(SU(3).adjoint, (2, 1)))
    3·8 + 10 + 10bar + 2·27 + 35 + 35bar
    """
    shape = validated_rows(rows)
    return Decomposition(irrep.group, _jacobi_trudi(irrep.labels, shape, 0, tuple(range(len(shape)))))


def adams(labels: Labels, k: int) -> dict[Labels, int]:
    """The class function χ(P^k) in characters; coefficients may be negative.

    >>> adams((1, 0), 2) == {(2, 0): 1, (0, 1): -1}
    True
    """
    return characters_in_contents(stretched(labels, k))


def symmetric(labels: Labels, copies: int, n: int) -> Mapping[Labels, int]:
    """Coefficient of z^n in det_R(1 − zP)^{−copies}, in characters: h_n[copies·χ]."""
    return _degree(labels, copies, n, alternating=False)


def antisymmetric(labels: Labels, copies: int, n: int) -> Mapping[Labels, int]:
    """Coefficient of z^n in det_R(1 + zP)^{copies}, in characters: e_n[copies·χ].

    det_R(P) = 1 makes it the conjugate of the coefficient of z^{copies·d − n}, so only half of them take
    work.
    """
    highest = copies * dimension(labels)
    if n > highest:
        return {}
    if 2 * n > highest:
        mirrored = _degree(labels, copies, highest - n, alternating=True)
        return {found[::-1]: count for found, count in mirrored.items()}
    return _degree(labels, copies, n, alternating=True)


def _degree(labels: Labels, copies: int, n: int, *, alternating: bool) -> Mapping[Labels, int]:
    if n > _HIGHEST:
        raise SizeError(f"power {n} given; powers beyond {_HIGHEST} are not attempted: use a smaller one.")
    for lower in range(1, n):  # from below, so that each recursion finds its ladder in the cache
        _newton(labels, copies, lower, alternating)
    return _newton(labels, copies, n, alternating)


@cached_terms(limit=200_000)
def _newton(labels: Labels, copies: int, n: int, alternating: bool) -> Mapping[Labels, int]:
    """Newton's identities, every power sum counted ``copies`` times: n·e_n = Σ_k ±copies·p_k e_{n−k}."""
    if n == 0:
        return MappingProxyType({(0,) * len(labels): 1})
    total: dict[Labels, int] = {}
    for k in range(1, n + 1):
        sign = -copies if alternating and k % 2 == 0 else copies
        for found, count in act_on(stretched(labels, k), _newton(labels, copies, n - k, alternating)).items():
            total[found] = total.get(found, 0) + sign * count
    return MappingProxyType({found: count // n for found, count in total.items() if count})


def stretched(labels: Labels, k: int) -> dict[Rows, int]:
    """Contents of p_k[χ]: every weight of the irrep stretched by k."""
    return {tuple([k * c for c in content]): count for content, count in weight_system(labels).items()}


def _jacobi_trudi(labels: Labels, shape: Rows, row: int, columns: tuple[int, ...]) -> dict[Labels, int]:
    """det h_{λ_i − i + j} from ``row`` down over the columns left, expanded along its first row."""
    if row == len(shape):
        return {(0,) * len(labels): 1}
    total: dict[Labels, int] = {}
    for place, column in enumerate(columns):
        degree = shape[row] - row + column
        if degree < 0:
            continue
        minor = _jacobi_trudi(labels, shape, row + 1, columns[:place] + columns[place + 1 :])
        for found, count in multiply_sums(symmetric(labels, 1, degree), minor).items():
            total[found] = total.get(found, 0) + (-count if place % 2 else count)
    return {found: count for found, count in total.items() if count}


def validated_power(n: Any) -> int:
    """Check a power: an integer ≥ 0."""
    return whole_number("power", n, 0, "a class function has no finite inverse")
