"""Fermion determinants and boson series against matrices of the irreps at random group elements.

The matrices are built from U by symmetric and antisymmetric powers and by U ⊗ U* (W. Fulton, J. Harris,
*Representation Theory*, §6), and det and inverse are NumPy's; the code multiplies out characters instead.
"""

from __future__ import annotations

from itertools import combinations, combinations_with_replacement, permutations

import numpy as np
import pytest
import sympy
from numpy.typing import NDArray
from scipy.stats import unitary_group

from haarloom.actions import static_bosons, static_fermions
from haarloom.algebra.group import SU
from haarloom.torus.characters import characters

Matrix = NDArray[np.complex128]


def _random_element(n: int, seed: int) -> Matrix:
    u = unitary_group.rvs(n, random_state=seed)
    return np.asarray(u / np.linalg.det(u) ** (1 / n))


def _symmetric(u: Matrix, power: int) -> Matrix:
    """Sym^k in the basis of monomials, an invertible change of basis away from a unitary matrix."""
    n = len(u)
    basis = list(combinations_with_replacement(range(n), power))
    matrix = np.zeros((len(basis), len(basis)), dtype=complex)
    for column, source in enumerate(basis):
        for row, target in enumerate(basis):
            arrangements = set(permutations(target))
            matrix[row, column] = sum(
                np.prod([u[a, b] for a, b in zip(p, source, strict=True)]) for p in arrangements
            )
    return matrix


def _antisymmetric(u: Matrix, power: int) -> Matrix:
    basis = list(combinations(range(len(u)), power))
    return np.array([[np.linalg.det(u[np.ix_(r, c)]) for c in basis] for r in basis])


def _adjoint(u: Matrix) -> Matrix:
    """U ⊗ U* without its invariant vector Σ e_i ⊗ e_i."""
    n = len(u)
    whole = np.kron(u, u.conj())
    invariant = np.eye(n).reshape(-1) / np.sqrt(n)
    rest = np.linalg.svd(np.eye(n * n) - np.outer(invariant, invariant))[0][:, : n * n - 1]
    return rest.conj().T @ whole @ rest


MATRICES = {
    ("3", 3): lambda u: u,
    ("6", 3): lambda u: _symmetric(u, 2),
    ("8", 3): _adjoint,
    ("10", 3): lambda u: _symmetric(u, 3),
    ("4", 4): lambda u: u,
    ("6", 4): lambda u: _antisymmetric(u, 2),
}


@pytest.mark.parametrize(("name", "n"), MATRICES)
@pytest.mark.parametrize("z", [0.37, -0.8, 0.5 + 0.4j])
def test_fermion_determinant_equals_that_of_the_matrix(name: str, n: int, z: complex) -> None:
    G = SU(n)
    irrep = G.irrep(name)
    fermions = static_fermions(G, "z", "y", irrep=irrep)
    function = fermions.class_function()
    for seed in range(3):
        u = _random_element(n, seed)
        matrix = MATRICES[name, n](u)
        assert np.trace(matrix) == pytest.approx(complex(irrep.character().at(_phases(u))), abs=1e-10)
        one = np.eye(len(matrix))
        expected = np.linalg.det(one + z * matrix) * np.linalg.det(one + 0.3 * np.linalg.inv(matrix))
        by_characters = complex(function.at(_phases(u), z=z, y=0.3))
        closed = complex(fermions.density_at(_phases(u), {"z": z, "y": 0.3}))
        assert by_characters == pytest.approx(expected, rel=1e-9, abs=1e-9)
        assert closed == pytest.approx(expected, rel=1e-9, abs=1e-9)


@pytest.mark.parametrize(("name", "n"), [("3", 3), ("8", 3), ("4", 4)])
def test_boson_series_sums_to_the_inverse_determinant(name: str, n: int) -> None:
    G, z = SU(n), 0.05 if name == "8" else 0.12
    bosons = static_bosons(G, "z", irrep=name)
    irreps = G.irreps(14 if name != "8" else 12) if n == 3 else G.irreps(9)
    w, error = bosons.coefficients_at(irreps, {"z": z})
    for seed in range(2):
        u = _random_element(n, 10 + seed)
        matrix = MATRICES[name, n](u)
        expected = 1 / np.linalg.det(np.eye(len(matrix)) - z * matrix)
        partial = complex(characters(irreps, _phases(u)) @ w)
        cutoff = max(sum(r.labels) for r in irreps)
        dimensions = np.array([float(r.dimension) for r in irreps])
        allowed = float(bosons.tail_bound(cutoff, {"z": z})) + float(error @ dimensions)
        assert abs(partial - expected) <= allowed + 1e-12
        assert allowed < 1e-3
        assert complex(bosons.density_at(_phases(u), {"z": z})) == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize("copies", [1, 2, 5])
def test_symmetric_powers_give_the_boson_series_order_by_order(copies: int) -> None:
    """(Σ z^k χ_{S^k})^n up to order 6, exactly."""
    G = SU(3)
    z = sympy.Symbol("z")
    one = sum(
        (G.fundamental.symmetric_power(k).character() * z**k for k in range(1, 7)), G.trivial.character()
    )
    series = G.trivial.character()
    for _ in range(copies):
        series = series * one
    for irrep in G.irreps(3):
        found = sympy.series(static_bosons(G, "z", copies=copies).coefficient(irrep), z, 0, 7).removeO()
        assert sympy.expand(found - sum(series[irrep].coeff(z, k) * z**k for k in range(7))) == 0


def _phases(u: Matrix) -> NDArray[np.float64]:
    phases = np.angle(np.linalg.eigvals(u))
    phases[0] -= phases.sum() - 2 * np.pi * np.round(phases.sum() / (2 * np.pi))
    return np.asarray(phases)
