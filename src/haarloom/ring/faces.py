"""LaTeX and HTML views of models, matrices and derivations. Views only: the data live elsewhere."""

from __future__ import annotations

from functools import singledispatch
from html import escape
from typing import TYPE_CHECKING

import sympy

from haarloom.ring.claims import (
    ElementClaim,
    ExpansionClaim,
    KernelClaim,
    LinkFactorClaim,
    OverlapClaim,
    ProductClaim,
    RowClaim,
    SelectionClaim,
    SiteElementClaim,
)

if TYPE_CHECKING:
    from collections.abc import Iterable

    from haarloom.algebra.irrep import Irrep
    from haarloom.ring.derivation import Derivation
    from haarloom.ring.model import RingModel
    from haarloom.ring.transfer import TransferMatrix

__all__ = ["claim_latex", "derivation_html", "derivation_latex", "matrix_latex", "model_latex"]

MOST_ROWS = 10
"""A larger matrix is shown by its leading block: nobody reads more, and MathJax gets slow."""

MOST_TERMS = 12
"""Longest sum printed in full."""


def _chi(irrep: Irrep) -> str:
    return rf"\chi_{{{irrep.latex()}}}"


def _bracket(bra: Irrep, operator: str, ket: Irrep) -> str:
    return rf"\langle {bra.latex()}|{operator}|{ket.latex()}\rangle"


def _sum(terms: Iterable[str], empty: str = "0") -> str:
    listed = list(terms)
    shown = listed[:MOST_TERMS]
    if len(listed) > MOST_TERMS:
        shown.append(rf"\cdots\;({len(listed) - MOST_TERMS}\text{{ more}})")
    return " + ".join(shown).replace("+ -", "- ") or empty


def _weighted(coefficient: sympy.Expr | int, body: str) -> str:
    if coefficient == 1:
        return body or "1"
    text = sympy.latex(coefficient)
    if not body:
        return text
    return rf"\left({text}\right) {body}" if sympy.sympify(coefficient).is_Add else f"{text}\\,{body}"


@singledispatch
def claim_latex(claim: object) -> str:
    """The statement of a claim as LaTeX, without delimiters."""
    raise TypeError(f"no LaTeX face for {type(claim).__name__}")


@claim_latex.register
def _(claim: ExpansionClaim) -> str:
    listed = _sum(_weighted(w, "" if c.dimension == 1 else _chi(c)) for c, w in claim.terms)
    return (
        f"W = {listed}" if claim.complete else rf"W = {listed} + \text{{components that cannot contribute}}"
    )


@claim_latex.register
def _(claim: SelectionClaim) -> str:
    element = _bracket(claim.bra, "W", claim.ket)
    if not claim.components:
        charge = (claim.bra.nality - claim.ket.nality) % claim.bra.group.n
        return (
            rf"{element} = 0:\ \text{{no component of }}W\text{{ lies in }}"
            rf"{claim.bra.latex()}\otimes {claim.ket.conjugate.latex()}\text{{ (N-ality }}{charge}\text{{)}}"
        )
    names = ",\\ ".join(c.latex() for c in claim.components[:MOST_TERMS])
    more = r",\ \ldots" if len(claim.components) > MOST_TERMS else ""
    return rf"\text{{into }}{element}\text{{ enter of }}W\text{{: }}{names}{more}"


@claim_latex.register
def _(claim: ProductClaim) -> str:
    right = _sum(_weighted(n, _chi(irrep)) for irrep, n in claim.terms)
    return f"{_chi(claim.factor)}\\,{_chi(claim.ket)} = {right}"


@claim_latex.register
def _(claim: OverlapClaim) -> str:
    return rf"\int\!dP\;{_chi(claim.bra)}^{{*}}\,{_chi(claim.factor)}\,{_chi(claim.ket)} = {claim.value}"


@claim_latex.register
def _(claim: SiteElementClaim) -> str:
    return rf"{_bracket(claim.bra, 'W', claim.ket)} = {sympy.latex(claim.value)}"


@claim_latex.register
def _(claim: LinkFactorClaim) -> str:
    name = f"k_{{{claim.irrep.latex()}}}"
    return rf"{name} = {sympy.latex(claim.value)},\qquad \sqrt{{{name}}} = {sympy.latex(claim.root)}"


@claim_latex.register
def _(claim: ElementClaim) -> str:
    roots = rf"\sqrt{{k_{{{claim.bra.latex()}}}}}", rf"\sqrt{{k_{{{claim.ket.latex()}}}}}"
    middle = _bracket(claim.bra, "W", claim.ket)
    dressed = rf"{roots[0]}\,{middle}\,{roots[1]}"
    return rf"{_bracket(claim.bra, 'T', claim.ket)} = {dressed} = {sympy.latex(claim.value)}"


@claim_latex.register
def _(claim: KernelClaim) -> str:
    return rf"{_kernel_name(claim.bra, claim.middle)} = {sympy.latex(claim.value)}"


@claim_latex.register
def _(claim: RowClaim) -> str:
    terms = _sum(_kernel_name(claim.bra, q) + r"\," + _bracket(q, "W", claim.ket) for q in claim.through)
    return rf"{_bracket(claim.bra, 'KW', claim.ket)} = {terms} = {sympy.latex(claim.value)}"


def _kernel_name(row: Irrep, column: Irrep) -> str:
    return f"k_{{{row.latex()},{column.latex()}}}"


def derivation_latex(derivation: Derivation) -> str:
    """One ``aligned`` block: a line of text for each step, then its statements."""
    lines = []
    for number, step in enumerate(derivation.steps, start=1):
        lines.append(rf"&\textbf{{{number}. {step.title}}}")
        lines.extend(rf"&\quad {statement}" for statement in step.latex())
    body = r"\\[4pt] ".join(lines)
    return rf"\begin{{aligned}} {body} \end{{aligned}}"


def derivation_html(derivation: Derivation) -> str:
    """An ordered list of the steps; the statements are typeset by the host's MathJax."""
    items = []
    for step in derivation.steps:
        statements = "".join(f"<div>$\\displaystyle {escape(line)}$</div>" for line in step.latex())
        items.append(f"<li><b>{escape(step.title)}</b>{statements}</li>")
    return f'<ol class="haarloom-derivation">{"".join(items)}</ol>'


def matrix_latex(transfer: TransferMatrix) -> str:
    """The matrix, or its leading block with dots when it is large."""
    size = min(len(transfer.basis), MOST_ROWS)
    cut = size < len(transfer.basis)
    rows = [
        " & ".join([sympy.latex(transfer.matrix[i, j]) for j in range(size)] + [r"\cdots"] * cut)
        for i in range(size)
    ]
    if cut:
        rows.append(" & ".join([r"\vdots"] * size + [r"\ddots"]))
    body = r" \\ ".join(rows)
    name = "T" if transfer.model.link.diagonal else "KW"
    return rf"$\displaystyle {name} = \begin{{pmatrix}} {body} \end{{pmatrix}}$"


def model_latex(model: RingModel) -> str:
    """T, the link weight and the site weight in one display."""
    element = r"\sqrt{k_r}\,\langle r|W|s\rangle\,\sqrt{k_s}"
    transfer = f"T_{{rs}} = {element}" if model.link.diagonal else r"T = K^{1/2}\,W K^{1/2} \sim K W"
    return (
        rf"$\displaystyle \begin{{aligned}} &{transfer},"
        rf"\qquad \mathrm{{SU}}({model.group.n})\\ "
        rf"&{model.link.latex()}\\ &{model.site.latex()} \end{{aligned}}$"
    )
