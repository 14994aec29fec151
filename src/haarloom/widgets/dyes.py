"""Colours of the panes: eight dyes and two ramps.

Every dye is a mid-tone whose contrast against white and against near-black is at least 3 : 1, the
ratio that WCAG 2.2 (success criterion 1.4.11) asks of graphics, so that one set serves both themes.
"""

from __future__ import annotations

__all__ = ["CLOTH", "DYES", "GRID", "RAMP", "dye", "selvedge"]

DYES = (
    "#8a7660",  # walnut
    "#5872b4",  # indigo
    "#bf5a3a",  # madder
    "#3f8a63",  # woad
    "#a37a14",  # weld
    "#9a62a8",  # orchil
    "#c2587f",  # cochineal
    "#6a7b88",  # slate
)

GRID = "#8888884d"
"""Grid lines: a translucent grey recedes on either ground."""

CLOTH = ("#f3efe6", "#a9b6d6", "#5872b4", "#2a3460")
"""Zero upwards: undyed cloth to deep indigo, lightness falling throughout."""

RAMP = ("#1d2440", "#5872b4", "#d9d2c3", "#bf5a3a", "#4a1a12")
"""Negative to positive through undyed cloth, for signed quantities; zero belongs in the middle."""


def dye(number: int) -> str:
    """The dye of a level, an N-ality or a station; they repeat after eight."""
    return DYES[number % len(DYES)]


def selvedge(first: int, second: int) -> str:
    """CSS background of a woven edge in two dyes."""
    return (
        f"repeating-linear-gradient(0deg, {dye(first)} 0 5px, transparent 5px 7px, "
        f"{dye(second)} 7px 10px, transparent 10px 12px)"
    )
