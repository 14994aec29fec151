"""Colours: contrast in both themes, and one list for Python and CSS."""

from __future__ import annotations

import re

import pytest

from haarloom.widgets.dyes import CLOTH, DYES, dye
from haarloom.widgets.head import FRONT


def luminance(colour: str) -> float:
    """Relative luminance of ``#rrggbb`` (WCAG 2.2, definition of relative luminance)."""
    parts = [int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)]
    red, green, blue = (c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in parts)
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def contrast(one: str, other: str) -> float:
    """Contrast ratio of two colours (WCAG 2.2, definition of contrast ratio)."""
    darker, lighter = sorted((luminance(one), luminance(other)))
    return (lighter + 0.05) / (darker + 0.05)


def test_contrast_of_black_and_white_is_21() -> None:
    assert contrast("#000000", "#ffffff") == pytest.approx(21)


@pytest.mark.parametrize("ground", ["#ffffff", "#212121", "#111111"], ids=["light", "dark pane", "dark page"])
@pytest.mark.parametrize("colour", DYES)
def test_dyes_meet_three_to_one_on_every_ground(colour: str, ground: str) -> None:
    assert contrast(colour, ground) >= 3


def test_style_sheet_has_the_same_dyes() -> None:
    sheet = (FRONT / "pane.css").read_text("utf-8")
    assert tuple(re.findall(r"--hl-dye-\d: (#\w+);", sheet)) == DYES


def test_style_sheets_use_only_variables_that_exist() -> None:
    sheets = "".join(path.read_text("utf-8") for path in sorted(FRONT.glob("*.css")))
    used = set(re.findall(r"var\((--hl-[\w-]+)", sheets))
    assert used <= set(re.findall(r"(--hl-[\w-]+):", sheets))


def test_dyes_repeat() -> None:
    assert dye(len(DYES)) == DYES[0]


def test_cloth_ramp_falls_in_lightness() -> None:
    lightness = [luminance(colour) for colour in CLOTH]
    assert lightness == sorted(lightness, reverse=True)
