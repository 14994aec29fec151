"""Determinants det_R(1 + zP) and their inverses as class functions, for one or many copies.

Copies of one fugacity go through Newton's identities with the power sums counted that many times. Copies with
different fugacities of fundamental fermions go through the dual Cauchy identity,
∏_f det(1 + z_f P) = Σ_λ s_λ(P) s_{λ′}(z), so that many flavours stay cheap
(I. G. Macdonald, *Symmetric Functions and Hall Polynomials*, eq. I.4.3′).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from sympy import Add, Expr, Integer, Mul, Pow, expand

from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.coefficients import as_coefficient, total
from haarloom.algebra.group import SU
from haarloom.algebra.invariants import dimension
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import Labels, Rows, labels_from_rows, transposed
from haarloom.algebra.powers import antisymmetric, symmetric, validated_power
from haarloom.algebra.weights import contents

__all__ = ["determinant", "flavour_determinant", "inverse_determinant"]


def determinant(irrep: Irrep, z: Any, copies: int = 1) -> ClassFunction:
    """det_R(1 + zP)^copies = (Σ_k z^k χ_{Λ^k R})^copies.

    Parameters
    ----------
    irrep : Irrep
        R, of dimension d.
    z : number, SymPy expression or symbol name
    copies : int ≥ 0

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> determinant(SU(3).fundamental, "z").in_loops()
    L*z + L^**z**2 + z**3 + 1
    """
    count = validated_power(copies)
    fugacity = as_coefficient(z)
    degrees = (antisymmetric(irrep.labels, count, k) for k in range(count * irrep.dimension + 1))
    return _graded(irrep.group, fugacity, degrees)


def inverse_determinant(irrep: Irrep, z: Any, order: int, copies: int = 1) -> ClassFunction:
    """det_R(1 − zP)^{−copies} = (Σ_k z^k χ_{S^k R})^copies, up to and including z^order.

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> inverse_determinant(SU(2).fundamental, "z", 2).coefficients[SU(2).irrep(2)]
    z**2
    """
    count = validated_power(copies)
    degrees = (symmetric(irrep.labels, count, k) for k in range(validated_power(order) + 1))
    return _graded(irrep.group, as_coefficient(z), degrees)


def flavour_determinant(group: SU, fugacities: Sequence[Any]) -> ClassFunction:
    """∏_f det(1 + z_f P) over fundamental flavours with any fugacities, by the dual Cauchy identity.

    Equal fugacities may repeat. Coefficients are Schur polynomials in the fugacities.

    Examples
    --------
    >>> flavour_determinant(SU(2), ["y", "z"]).haar()
    y**2*z**2 + y**2 + y*z + z**2 + 1
    """
    values = [as_coefficient(z) for z in fugacities]
    gathered: dict[Labels, list[Expr]] = {}
    for rows in _diagrams_in_box(group.n, len(values)):
        gathered.setdefault(labels_from_rows(rows), []).append(_schur_polynomial(transposed(rows), values))
    terms = {labels: total(parts) for labels, parts in gathered.items()}
    return ClassFunction(group, terms)


def _graded(group: SU, fugacity: Expr, degrees: Any) -> ClassFunction:
    gathered: dict[Labels, list[Expr]] = {}
    for degree, terms in enumerate(degrees):
        power = expand(Pow(fugacity, degree))
        for labels, count in terms.items():
            gathered.setdefault(labels, []).append(Integer(count) * power)
    return ClassFunction(group, {labels: total(parts) for labels, parts in gathered.items()})


def _diagrams_in_box(rows: int, columns: int) -> Iterator[Rows]:
    """All diagrams with at most ``rows`` rows and ``columns`` columns, padded with empty rows."""
    if rows == 0:
        yield ()
        return
    for first in range(columns + 1):
        for rest in _diagrams_in_box(rows - 1, first):
            yield (first, *rest)


def _schur_polynomial(rows: Rows, values: Sequence[Expr]) -> Expr:
    """s_rows(values) as a sum over semistandard tableaux (contents); for equal values a dimension times a power."""
    padded = (*rows, *(0,) * (len(values) - len(rows)))
    if len(set(values)) == 1:
        size = dimension(labels_from_rows(padded)) if len(values) > 1 else 1
        return Integer(size) * Pow(values[0], sum(rows))
    if not values:
        return Integer(1)
    return Add(
        *(
            Integer(count) * Mul(*(Pow(value, power) for value, power in zip(values, content, strict=True)))
            for content, count in contents(padded).items()
        )
    )
