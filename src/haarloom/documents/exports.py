"""A spectrum on paper: the masses with their errors as plain text, CSV and LaTeX."""

from __future__ import annotations

import csv
import io
from typing import TYPE_CHECKING

from haarloom.documents.figures import bracketed, shown_with_error

if TYPE_CHECKING:
    from haarloom.numerics.spectrum import Spectrum

__all__ = ["csv_table", "latex_table", "text_table"]

_HEADINGS = ("level", "Re m", "Im m", "error", "verdict")
_COLUMNS = ("level", "re_mass", "im_mass", "mass_error", "verdict", "re_eigenvalue", "im_eigenvalue")


def text_table(spectrum: Spectrum) -> str:
    """The masses m_n = −ln(λ_n/λ_0), in units of the inverse spatial spacing, as aligned text.

    Every mass is shown with the digits that its error justifies, so that shown value ± shown error
    contains computed value ± computed error. The wave number Im m lies in (−π, π].
    """
    rows = [_HEADINGS, *map(_text_row, *_columns(spectrum))]
    widths = [max(len(row[i]) for row in rows) for i in range(len(_HEADINGS))]
    return "\n".join("  ".join(map(str.rjust, row, widths)).rstrip() for row in rows)


def csv_table(spectrum: Spectrum) -> str:
    """The same in full double precision, one line a level from 1 upwards, for other programs.

    Columns: level, real and imaginary part of the mass, the bound on |error| of the mass, the verdict,
    real and imaginary part of the eigenvalue.
    """
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(_COLUMNS)
    for level, mass, error, verdict in zip(*_columns(spectrum), strict=True):
        eigenvalue = complex(spectrum.eigenvalues[level])
        numbers = (mass.real, mass.imag, error)
        writer.writerow([level, *map(repr, numbers), verdict, repr(eigenvalue.real), repr(eigenvalue.imag)])
    return out.getvalue()


def latex_table(spectrum: Spectrum) -> str:
    r"""The same as a LaTeX ``tabular``; ``1.3333(2)`` stands for 1.3333 ± 0.0002."""
    lines = [
        r"\begin{tabular}{rlll}",
        r"\hline",
        r"$n$ & $\mathrm{Re}\,m_n$ & $\mathrm{Im}\,m_n$ & \\",
        r"\hline",
    ]
    for level, mass, error, verdict in zip(*_columns(spectrum), strict=True):
        cells = (bracketed(part, error) for part in (mass.real, mass.imag))
        lines.append(f"{level} & " + " & ".join(f"${cell}$" for cell in cells) + rf" & {verdict} \\")
    return "\n".join([*lines, r"\hline", r"\end{tabular}", ""])


def _columns(spectrum: Spectrum) -> tuple[list[int], list[complex], list[float], list[str]]:
    masses = [complex(mass) for mass in spectrum.masses]
    levels = list(range(1, len(masses) + 1))
    return levels, masses, [float(error) for error in spectrum.error], list(spectrum.verdicts)


def _text_row(level: int, mass: complex, error: float, verdict: str) -> tuple[str, ...]:
    real, margin = shown_with_error(mass.real, error)
    imaginary, margin_too = shown_with_error(mass.imag, error)
    return str(level), real, imaginary, max(margin, margin_too, key=_size), verdict


def _size(margin: str) -> float:
    return float("inf") if margin == "?" else float(margin)
