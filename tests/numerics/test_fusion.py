"""Label arrays and fusion patterns against the exact algebra, and the two ways to apply W."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import haarloom as hl
from haarloom.algebra.products import multiply
from haarloom.numerics.fusion import count_weights, fusion_pattern
from haarloom.numerics.labels import conjugation, label_array, positions
from haarloom.numerics.site_action import FusionAction, torus_action
from haarloom.numerics.site_components import site_components


@pytest.mark.parametrize(("n", "cutoff"), [(2, 9), (3, 6), (4, 4), (5, 3), (8, 2)])
def test_label_array_is_the_basis(n: int, cutoff: int) -> None:
    group = hl.SU(n)
    labels = label_array(group.rank, cutoff)
    assert [tuple(row) for row in labels.tolist()] == [r.labels for r in group.irreps(cutoff)]
    assert positions(labels, cutoff).tolist() == list(range(len(labels)))
    assert (labels[conjugation(group.rank, cutoff)] == labels[:, ::-1]).all()


def test_positions_mark_what_is_left_out() -> None:
    assert positions(np.array([[0, 0], [3, 0], [-1, 1]]), 2).tolist() == [0, -1, -1]


@pytest.mark.parametrize(
    ("n", "cutoff", "outer", "support"), [(2, 4, 6, 5), (3, 3, 5, 4), (4, 2, 3, 2), (5, 1, 3, 2)]
)
def test_pattern_holds_the_tensor_products(n: int, cutoff: int, outer: int, support: int) -> None:
    group = hl.SU(n)
    factors = group.irreps(support)
    pattern = fusion_pattern(factors, group.rank, cutoff, outer)
    place = {r.labels: row for row, r in enumerate(group.irreps(outer))}
    for factor, counts in zip(factors, pattern.components.toarray(), strict=True):
        expected = {
            (place[labels], column): count
            for column, ket in enumerate(group.irreps(cutoff))
            for labels, count in multiply(factor.labels, ket.labels).items()
            if labels in place
        }
        found = {
            (row, column): count
            for row, column, count in zip(
                pattern.rows.tolist(), pattern.columns.tolist(), counts, strict=True
            )
            if count
        }
        assert found == expected


def test_weights_of_ember_are_counted() -> None:
    group = hl.SU(3)
    # 1, 3 and 3bar have 1 + 3 + 3 distinct weights
    assert count_weights((group.trivial, group.fundamental, group.antifundamental)) == 7


@given(
    n=st.sampled_from([2, 3, 4]),
    z=st.floats(0.05, 1.5),
    zb=st.floats(0.0, 0.8),
    seed=st.integers(0, 1000),
)
def test_transforms_agree_with_fusion(n: int, z: float, zb: float, seed: int) -> None:
    """W by Fourier transforms of its closed form on the torus, against multiplicities."""
    group, cutoff = hl.SU(n), 4
    site = hl.static_fermions(group, "z", "zb")
    reach = int(site.reach({}))
    values = {"z": z, "zb": zb}
    components = site_components(site, cutoff, cutoff + reach)
    weights, _ = components.coefficients(values)
    pattern = components.pattern
    elements = components.elements(weights)
    fusion = FusionAction(pattern.size, pattern.outer_size, pattern.rows, pattern.columns, elements)
    torus = torus_action(site, values, cutoff, cutoff + reach, True, reach)
    kets = np.random.default_rng(seed).normal(size=(pattern.size, 3)) + 0.5j
    scale = float(site.norm_bound(values))
    np.testing.assert_allclose(torus.apply(kets), fusion.apply(kets), atol=1e-12 * scale)


def test_conjugation_transposes_every_class_function() -> None:
    """J W J = Wᵀ, on which left eigenvectors rest."""
    group = hl.SU(3)
    site = hl.static_fermions(group, "z", "zb", copies=2)
    components = site_components(site, 5, 5)
    weights, _ = components.coefficients({"z": 0.4, "zb": 0.1})
    pattern = components.pattern
    matrix = np.zeros((pattern.size, pattern.size))
    matrix[pattern.rows, pattern.columns] = components.elements(weights)
    mirror = conjugation(2, 5)
    np.testing.assert_allclose(matrix[mirror][:, mirror], matrix.T, atol=1e-14)
