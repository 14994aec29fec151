"""The story of a product."""

from __future__ import annotations

import pytest
from hypothesis import given

from algebra.strategies import pairs
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.product_steps import TableauStep, WeightStep
from haarloom.exceptions import ParameterError, SizeError


@pytest.mark.parametrize("form", ["weights", "tableaux"])
@given(pair=pairs(largest=6))
def test_the_steps_add_up_to_the_product(form: str, pair: tuple[Irrep, Irrep]) -> None:
    product = pair[0] * pair[1]
    (story,) = product.steps(form)
    assert story.result == product.by_labels()


def test_weights_of_the_triplet_on_a_triplet() -> None:
    group = SU(3)
    (story,) = (group.irrep("3") * group.irrep("3")).steps()
    assert [(step.landing, step.result, step.sign) for step in story.steps] == [
        ((2, 0), (2, 0), 1),
        ((0, 1), (0, 1), 1),
        ((1, -1), None, 0),
    ]
    assert "on a wall" in story.text()
    assert "1 drop out on walls" in story.summary()


def test_reflected_weights_cancel() -> None:
    group = SU(2)
    (story,) = (group.irrep(1) * group.irrep(4)).steps()
    assert story.cancelled() == {}
    (story,) = (SU(3).irrep(2, 2) * SU(3).irrep(2, 2)).steps()
    signs = [step.sign for step in story.steps if isinstance(step, WeightStep)]
    assert -1 in signs
    assert sum(story.cancelled().values()) == sum(
        step.multiplicity for step in story.steps if isinstance(step, WeightStep) and step.sign < 0
    )


def test_fillings_of_the_octet_squared() -> None:
    group = SU(3)
    (story,) = (group.adjoint * group.adjoint).steps("tableaux")
    assert all(isinstance(step, TableauStep) for step in story.steps)
    assert len(story.steps) == 6
    assert "..11 | .2 → 27 (2, 2)" in story.text()


def test_several_factors_are_told_pair_by_pair() -> None:
    group = SU(3)
    told = (group.irrep("3") * group.irrep("3bar") * group.irrep("8")).steps()
    assert [(story.left.name, story.right.name) for story in told] == [("3", "3bar"), ("1", "8"), ("8", "8")]


def test_a_large_story_is_summarised() -> None:
    (story,) = (SU(3).irrep(12, 7) * SU(3).irrep(9, 11)).steps()
    lines = story.text(shown=5).splitlines()
    assert len(lines) == 8
    assert "more steps" in lines[-2]
    assert "1092 weights" in lines[-1]
    assert story._repr_html_().count("<tr>") == 41


def test_html_is_escaped_and_has_the_summary() -> None:
    (story,) = (SU(3).fundamental * SU(3).antifundamental).steps()
    html = story._repr_html_()
    assert html.count("<tr>") == 3
    assert story.summary() in html


def test_what_cannot_be_told() -> None:
    with pytest.raises(ParameterError, match="form"):
        (SU(3).adjoint * SU(3).adjoint).steps("pictures")
    with pytest.raises(ParameterError, match="not known"):
        SU(3).adjoint.symmetric_power(2).steps()
    with pytest.raises(SizeError, match="fillings"):
        (SU(3).irrep(100, 100) * SU(3).irrep(100, 100)).steps("tableaux")
