"""Tables of coefficients, couplings of neighbouring loops, and products of link weights."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import sympy
from numpy.typing import NDArray

from haarloom.actions import (
    bilinear_coupling,
    heat_kernel,
    link_from_coefficients,
    loop_coupling,
    wilson,
)
from haarloom.algebra.group import SU
from haarloom.exceptions import GroupError, ParameterError, SizeError
from haarloom.torus.characters import characters
from haarloom.torus.quadrature import haar_grid

LAM, MU, T = sympy.symbols("lam mu t")


def _elements(n: int, kernel: object, irreps: tuple[object, ...], points: int) -> NDArray[np.complex128]:
    """⟨r|K|s⟩ by quadrature over two copies of the torus; kernel takes L and L′ on the grid."""
    G = SU(n)
    angles, weights = haar_grid(G, points)
    table = characters(irreps, angles) * weights[:, None]
    loop = characters([G.fundamental], angles)[:, 0]
    values = kernel(loop[:, None], loop[None, :])  # type: ignore[operator]
    return np.einsum("ir,ij,js->rs", table.conj(), values, table)


@pytest.mark.parametrize(("n", "points"), [(2, 64), (3, 28)])
@pytest.mark.parametrize("form", ["resummed", "exponential"])
def test_loop_couplings_against_quadrature_on_two_tori(n: int, points: int, form: str) -> None:
    G = SU(n)
    link = loop_coupling(G, "lam", form)  # type: ignore[arg-type]
    irreps = G.irreps(3 if n == 2 else 2)
    exponent = lambda a, b: 2 * 0.3 * (a * b.conj()).real  # noqa: E731
    closed = {"resummed": lambda a, b: 1 + exponent(a, b), "exponential": lambda a, b: np.exp(exponent(a, b))}
    expected = _elements(n, closed[form], irreps, points)
    kernel, error = link.kernel_at(irreps, {"lam": 0.3})
    assert np.all(np.abs(kernel - expected) <= error + 1e-12)
    exact = np.array(link.kernel(irreps).subs(LAM, 0.3).evalf(), dtype=float)
    assert np.abs(exact - kernel).max() < 1e-12


def test_exponential_coupling_contains_every_order_of_the_series() -> None:
    G = SU(3)
    kernel, _ = loop_coupling(G, "lam", "exponential").kernel_at(G.irreps(1), {"lam": [1e-3, 2e-3]})
    # ⟨1|K|1⟩ = 1 + λ²·⟨|L|²⟩² + …, ⟨3|K|3⟩ = λ + λ²/2 (from L*²) + …
    assert kernel[:, 0, 0] - 1 == pytest.approx([1e-6, 4e-6], rel=1e-2)
    assert kernel[:, 1, 1] - [1e-3, 2e-3] == pytest.approx([0.5e-6, 2e-6], rel=2e-2)
    assert kernel[0, 1, 2] == 0


def test_largest_outside_bounds_the_rest_of_the_exponential() -> None:
    G = SU(3)
    link = loop_coupling(G, "lam", "exponential")
    kernel, _ = link.kernel_at(G.irreps(7), {"lam": 0.2})
    inside = len(G.irreps(3))
    rest = kernel.copy()
    rest[:inside, :inside] = 0
    assert np.linalg.norm(rest, 2) <= link.largest_outside(3, {"lam": 0.2})


def test_bilinear_couplings_by_pair() -> None:
    G = SU(3)
    link = bilinear_coupling(G, {("1", "1"): 1, ("3", "3"): "lam", ("3", "6bar"): "mu"})
    assert not link.diagonal
    assert link == bilinear_coupling(G, "(1, 1): 1, (fundamental, 3): lam, (3, (0, 2)): mu")
    matrix = link.kernel(G.irreps(2))
    assert matrix[1, 1] == LAM
    assert matrix[1, 5] == MU
    assert matrix[5, 1] == 0
    kernel, _ = link.kernel_at(G.irreps(2), {"lam": [0.1, 0.2], "mu": 0.5j})
    assert kernel.shape == (2, 6, 6)
    assert kernel[1, 1, 5] == 0.5j
    assert link.largest_outside(1, {"lam": 0.1, "mu": 0.5}) == pytest.approx(0.5)
    assert link.largest_outside(2, {"lam": 0.1, "mu": 0.5}) == 0


@pytest.mark.parametrize("n", [2, 3])
def test_coupling_on_top_of_a_gauge_action_multiplies_kernels(n: int) -> None:
    G = SU(n)
    irreps = G.irreps(2)
    link = heat_kernel(G, "t") * loop_coupling(G, "lam")
    assert link == loop_coupling(G, "lam") * heat_kernel(G, "t")
    points = {2: 48, 3: 26}[n]
    angles, weights = haar_grid(G, points)
    many = G.irreps({2: 24, 3: 11}[n])
    table = characters(many, angles)
    k = np.exp(-1.0 * np.array([float(r.casimir(2)) for r in many]))
    loop = characters([G.fundamental], angles)[:, 0]
    values = np.einsum("ir,r,jr->ij", table, k, table.conj())
    values = values * (1 + 2 * 0.3 * np.outer(loop, loop.conj()).real)
    bras = characters(irreps, angles) * weights[:, None]
    expected = np.einsum("ir,ij,js->rs", bras.conj(), values, bras)
    kernel, error = link.kernel_at(irreps, {"t": 1.0, "lam": 0.3})
    assert np.abs(kernel - expected).max() < 1e-12
    assert error.max() < 1e-13
    exact = np.array(link.kernel(irreps).subs({T: 1, LAM: 0.3}).evalf(), dtype=float)
    assert np.abs(exact - kernel).max() < 1e-13


def test_stacked_strips_multiply_coefficients() -> None:
    G = SU(3)
    link = heat_kernel(G, "t") @ wilson(G, "beta", 2) @ heat_kernel(G, 1)
    assert len(link.links) == 3
    assert link.plaquettes == 4
    irreps = G.irreps(2)
    values = {"t": 0.4, "beta": 5.0}
    k, error = link.coefficients_at(irreps, values)
    expected = (
        heat_kernel(G, 1.4).coefficients_at(irreps, {})[0] * wilson(G, 5, 2).coefficients_at(irreps, {})[0]
    )
    assert np.all(np.abs(k - expected) <= error + 1e-15)
    assert float(link.coefficient(G.adjoint).subs(values).evalf()) == pytest.approx(k[4], rel=1e-12)
    outside = [r for r in G.irreps(4) if sum(r.labels) > 2]
    assert link.coefficients_at(outside, values)[0].max() <= link.largest_outside(2, values)


def test_tables_from_mapping_array_and_file(tmp_path: Path) -> None:
    G = SU(3)
    by_name = tmp_path / "names.csv"
    by_name.write_text("irrep,k\n1,1\n3,0.5\n3bar,1/2\n", encoding="utf-8")
    by_labels = tmp_path / "labels.csv"
    by_labels.write_text("a1,a2,k\n0,0,1\n1,0,0.5\n0,1,0.5\n\n", encoding="utf-8")
    table = link_from_coefficients(G, {"1": 1, "3": 0.5, (0, 1): "1/2"})
    assert table == link_from_coefficients(G, by_name)
    assert table == link_from_coefficients(G, str(by_labels))
    assert table == link_from_coefficients(G, [1, 0.5, 0.5])
    square = link_from_coefficients(G, np.array([[1.0, 0.5], [0.5, 0.25]]))
    assert square.coefficient(G.adjoint) == sympy.Rational(1, 4)
    assert "every other k_r is set to zero" in table.note
    assert table.coefficient(G.adjoint) == 0
    assert table.largest_outside(1, {}) == 0
    assert table.largest_outside(0, {}) == pytest.approx(0.5)


def test_su2_files_say_by_their_header_what_a_two_means(tmp_path: Path) -> None:
    G = SU(2)
    names, labels = tmp_path / "n.csv", tmp_path / "l.csv"
    names.write_text("irrep,k\n2,0.5\n", encoding="utf-8")
    labels.write_text("a1,k\n2,0.5\n", encoding="utf-8")
    assert link_from_coefficients(G, names).coefficient(G.fundamental) == sympy.Rational(1, 2)
    assert link_from_coefficients(G, labels).coefficient(G.adjoint) == sympy.Rational(1, 2)


def test_table_is_its_own_plaquette_function(rng: np.random.Generator) -> None:
    G = SU(3)
    table = link_from_coefficients(G, {"1": 1, "3": "k", "3bar": "k"})
    angles = rng.uniform(-3, 3, (5, 2))
    loop = characters([G.fundamental], angles)[:, 0]
    assert np.allclose(table.plaquette_at(angles, {"k": 0.2}), 1 + 3 * 0.2 * 2 * loop.real)


@pytest.mark.parametrize(
    "content",
    ["", "r,k\n3,1\n", "irrep,k\n3,1\n3,2\n", "irrep,k\n3\n", "a1,a2,k\n1,-1,2\n", "irrep,k\nnonsense,1\n"],
)
def test_bad_files_are_refused_with_their_place(tmp_path: Path, content: str) -> None:
    path = tmp_path / "bad.csv"
    path.write_text(content, encoding="utf-8")
    with pytest.raises(ValueError, match=r"bad\.csv|nonsense"):
        link_from_coefficients(SU(3), path)


@pytest.mark.parametrize(
    "make",
    [
        lambda: link_from_coefficients(SU(3), {}),
        lambda: link_from_coefficients(SU(3), {"3": 1, (1, 0): 2}),
        lambda: link_from_coefficients(SU(3), np.ones((2, 2, 2))),
        lambda: link_from_coefficients(SU(3), ["a", "b"]),
        lambda: link_from_coefficients(SU(3), 5),
        lambda: link_from_coefficients(SU(3), "/nowhere/at/all.csv"),
        lambda: bilinear_coupling(SU(3), {}),
        lambda: bilinear_coupling(SU(3), {"3": 1}),
        lambda: bilinear_coupling(SU(3), "(3, 3) lam"),
        lambda: bilinear_coupling(SU(3), "(3, 3): a, (3, 3): b"),
        lambda: loop_coupling(SU(3), "lam", "squared"),  # type: ignore[arg-type]
        lambda: loop_coupling(SU(3), 1j),
        lambda: heat_kernel(SU(3), 1) * wilson(SU(3), 1),
        lambda: heat_kernel(SU(3), 1) @ loop_coupling(SU(3), 1, "exponential"),
    ],
)
def test_bad_tables_and_products_are_refused(make: object) -> None:
    with pytest.raises(ParameterError):
        make()  # type: ignore[operator]


def test_foreign_groups_and_types_do_not_multiply() -> None:
    with pytest.raises(GroupError, match="same group"):
        heat_kernel(SU(3), 1) @ heat_kernel(SU(2), 1)
    with pytest.raises(TypeError):
        heat_kernel(SU(3), 1) * 2  # type: ignore[operator]
    with pytest.raises(TypeError):
        3 @ heat_kernel(SU(3), 1)  # type: ignore[operator]


def test_an_exponential_too_strong_for_its_orders_says_so() -> None:
    with pytest.raises(SizeError, match="lam = 9"):
        loop_coupling(SU(3), "lam", "exponential").kernel_at(SU(3).irreps(1), {"lam": 9.0})


@pytest.mark.parametrize("name", ["resummed", "exponential", "pairs"])
def test_written_kernels_are_the_sums_over_their_elements(name: str, rng: np.random.Generator) -> None:
    """K(P, P′) = Σ_rs k_rs χ_r(P) χ_s(P′)*, the closed form against the elements."""
    G = SU(3)
    table = {("1", "1"): 1, ("3", "6bar"): "lam", ("1", "8"): "2*lam*I"}
    link = bilinear_coupling(G, table) if name == "pairs" else loop_coupling(G, "lam", name)  # type: ignore[arg-type]
    first, second = rng.uniform(-np.pi, np.pi, (2, 4, 3))
    for phases in (first, second):
        phases[:, -1] = -phases[:, :-1].sum(axis=1)
    irreps = G.irreps(10 if name == "exponential" else 2)
    kernel, _ = link.kernel_at(irreps, {"lam": 0.05})
    expected = characters(irreps, first) @ kernel @ characters(irreps, second).conj().T
    found = link.kernel_density_at(first[:, None], second[None], {"lam": 0.05})
    assert np.allclose(found, expected, rtol=0, atol=1e-9)


def test_no_closed_kernel_is_claimed_for_a_gauge_action() -> None:
    assert wilson(SU(3), "beta").kernel_density_at(np.zeros((1, 3)), np.zeros((1, 3)), {"beta": 1.0}) is None
    assert wilson(SU(3), "beta").kernel_reach is None
    assert link_from_coefficients(SU(3), {"1": 1, "8": "k"}).kernel_reach == 2
