"""Tables of masses: honest digits on paper, full precision for other programs."""

from __future__ import annotations

import csv
import io
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from haarloom.documents.exports import csv_table, latex_table, text_table


@pytest.fixture
def spectrum() -> Any:
    """Two masses of a pair, one real mass, and one of which nothing is known."""
    ratios = np.array([1, 0.25 * np.exp(0.1j), 0.25 * np.exp(-0.1j), 0.05, 0.01])
    masses = -np.log(ratios[1:])
    return SimpleNamespace(
        eigenvalues=3 * ratios,
        masses=masses,
        error=np.array([2e-9, 2e-9, 4e-4, np.inf]),
        verdicts=("complex pair", "complex pair", "real", "undecided"),
    )


def test_text(spectrum: Any) -> None:
    heading, *rows = text_table(spectrum).splitlines()
    assert heading.split() == ["level", "Re", "m", "Im", "m", "error", "verdict"]
    assert rows[0].split() == ["1", "1.386294361", "-0.100000000", "0.000000003", "complex", "pair"]
    assert rows[1].split()[2] == "0.100000000"
    assert rows[2].split() == ["3", "2.9957", "0.0000", "0.0005", "real"]
    assert rows[3].split() == ["4", "?", "?", "?", "undecided"]
    assert len({len(row) for row in rows}) == 1


def test_csv_gives_the_doubles_back(spectrum: Any) -> None:
    rows = list(csv.DictReader(io.StringIO(csv_table(spectrum))))
    masses = [complex(float(row["re_mass"]), float(row["im_mass"])) for row in rows]
    assert masses == list(spectrum.masses)
    assert [float(row["mass_error"]) for row in rows] == list(spectrum.error)
    eigenvalues = [complex(float(row["re_eigenvalue"]), float(row["im_eigenvalue"])) for row in rows]
    assert eigenvalues == list(spectrum.eigenvalues[1:])


def test_latex(spectrum: Any) -> None:
    table = latex_table(spectrum)
    assert r"1 & $1.386294361(3)$ & $-0.100000000(3)$ & complex pair \\" in table
    assert r"4 & $?$ & $?$ & undecided \\" in table
    assert table.count(r"\begin") == table.count(r"\end") == 1
    assert {line.count("&") for line in table.splitlines() if "&" in line} == {3}
