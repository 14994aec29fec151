"""A site weight in characters and in loops, as mathematics."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from html import escape
from typing import TYPE_CHECKING

import sympy

from haarloom.widgets.names import short_error

if TYPE_CHECKING:
    from haarloom.actions.protocols import SiteWeight
    from haarloom.algebra.irrep import Irrep

__all__ = ["characters_html", "loops_html"]

MOST_TERMS = 12
"""Terms written out: more than that nobody reads, and the typesetting gets slow."""

MOST_WRITTEN = 100
"""Characters in all up to which coefficients are exact: those of larger sums are polynomials of pages."""

LONGEST = 1500
"""Characters of LaTeX up to which a polynomial in loops is shown."""

SHOWN_CUTOFF = {2: 5, 3: 2}
"""Σ a_i up to which numbers are listed for an infinite sum, 1 for the larger groups."""


def characters_html(site: SiteWeight, values: Mapping[str, float]) -> str:
    """W in characters: exact where it is a finite sum, else its first coefficients as numbers."""
    if not site.finite:
        return _leading_numbers(site, values, "without end")
    support = site.support()
    if len(support) > MOST_WRITTEN:
        return _leading_numbers(site, values, f"{len(support):,} characters")
    return _exact_sum(support, site)


def loops_html(site: SiteWeight) -> str:
    """W as a polynomial in the fundamental loops, or "" where there is none of readable length."""
    if not site.finite or len(site.support()) > MOST_TERMS:
        return ""
    text = sympy.latex(site.class_function().in_loops())
    return f"<div>$W = {escape(text)}$</div>" if len(text) <= LONGEST else ""


def _exact_sum(support: Sequence[Irrep], site: SiteWeight) -> str:
    terms = [
        _term(site.coefficient(c), "" if c.dimension == 1 else rf"\chi_{{{c.latex()}}}")
        for c in support[:MOST_TERMS]
    ]
    shown = " + ".join(terms)
    if len(support) > MOST_TERMS:
        shown += rf" + \cdots\;({len(support) - MOST_TERMS}\text{{ more}})"
    return f"<div>$W = {escape(shown)}$</div>"


def _term(coefficient: sympy.Expr, character: str) -> str:
    text = sympy.latex(coefficient)
    if not character:
        return text
    if coefficient == 1:
        return character
    return rf"\left({text}\right){character}" if coefficient.is_Add else rf"{text}\,{character}"


def _leading_numbers(site: SiteWeight, values: Mapping[str, float], extent: str) -> str:
    irreps = site.group.irreps(SHOWN_CUTOFF.get(site.group.n, 1))
    numbers, errors = site.coefficients_at(irreps, values)
    cells = "".join(
        f"<tr><td>{irrep.html()}</td><td>{_number(number)}</td><td>{short_error(error)}</td></tr>"
        for irrep, number, error in zip(irreps, numbers, errors, strict=True)
    )
    head = "<tr><th>c</th><th>w<sub>c</sub></th><th>error ≤</th></tr>"
    title = rf"<div>$W = \sum_c w_c\,\chi_c$, {extent}; at the present values</div>"
    return f'{title}<table class="hl-table">{head}{cells}</table>'


def _number(number: complex) -> str:
    value = complex(number)
    return f"{value.real:.8g}" if value.imag == 0 else f"{value.real:.6g} {value.imag:+.6g} i"
