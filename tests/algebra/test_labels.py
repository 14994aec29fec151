"""Dynkin labels and Young diagrams."""

from __future__ import annotations

from math import comb
from typing import Any

import numpy as np
import pytest
import sympy
from hypothesis import given
from hypothesis import strategies as st

from haarloom.algebra.labels import (
    count_up_to,
    labels_from_rows,
    labels_up_to,
    rows_from_labels,
    transposed,
    validated_cutoff,
    validated_labels,
    validated_rows,
)
from haarloom.exceptions import LabelError, ParameterError, SizeError


@given(st.lists(st.integers(0, 9), min_size=1, max_size=7).map(tuple))
def test_rows_and_labels_invert_each_other(labels: tuple[int, ...]) -> None:
    assert labels_from_rows(rows_from_labels(labels)) == labels


@given(st.lists(st.integers(0, 6), max_size=5).map(lambda rows: tuple(sorted(rows, reverse=True))))
def test_transposing_twice_gives_the_diagram_back(rows: tuple[int, ...]) -> None:
    assert transposed(transposed(rows)) == tuple(row for row in rows if row)


def test_basis_order_is_by_sum_then_descending_lexicographic() -> None:
    assert labels_up_to(2, 2) == ((0, 0), (1, 0), (0, 1), (2, 0), (1, 1), (0, 2))


@pytest.mark.parametrize(
    ("rank", "cutoff", "count"), [(2, 6, 28), (2, 8, 45), (1, 5, 6), (3, 4, 35), (7, 0, 1)]
)
def test_count_up_to_a_cutoff(rank: int, cutoff: int, count: int) -> None:
    assert count_up_to(rank, cutoff) == len(labels_up_to(rank, cutoff)) == count


@pytest.mark.parametrize("label", [np.int64(2), sympy.Integer(2), 2])
def test_every_kind_of_integer_is_a_label(label: Any) -> None:
    assert validated_labels(2, (label, 0)) == (2, 0)
    assert type(validated_labels(2, (label, 0))[0]) is int


@pytest.mark.parametrize("label", [-1, True, 1.0, "1", None, 0.5, sympy.Rational(1, 2), np.float64(1)])
def test_anything_else_is_refused(label: Any) -> None:
    with pytest.raises(LabelError, match="a_2"):
        validated_labels(2, (1, label))


@pytest.mark.parametrize("labels", [(), (1,), (1, 0, 0)])
def test_wrong_length_names_the_right_one(labels: tuple[int, ...]) -> None:
    with pytest.raises(LabelError, match=r"SU\(3\) takes 2"):
        validated_labels(2, labels)


def test_rows_may_not_grow_downwards() -> None:
    assert validated_rows((3, 1, 0, 0)) == (3, 1)
    with pytest.raises(LabelError, match="never grow"):
        validated_rows((1, 2))


@pytest.mark.parametrize("cutoff", [-1, True, 1.5, "3", None])
def test_cutoff_must_be_a_natural_number(cutoff: Any) -> None:
    with pytest.raises(ParameterError, match="cutoff"):
        validated_cutoff(cutoff)


def test_too_many_irreps_are_counted_before_they_are_built() -> None:
    with pytest.raises(SizeError, match=f"{comb(207, 7):,}"):
        labels_up_to(8 - 1, 200)
