"""Effective matrices of degenerate levels, order by order, with exact coefficients.

With T = T_0 + Σ_j ε^j T_j, T_0 diagonal, the levels that start at one eigenvalue e are those of
H = P T (P + X), where X maps them to all others and solves Q T P + Q T Q X − X H = 0. Order by order,

    (e_q − e) X_n = X_i H_j (i + j = n, j ≥ 1) − Q T_n P − Σ_{j<n} Q T_j Q X_{n−j},

C. Bloch, *Nucl. Phys.* 6 (1958) 329; T. Kato, *Perturbation Theory for Linear Operators* (1966).
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

__all__ = ["effective_matrices"]

Sparse = Mapping[tuple[int, int], Any]


def effective_matrices(
    levels: Sequence[Any], perturbation: Sequence[Sparse], group: Sequence[int], order: int, zero: Any
) -> list[list[list[Any]]]:
    """H_1 … H_order of the levels ``group``, each a square matrix as nested lists.

    Parameters
    ----------
    levels
        Diagonal of T_0.
    perturbation
        T_1 … T_order as {(row, column): element}.
    group
        Positions of the degenerate levels.
    zero
        The zero of the field.
    """
    place = {row: number for number, row in enumerate(group)}
    start = levels[group[0]]
    rows = [_by_row(matrix) for matrix in perturbation]
    maps: list[dict[int, list[Any]]] = []
    found: list[list[list[Any]]] = []
    for n in range(1, order + 1):
        images = _applied(rows, maps, place, n, zero)
        found.append([images.get(row, [zero] * len(group)) for row in group])
        step: dict[int, list[Any]] = {q: [-x for x in image] for q, image in images.items() if q not in place}
        for i in range(1, n):
            for q, left in maps[i - 1].items():
                change = [
                    sum((left[p] * found[n - i - 1][p][column] for p in range(len(group))), zero)
                    for column in range(len(group))
                ]
                before = step.get(q, [zero] * len(group))
                step[q] = [a + b for a, b in zip(before, change, strict=True)]
        maps.append({q: [x / (levels[q] - start) for x in row] for q, row in step.items() if any(row)})
    return found


def _by_row(matrix: Sparse) -> dict[int, list[tuple[int, Any]]]:
    rows: dict[int, list[tuple[int, Any]]] = {}
    for (row, column), element in matrix.items():
        rows.setdefault(row, []).append((column, element))
    return rows


def _applied(
    rows: Sequence[dict[int, list[tuple[int, Any]]]],
    maps: Sequence[dict[int, list[Any]]],
    place: Mapping[int, int],
    n: int,
    zero: Any,
) -> dict[int, list[Any]]:
    """Σ_j T_j (P + X) at order n: every row that comes out, one number for each level of the group."""
    total: dict[int, list[Any]] = {}
    for j in range(1, n + 1):
        below = maps[n - j - 1] if j < n else {}
        for row, entries in rows[j - 1].items():
            for column, element in entries:
                if j == n and column in place:
                    target = total.setdefault(row, [zero] * len(place))
                    target[place[column]] = target[place[column]] + element
                elif column in below:
                    target = total.setdefault(row, [zero] * len(place))
                    for p, x in enumerate(below[column]):
                        target[p] = target[p] + element * x
    return total
