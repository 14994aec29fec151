"""Young diagrams with N left open."""

from __future__ import annotations

import pytest
import sympy
from hypothesis import given
from hypothesis import strategies as st

from haarloom.algebra.group import SU
from haarloom.algebra.young_diagrams import YoungDiagram
from haarloom.exceptions import LabelError

N = sympy.Symbol("N")
SHAPES = st.lists(st.integers(1, 3), max_size=3).map(lambda rows: tuple(sorted(rows, reverse=True)))


@given(SHAPES, st.lists(st.integers(1, 2), max_size=2).map(lambda rows: tuple(sorted(rows, reverse=True))))
def test_functions_of_n_take_the_values_of_every_group(
    rows: tuple[int, ...], mirrored: tuple[int, ...]
) -> None:
    diagram = YoungDiagram.of(*rows, mirrored=mirrored)
    smallest = max(2, len(rows) + len(mirrored))
    for n in (smallest, smallest + 1, 8):
        irrep = diagram.irrep(SU(n))
        assert diagram.dimension().subs(N, n) == diagram.dimension(n) == irrep.dimension
        assert diagram.casimir().subs(N, n) == diagram.casimir(n) == irrep.casimir(2)
        assert diagram.index(n) == irrep.index
        assert diagram.boxes % n == irrep.nality


def test_functions_known_by_heart() -> None:
    assert YoungDiagram.of(1).casimir() == (N - 1) * (N + 1) / (2 * N)
    assert YoungDiagram.of(2).dimension() == N * (N + 1) / 2
    assert YoungDiagram.of(1, 1).dimension() == N * (N - 1) / 2
    adjoint = YoungDiagram.of(1, mirrored=(1,))
    assert sympy.expand(adjoint.dimension()) == N**2 - 1
    assert adjoint.casimir() == adjoint.index() == N
    assert YoungDiagram.of().dimension() == 1
    assert YoungDiagram.of().casimir() == 0


def test_dimension_vanishes_where_the_diagram_does_not_fit() -> None:
    assert YoungDiagram.of(1, 1, 1).dimension(2) == 0


def test_hooks() -> None:
    assert YoungDiagram.of(4, 2, 1).hooks() == ((6, 4, 2, 1), (3, 1), (1,))


@given(SHAPES, st.integers(2, 8))
def test_conjugates(rows: tuple[int, ...], n: int) -> None:
    diagram = YoungDiagram.of(*rows)
    if len(rows) <= n:
        assert diagram.conjugate.irrep(SU(n)) == diagram.irrep(SU(n)).conjugate


def test_other_letters_and_bad_diagrams() -> None:
    m = sympy.Symbol("M")
    assert YoungDiagram.of(2).dimension(m) == m * (m + 1) / 2
    assert sympy.expand(YoungDiagram.of(1, mirrored=(1,)).dimension(m)) == m**2 - 1
    with pytest.raises(LabelError, match="3 rows"):
        YoungDiagram.of(1, 1, mirrored=(1,)).irrep(SU(2))
    for rows in ((1, 2), (-1,), (1.0,), (True,)):
        with pytest.raises(LabelError):
            YoungDiagram.of(*rows)
