"""Notebook faces of results: the facts of the plain text as tables."""

from __future__ import annotations

from collections.abc import Iterable
from html import escape
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from haarloom.numerics.certify import Certificate
    from haarloom.numerics.spectrum import Spectrum

__all__ = ["certificate_html", "certificate_text", "spectrum_html", "table_html"]


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


def certificate_text(certificate: Certificate) -> str:
    """The theorem that a certificate holds, as text."""
    from haarloom.numerics.certify import values_text

    lines = [f"Proven for the untruncated T at {values_text(certificate.values)}:"]
    for number, level in enumerate(certificate.levels[1:], start=1):
        lines.append(
            f"  m_{number} = {_ball_text(level.mass, certificate.digits)}: {level.verdict} ({level.reason})"
        )
    lines.append(f"  {_completeness(certificate)}")
    return "\n".join(lines)


def certificate_html(certificate: Certificate) -> str:
    """The same as a table."""
    from haarloom.numerics.certify import values_text

    rows = [
        (str(number), _ball_text(level.mass, certificate.digits), level.verdict, level.reason)
        for number, level in enumerate(certificate.levels[1:], start=1)
    ]
    caption = f"Proven for the untruncated T at {values_text(certificate.values)}"
    return table_html(caption, ("n", "m", "verdict", "because"), rows, _completeness(certificate))


def _completeness(certificate: Certificate) -> str:
    count = len(certificate.levels)
    shown = (
        f"No eigenvalue exceeds the last of these {count} in modulus but those listed before it"
        if certificate.leading
        else f"That no other eigenvalue is larger than the last of these {count} is not shown"
    )
    basis = f"basis to cutoff {certificate.cutoff}, {certificate.bits} bits"
    return f"{shown} ({basis}, {certificate.digits} decimal places)."


def _ball_text(mass: Any, digits: int) -> str:
    if mass is None:
        return "not enclosed"
    real = mass.real.str(digits + 2)
    return real if mass.imag == 0 else f"{real} + {mass.imag.str(digits + 2)}i"
