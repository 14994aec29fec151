"""Referees of the numerics: transfer matrices put together by routes that share nothing with the package.

Irreps are partitions, products with antisymmetric powers follow Pieri's rule (I. G. Macdonald, *Symmetric
Functions and Hall Polynomials*, I.5), coefficients are mpmath numbers, eigenvalues mpmath's.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations
from typing import Any

import mpmath
import numpy as np
from mpmath import mp

Labels = tuple[int, ...]


def label_list(n: int, cutoff: int) -> list[Labels]:
    """Dynkin labels with Σ a_i ≤ cutoff, by Σ a_i, then falling."""

    def fixed(total: int, count: int) -> list[Labels]:
        if count == 1:
            return [(total,)]
        return [(first, *rest) for first in range(total, -1, -1) for rest in fixed(total - first, count - 1)]

    return [labels for total in range(cutoff + 1) for labels in fixed(total, n - 1)]


def rows_of(labels: Labels) -> tuple[int, ...]:
    """Rows of the Young diagram, N of them."""
    return (*(sum(labels[i:]) for i in range(len(labels))), 0)


def labels_of(rows: Sequence[int]) -> Labels:
    return tuple(rows[i] - rows[i + 1] for i in range(len(rows) - 1))


def casimir(labels: Labels) -> mpmath.mpf:
    """C₂ with T_F = 1/2, from the rows of the diagram (DESIGN of the conventions; handbook formula)."""
    rows, n = rows_of(labels), len(labels) + 1
    boxes = sum(rows)
    contents = sum(row * (row - 2 * i + 1) for i, row in enumerate(rows, start=1))
    return (boxes * (n - mp.mpf(boxes) / n) + contents) / 2


def vertical_strips(labels: Labels, boxes: int) -> list[Labels]:
    """Irreps in Λ^k F × r, each once: add k boxes, no two in one row (Pieri)."""
    rows = rows_of(labels)
    found = []
    for chosen in combinations(range(len(rows)), boxes):
        grown = [row + (i in chosen) for i, row in enumerate(rows)]
        if all(grown[i] >= grown[i + 1] for i in range(len(grown) - 1)):
            found.append(labels_of(grown))
    return found


def heat(n: int, cutoff: int, t: Any) -> list[mpmath.mpf]:
    return [mp.exp(-mp.mpf(t) * casimir(labels)) for labels in label_list(n, cutoff)]


def wilson(n: int, cutoff: int, beta: Any, plaquettes: int = 1) -> list[mpmath.mpf]:
    """(w_r/w_0)^{N_t}, d_r w_r = Σ_m det I_{λ_j − j + i + m}(β/N) (DLMF 10.35; handbook formula)."""
    x = mp.mpf(beta) / n
    reach = 24  # the determinants fall like x^{N|m|}/(m!)^N
    bessel = [mp.besseli(order, x) for order in range(reach + 2 * cutoff + 2 * n)]

    def weight(labels: Labels) -> mpmath.mpf:
        rows = rows_of(labels)
        total = mp.mpf(0)
        for m in range(-reach, reach + 1):
            entries = [[bessel[abs(rows[j] - j + i + m)] for j in range(n)] for i in range(n)]
            total += mp.det(mp.matrix(entries))
        return total / dimension(labels)

    first = weight((0,) * (n - 1))
    return [(weight(labels) / first) ** plaquettes for labels in label_list(n, cutoff)]


def dimension(labels: Labels) -> int:
    """Weyl's dimension formula."""
    rows, top, bottom = rows_of(labels), 1, 1
    for i, j in combinations(range(len(rows)), 2):
        top *= rows[i] - rows[j] + j - i
        bottom *= j - i
    return top // bottom


def fermions(n: int, cutoff: int, z: Any, zbar: Any = 0, copies: int = 1) -> mpmath.matrix:
    """⟨r|W|s⟩ of det(1 + zP)^n det(1 + z̄P†)^n: one factor after another on a wider basis, then cut."""
    margin = copies * (2 if zbar else 1)
    wide = label_list(n, cutoff + margin)
    place = {labels: i for i, labels in enumerate(wide)}
    up = [mp.zeros(len(wide)) for _ in range(n + 1)]
    for column, labels in enumerate(wide):
        for boxes in range(n + 1):
            for target in vertical_strips(labels, boxes):
                if target in place:
                    up[boxes][place[target], column] += 1
    particle, antiparticle = mp.zeros(len(wide)), mp.zeros(len(wide))
    for boxes in range(n + 1):
        particle += mp.mpmathify(z) ** boxes * up[boxes]
        antiparticle += mp.mpmathify(zbar) ** boxes * up[boxes].T
    site = mp.eye(len(wide))
    for _ in range(copies):
        site = particle * site
        if zbar:
            site = antiparticle * site
    size = len(label_list(n, cutoff))
    return site[:size, :size]


def transfer(link: Sequence[Any], site: mpmath.matrix) -> mpmath.matrix:
    """K^{1/2} W K^{1/2} on the irreps that both hold."""
    size = len(link)
    roots = [mp.sqrt(number) for number in link]
    return mp.matrix(
        [[roots[i] * site[i, j] * roots[j] for j in range(size)] for i in range(size)]
    )


def levels(matrix: mpmath.matrix, count: int) -> list[mpmath.mpc]:
    """Eigenvalues of largest modulus, by mpmath's QR."""
    found, _ = mp.eig(matrix)
    return sorted(map(mp.mpc, found), key=lambda value: (-abs(value), -value.real, value.imag))[:count]


def masses(values: Sequence[Any]) -> list[mpmath.mpc]:
    """−ln(λ_n/λ_0)."""
    return [-mp.log(value / values[0]) for value in values[1:]]


def distance(one: Sequence[Any], other: Sequence[Any]) -> float:
    """Largest distance of two multisets of numbers under the best matching."""
    from scipy.optimize import linear_sum_assignment

    cost = np.array([[float(abs(mp.mpmathify(complex(a)) - b)) for b in other] for a in one])
    rows, columns = linear_sum_assignment(cost)
    return float(cost[rows, columns].max())
