"""Every exact result against the maximal torus: two independent routes to each."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from sympy import Symbol
from sympy.abc import z

from algebra.strategies import class_functions_of, groups, irreps_of
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.determinants import determinant, inverse_determinant
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.powers import adams
from haarloom.algebra.young_diagrams import YoungDiagram
from haarloom.torus.characters import character
from haarloom.torus.quadrature import haar_grid

ANGLES = {n: np.random.default_rng(n).uniform(-3, 3, (7, n - 1)) for n in range(2, 9)}
SMALL = st.integers(2, 5).flatmap(lambda n: irreps_of(SU(n), 1))


def eigenvalues_in(irrep: Irrep, angles: np.ndarray) -> np.ndarray:
    """Eigenvalues of P in the irrep, shape (..., d), from its weights."""
    phases = np.concatenate([angles, -angles.sum(axis=-1, keepdims=True)], axis=-1)
    rows = []
    for weight, count in irrep.weights().items():
        content = np.append(np.cumsum(weight[::-1])[::-1], 0)
        rows += [np.exp(1j * phases @ content)] * count
    return np.stack(rows, axis=-1)


@given(st.data())
def test_products(data: st.DataObject) -> None:
    group = data.draw(groups())
    a, b = data.draw(irreps_of(group)), data.draw(irreps_of(group, 1))
    angles = ANGLES[group.n]
    product = character(a, angles) * character(b, angles)
    scale = a.dimension * b.dimension
    np.testing.assert_allclose((a * b).character().at(angles) / scale, product / scale, atol=1e-12)


@given(SMALL, st.integers(1, 4))
def test_adams_operations(irrep: Irrep, k: int) -> None:
    angles = ANGLES[irrep.group.n]
    found = ClassFunction(irrep.group, adams(irrep.labels, k)).at(angles)
    np.testing.assert_allclose(found, character(irrep, k * angles), atol=1e-9 * irrep.dimension**2)


@given(SMALL.filter(lambda irrep: irrep.dimension <= 20))
def test_determinants(irrep: Irrep) -> None:
    angles = ANGLES[irrep.group.n]
    expected = np.prod(1 + 0.4 * eigenvalues_in(irrep, angles), axis=-1)
    found = determinant(irrep, z).at(angles, z=0.4)
    np.testing.assert_allclose(found, expected, atol=1e-11 * 1.4**irrep.dimension)


@pytest.mark.parametrize(("n", "name"), [(2, "3"), (3, "3"), (3, "6"), (4, "4")])
def test_inverse_determinants_up_to_the_order_kept(n: int, name: str) -> None:
    """The remainder after order K is at most Σ_{k>K} |z|^k dim S^k."""
    irrep, order, fugacity = SU(n).irrep(name), 12, 0.1
    d = irrep.dimension
    expected = 1 / np.prod(1 - fugacity * eigenvalues_in(irrep, ANGLES[n]), axis=-1)
    found = inverse_determinant(irrep, z, order).at(ANGLES[n], z=fugacity)
    kept = sum(fugacity**k * YoungDiagram.of(*([k] if k else [])).dimension(d) for k in range(order + 1))
    remainder = (1 - fugacity) ** -d - float(kept)
    assert np.abs(found - expected).max() <= remainder * (1 + 1e-6) + 1e-12


@given(st.data())
@settings(max_examples=15)
def test_haar_integrals_and_inner_products(data: st.DataObject) -> None:
    group = data.draw(groups(largest=4))
    f, g = data.draw(class_functions_of(group)), data.draw(class_functions_of(group))
    angles, weights = haar_grid(group, {2: 30, 3: 24, 4: 18}[group.n])
    values = {"y": 0.3, "z": -0.7}
    by_name = {Symbol(name): value for name, value in values.items()}
    table_f, table_g = f.at(angles, **values), g.at(angles, **values)
    assert (weights * table_f).sum() == pytest.approx(complex(f.haar().subs(by_name)), abs=1e-10)
    expected = complex(f.inner(g, real=True).subs(by_name))
    assert (weights * table_f.conj() * table_g).sum() == pytest.approx(expected, abs=1e-9)


@given(st.data())
def test_conjugation(data: st.DataObject) -> None:
    f = data.draw(class_functions_of(data.draw(groups(largest=5))))
    angles, values = ANGLES[f.group.n], {"y": 0.3, "z": -0.7}
    found = f.conjugate(real=True).at(angles, **values)
    np.testing.assert_allclose(found, f.at(angles, **values).conj(), atol=1e-11)


@given(
    SMALL.filter(lambda irrep: irrep.dimension <= 15), st.sampled_from([(2,), (1, 1), (2, 1), (3,), (2, 2)])
)
def test_schur_powers(irrep: Irrep, rows: tuple[int, ...]) -> None:
    """s_λ of the eigenvalues in the irrep by SU-free power sums (Frobenius)."""
    x = eigenvalues_in(irrep, ANGLES[irrep.group.n])
    p = [None, *((x**k).sum(axis=-1) for k in range(1, 5))]
    frobenius = {
        (2,): (p[1] ** 2 + p[2]) / 2,
        (1, 1): (p[1] ** 2 - p[2]) / 2,
        (3,): (p[1] ** 3 + 3 * p[1] * p[2] + 2 * p[3]) / 6,
        (2, 1): (p[1] ** 3 - p[3]) / 3,
        (2, 2): (p[1] ** 4 + 3 * p[2] ** 2 - 4 * p[1] * p[3]) / 12,
    }
    found = irrep.schur_power(*rows).character().at(ANGLES[irrep.group.n])
    np.testing.assert_allclose(found, frobenius[rows], atol=1e-9 * irrep.dimension ** sum(rows))
