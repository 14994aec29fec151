"""Referees of the numerics: transfer matrices put together by routes that share nothing with the package.

Irreps are partitions, products with antisymmetric powers follow Pieri's rule (I. G. Macdonald, *Symmetric
Functions and Hall Polynomials*, I.5), coefficients are mpmath numbers, eigenvalues refined
by inverse iteration in mpmath until their residual vanishes.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import combinations
from typing import Any

import mpmath
import numpy as np
from mpmath import mp

Labels = tuple[int, ...]
Elements = dict[tuple[int, int], Any]


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


def fermions(n: int, cutoff: int, z: Any, zbar: Any = 0, copies: int = 1) -> Elements:
    """⟨r|W|s⟩ of det(1 + zP)^n det(1 + z̄P†)^n: one factor after another on a wider basis, then cut."""
    wide = label_list(n, cutoff + copies * (2 if zbar else 1))
    place = {labels: i for i, labels in enumerate(wide)}
    particle: Elements = {}
    antiparticle: Elements = {}
    for column, labels in enumerate(wide):
        for boxes in range(n + 1):
            for target in vertical_strips(labels, boxes):
                if target in place:
                    row = place[target]
                    particle[row, column] = particle.get((row, column), 0) + mp.mpmathify(z) ** boxes
                    antiparticle[column, row] = (
                        antiparticle.get((column, row), 0) + mp.mpmathify(zbar) ** boxes
                    )
    site: Elements = {(i, i): mp.mpf(1) for i in range(len(wide))}
    for _ in range(copies):
        site = _product(particle, site)
        if zbar:
            site = _product(antiparticle, site)
    size = len(label_list(n, cutoff))
    return {(i, j): element for (i, j), element in site.items() if i < size and j < size}


def _product(one: Elements, other: Elements) -> Elements:
    rows: dict[int, list[tuple[int, Any]]] = {}
    for (i, j), element in other.items():
        rows.setdefault(i, []).append((j, element))
    found: Elements = {}
    for (i, k), element in one.items():
        for j, second in rows.get(k, ()):
            found[i, j] = found.get((i, j), 0) + element * second
    return found


def transfer(link: Sequence[Any], site: Elements) -> mpmath.matrix:
    """K^{1/2} W K^{1/2} on the irreps that both hold."""
    roots = [mp.sqrt(number) for number in link]
    matrix = mp.zeros(len(link))
    for (i, j), element in site.items():
        matrix[i, j] = roots[i] * element * roots[j]
    return matrix


def levels(matrix: mpmath.matrix, count: int) -> list[mpmath.mpc]:
    """Eigenvalues of largest modulus at mpmath's precision: inverse iteration from NumPy's starting values.

    Each step multiplies the error by about 1e-12 over the gap; a level is kept once its residual says so.
    """
    size = matrix.rows
    numbers = np.array([[complex(matrix[i, j]) for j in range(size)] for i in range(size)])
    starts, vectors = np.linalg.eig(numbers)
    order = np.argsort(-np.abs(starts), kind="stable")[:count]
    return [_refined(matrix, complex(starts[i]), vectors[:, i]) for i in order]


def _refined(matrix: mpmath.matrix, start: complex, vector: np.ndarray) -> mpmath.mpc:
    shift = mp.mpmathify(start) * (1 + mp.mpf(10) ** -13)
    factors, pivots = mp.LU_decomp(matrix - shift * mp.eye(matrix.rows))
    x = mp.matrix([mp.mpmathify(complex(number)) for number in vector])
    for _ in range(12):
        y = mp.U_solve(factors, mp.L_solve(factors, x, pivots))
        top = max(range(len(y)), key=lambda i: abs(y[i]))
        value, x = shift + x[top] / y[top], y / y[top]
        if mp.norm(matrix * x - value * x) < mp.mpf(10) ** (5 - mp.dps) * mp.norm(x):
            return mp.mpc(value)
    raise AssertionError(f"the referee did not converge at {start}")


def masses(values: Sequence[Any]) -> list[mpmath.mpc]:
    """−ln(λ_n/λ_0)."""
    return [-mp.log(value / values[0]) for value in values[1:]]


def distance(one: Sequence[Any], other: Sequence[Any]) -> float:
    """Largest distance of two multisets of numbers under the best matching."""
    from scipy.optimize import linear_sum_assignment

    cost = np.array([[float(abs(mp.mpmathify(complex(a)) - b)) for b in other] for a in one])
    rows, columns = linear_sum_assignment(cost)
    return float(cost[rows, columns].max())


def multiplicative(n: int, cutoff: int, phi: Callable[[int], Any], shifts: int) -> Elements:
    """⟨r|W|s⟩ of W = ∏_j φ(x_j), φ(x) = Σ_l φ_l x^l, on SU(n).

    Σ_m det φ_{r_i − i − s_j + j + m}: the Cauchy–Binet form of Weyl's integral, the sum over m from
    x_1 ⋯ x_n = 1 (Jacobi–Trudi for skew diagrams, Macdonald I.5; handbook formula). ``shifts``: largest |m|.
    """
    basis = [rows_of(labels) for labels in label_list(n, cutoff)]
    reach = shifts + 2 * (cutoff + n)
    table = {order: phi(order) for order in range(-reach, reach + 1)}
    found: Elements = {}
    for i, r in enumerate(basis):
        for j, s in enumerate(basis):
            orders = [[r[a] - a - s[b] + b for b in range(n)] for a in range(n)]
            # |φ| falls on both sides: shifts around the middle of the diagonal
            middle = -(sum(r) - sum(s)) // n
            found[i, j] = sum(
                (determinant([[table[k + m] for k in row] for row in orders]))
                for m in range(middle - shifts // 2, middle + shifts // 2 + 1)
            )
    return found


def determinant(rows: list[list[Any]]) -> Any:
    """By expansion along the first row."""
    if len(rows) == 1:
        return rows[0][0]
    return sum(
        (-1) ** k * rows[0][k] * determinant([row[:k] + row[k + 1 :] for row in rows[1:]])
        for k in range(len(rows))
    )


def coefficients_by_quadrature(
    labels: Sequence[Labels], density: Callable[..., Any], points: int
) -> list[Any]:
    """w_c = ∫dP χ_c* W of SU(3), trapezoidal rule over two eigenphases with Weyl's measure, in mpmath.

    Exponentially convergent for analytic W (L. N. Trefethen, J. A. C. Weideman, *SIAM Rev.* 56 (2014) 385);
    characters from the quotient of determinants times the denominator, so that nothing is divided.
    """
    steps = [mp.expjpi(2 * mp.mpf(k) / points) for k in range(points)]
    totals = [mp.mpf(0)] * len(labels)
    for x in steps:
        for y in steps:
            eigenvalues = (x, y, 1 / (x * y))
            vandermonde = determinant([[e**p for p in (2, 1, 0)] for e in eigenvalues])
            weight = density(eigenvalues) * vandermonde
            for place, one in enumerate(labels):
                rows = rows_of(one)
                alternant = determinant([[e ** (rows[p] + 2 - p) for p in range(3)] for e in eigenvalues])
                totals[place] += mp.conj(alternant) * weight
    return [total / (6 * points**2) for total in totals]
