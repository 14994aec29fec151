"""Notebook faces of results: the facts of the plain text as tables."""

from __future__ import annotations

from collections.abc import Iterable
from html import escape
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from haarloom.numerics.spectrum import Spectrum

__all__ = ["spectrum_html", "table_html"]


def table_html(caption: str, head: Iterable[str], rows: Iterable[Iterable[str]], foot: str) -> str:
    """A small table with a caption and a line below, every text escaped."""
    header = "".join(f"<th>{escape(title)}</th>" for title in head)
    body = "".join("<tr>" + "".join(f"<td>{escape(cell)}</td>" for cell in row) + "</tr>" for row in rows)
    return (
        f"<table><caption>{escape(caption)}</caption><thead><tr>{header}</tr></thead>"
        f"<tbody>{body}</tbody></table><p>{escape(foot)}</p>"
    )


def spectrum_html(spectrum: Spectrum) -> str:
    """Masses with errors and verdicts."""
    rows = [
        (str(level), f"{mass.real:.12g}", f"{mass.imag:.12g}", f"{error:.1e}", verdict)
        for level, (mass, error, verdict) in enumerate(
            zip(spectrum.masses, spectrum.error, spectrum.verdicts, strict=True), start=1
        )
    ]
    point = ", ".join(f"{name} = {value:.6g}" for name, value in spectrum.values.items())
    caption = f"Masses at {point} ({spectrum.solver}, cutoff {spectrum.cutoff})"
    return table_html(caption, ("n", "Re m", "Im m", "error", "verdict"), rows, spectrum.status)
