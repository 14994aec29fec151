"""Determinants det_R(1 + zP) and their inverses as class functions, for one or many copies.

Copies of fundamental fermions, with equal or different fugacities, go through the dual Cauchy identity
∏_f det(1 + z_f P) = Σ_λ s_λ(P) s_{λ′}(z), so that many flavours stay cheap
(I. G. Macdonald, *Symmetric Functions and Hall Polynomials*, eq. I.4.3′). Copies of bosons go through
Newton's identities with the power sums counted that many times.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from typing import Any

from sympy import Expr, Integer, Pow

from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.coefficients import as_coefficient, normal_form, total
from haarloom.algebra.group import SU
from haarloom.algebra.invariants import dimension
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import Labels, Rows, labels_from_rows, transposed
from haarloom.algebra.loops import sum_of_monomials
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
    count, fugacity = validated_power(copies), as_coefficient(z)
    group = irrep.group
    if irrep == group.fundamental:
        return flavour_determinant(group, [fugacity] * count)
    if irrep == group.antifundamental:
        return _mirrored(flavour_determinant(group, [fugacity] * count))
    degrees = (antisymmetric(irrep.labels, 1, k) for k in range(irrep.dimension + 1))
    return _graded(group, fugacity, degrees) ** count


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
    values = [normal_form(as_coefficient(z)) for z in fugacities]
    distinct = tuple(dict.fromkeys(values))
    gathered: dict[Labels, dict[tuple[int, ...], Expr]] = {}
    for rows in _diagrams_in_box(group.n, len(values)):
        # diagrams of one SU(N) irrep differ in size, so their monomials never meet
        gathered.setdefault(labels_from_rows(rows), {}).update(_schur(transposed(rows), values, distinct))
    terms = {labels: sum_of_monomials(distinct, monomials) for labels, monomials in gathered.items()}
    if not all(value.is_Symbol for value in distinct):
        terms = {labels: normal_form(value) for labels, value in terms.items()}
    return ClassFunction.from_terms(group, terms)


def _graded(group: SU, fugacity: Expr, degrees: Iterable[Mapping[Labels, int]]) -> ClassFunction:
    gathered: dict[Labels, list[Expr]] = {}
    for degree, terms in enumerate(degrees):
        power = normal_form(Pow(fugacity, degree))
        for labels, count in terms.items():
            gathered.setdefault(labels, []).append(normal_form(Integer(count) * power))
    return ClassFunction.from_terms(group, {labels: total(parts) for labels, parts in gathered.items()})


def _mirrored(function: ClassFunction) -> ClassFunction:
    """The function of P†: labels reversed, coefficients kept."""
    terms = {labels[::-1]: value for labels, value in function.by_labels().items()}
    return ClassFunction.from_terms(function.group, terms)


def _diagrams_in_box(rows: int, columns: int) -> Iterator[Rows]:
    """All diagrams with at most ``rows`` rows and ``columns`` columns, padded with empty rows."""
    if rows == 0:
        yield ()
        return
    for first in range(columns + 1):
        for rest in _diagrams_in_box(rows - 1, first):
            yield (first, *rest)


def _schur(rows: Rows, values: Sequence[Expr], distinct: tuple[Expr, ...]) -> dict[tuple[int, ...], Expr]:
    """s_rows(values) by exponents of the distinct values; for one value a dimension times a power."""
    if len(distinct) <= 1:
        padded = (*rows, *(0,) * (len(values) - len(rows)))
        return {(sum(rows),) * len(distinct): Integer(dimension(labels_from_rows(padded)))}
    found: dict[tuple[int, ...], int] = {}
    place = [distinct.index(value) for value in values]
    for content, count in contents((*rows, *(0,) * (len(values) - len(rows)))).items():
        exponents = [0] * len(distinct)
        for position, power in zip(place, content, strict=True):
            exponents[position] += power
        found[tuple(exponents)] = found.get(tuple(exponents), 0) + count
    return {exponents: Integer(count) for exponents, count in found.items()}
