"""What panes say when they are built from something that cannot be shown."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

import haarloom as hl
from haarloom.exceptions import HaarloomError
from haarloom.widgets.arguments import brisk_cutoff

G = hl.SU(3)
MODEL = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))

REFUSED: dict[str, tuple[Callable[[], Any], str]] = {
    "site for link": (lambda: hl.LinkPane(MODEL.site), r"is no link weight: .*heat_kernel"),
    "link for site": (lambda: hl.SitePane(MODEL.link), r"is no site weight: .*static_fermions"),
    "weight for model": (lambda: hl.Loom(MODEL.site), r"is no ring model: give RingModel\(link, site\)"),
    "quantity": (lambda: hl.SitePane(MODEL.site, quantity="abs"), r"'abs'.*choose from \|W\|, Re W"),
    "scan": (lambda: hl.SpectrumPane(MODEL, scan="q"), r"scan = 'q'.*choose from t, z"),
    "span falls": (lambda: hl.SpectrumPane(MODEL, span=(2, 1)), r"first number must be below"),
    "span infinite": (lambda: hl.SpectrumPane(MODEL, span=(0, float("inf"))), r"both finite"),
    "span of words": (lambda: hl.SpectrumPane(MODEL, span=("a", 1)), r"give two numbers"),  # type: ignore[arg-type]
    "range falls": (lambda: hl.SpectrumPane(MODEL, ranges={"z": (3, 0)}), r"range of z = \(3, 0\)"),
    "values no table": (lambda: hl.Loom(MODEL, values=3), r"values = 3 is no table"),  # type: ignore[arg-type]
    "value not finite": (lambda: hl.Loom(MODEL, values={"z": float("nan")}), r"z = nan.*finite real"),
    "value complex": (lambda: hl.Loom(MODEL, values={"z": 1j}), r"model\.spectrum\(z=.*exp\(I\*theta\)"),  # type: ignore[dict-item]
    "scan too large": (lambda: hl.SpectrumPane(MODEL, cutoff=200), r"20,301 irreps at each of 200 points"),
    "grid too large": (lambda: hl.ElementPane(MODEL, cutoff=200), r"20,301 irreps; a grid shows at most 100"),
    "cutoff negative": (lambda: hl.ElementPane(MODEL, cutoff=-1), r"cutoff -1 given"),
    "element outside": (
        lambda: hl.ElementPane(MODEL, cutoff=2, element=("10", "8")),
        r"outside the basis Σ a_i ≤ 2: take cutoff ≥ 3",
    ),
    "element single": (lambda: hl.ElementPane(MODEL, element="3"), r"give a row and a column"),  # type: ignore[arg-type]
    "element misspelt": (lambda: hl.ElementPane(MODEL, element=("3bra", "8")), r"Near names: 3bar"),
}


@pytest.mark.parametrize("case", list(REFUSED))
def test_what_cannot_be_shown_is_refused_with_the_way_out(case: str) -> None:
    build, words = REFUSED[case]
    with pytest.raises(HaarloomError, match=words):
        build()


@pytest.mark.parametrize("n", range(2, 9))
def test_brisk_cutoff_is_the_largest_below_the_limit(n: int) -> None:
    group = hl.SU(n)
    cutoff = brisk_cutoff(group, 6)
    assert group.count_irreps(cutoff) <= 60
    assert cutoff == 6 or group.count_irreps(cutoff + 1) > 60


@pytest.mark.parametrize("n", [2, 5, 8])
def test_panes_open_for_every_group_without_settings(n: int) -> None:
    group = hl.SU(n)
    loom = hl.Loom(hl.RingModel(hl.heat_kernel(group, "t"), hl.static_fermions(group, "z")))
    assert {pane.fault for pane in (loom, *loom._panes.values())} == {""}
    assert loom.element_pane.verification.passed
