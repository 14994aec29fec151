"""A derivation on the screen: its steps as mathematics, each with the outcome of its replay."""

from __future__ import annotations

from html import escape
from typing import TYPE_CHECKING

import ipywidgets

from haarloom.exceptions import HaarloomError

if TYPE_CHECKING:
    from haarloom.ring.derivation import Derivation, Step
    from haarloom.ring.replay import ReplayedStep, Verification

__all__ = ["DerivationView", "step_html"]


class DerivationView(ipywidgets.HTMLMath):
    """All steps of one derivation in one typeset block."""

    def __init__(self) -> None:
        super().__init__()
        self.add_class("hl-formula")
        self.add_class("hl-derivation")

    def show(self, derivation: Derivation) -> Verification | None:
        """Replay the derivation and show it; a model without a replay says why."""
        try:
            verification = derivation.verify()
        except HaarloomError as problem:
            self.value = derivation_html(derivation, None, str(problem))
            return None
        self.value = derivation_html(derivation, verification)
        return verification


def derivation_html(derivation: Derivation, verification: Verification | None, excuse: str = "") -> str:
    """The steps as an ordered list; statements between dollar signs for MathJax."""
    outcomes = verification.steps if verification else (None,) * len(derivation.steps)
    items = "".join(
        step_html(step, outcome) for step, outcome in zip(derivation.steps, outcomes, strict=True)
    )
    note = f'<p class="hl-verified">{escape(excuse)}</p>' if excuse else ""
    return f'<ol class="hl-steps">{items}</ol>{note}'


def step_html(step: Step, outcome: ReplayedStep | None) -> str:
    """Title, mark and statements of one step."""
    lines = "".join(
        f'<div class="hl-statement">$\\displaystyle {escape(line)}$</div>' for line in step.latex()
    )
    return (
        f'<li><div class="hl-step-title"><b>{escape(step.title)}</b> {mark_html(outcome)}</div>{lines}</li>'
    )


def mark_html(outcome: ReplayedStep | None) -> str:
    """✓ or ✗ with the residual, or the reason why a statement could not be replayed."""
    if outcome is None:
        return ""
    if not outcome.passed:
        return _mark("bad", "✗", f"replay on the torus differs by {outcome.residual:.1e}")
    if outcome.not_replayed:
        return _mark("open", "–", "not replayed: " + "; ".join(outcome.not_replayed))
    return _mark("good", "✓", f"replayed on the torus, residual {outcome.residual:.1e}")


def _mark(state: str, sign: str, words: str) -> str:
    return f'<span class="hl-verified hl-{state}"><b class="hl-mark">{sign}</b> {escape(words)}</span>'
