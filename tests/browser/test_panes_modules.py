"""The front-end modules against a mock model: traits change the page, clicks change the traits."""

from __future__ import annotations

import base64
import struct
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
from playwright.sync_api import Browser, Page, expect

FRONT = Path(__file__).parents[2] / "src/haarloom/widgets/front"

MOUNT = """async ([source, traits]) => {
  const listeners = [];
  const bytes = value => value?.bytes ? new DataView(new Uint8Array(value.bytes).buffer) : value;
  window.saved = 0;
  window.mock = {
    state: Object.fromEntries(Object.entries(traits).map(([k, v]) => [k, bytes(v)])),
    get(name) { return this.state[name]; },
    set(name, value) {
      this.state[name] = bytes(value);
      for (const [event, call] of [...listeners])
        if (event === 'change' || event === `change:${name}`) call();
    },
    save_changes() { window.saved++; },
    on(event, call) { listeners.push([event, call]); },
    off(event, call) {
      const at = listeners.findIndex(([e, c]) => e === event && c === call);
      if (at >= 0) listeners.splice(at, 1);
    },
    listening: () => listeners.length,
  };
  const module = await import('data:text/javascript;base64,' + source);
  document.body.replaceChildren();
  window.cleanup = module.default.render({model: window.mock, el: document.body});
}"""

Mount = Callable[[str, dict[str, Any]], Page]


@pytest.fixture
def mount(browser: Browser) -> Iterator[Mount]:
    """Render one module in an empty page; a JavaScript error fails the test."""
    page = browser.new_page()
    errors: list[str] = []
    page.on("pageerror", lambda error: errors.append(str(error)))

    def mounted(module: str, traits: dict[str, Any]) -> Page:
        source = base64.b64encode((FRONT / module).read_bytes()).decode()
        page.evaluate(MOUNT, [source, traits])
        page.add_style_tag(path=(FRONT / module).with_suffix(".css"))
        return page

    yield mounted
    page.close()
    assert not errors


def floats(page_numbers: list[float]) -> dict[str, list[int]]:
    """Numbers as the bytes of little-endian float64."""
    return {"bytes": list(struct.pack(f"<{len(page_numbers)}d", *page_numbers))}


def grid_traits() -> dict[str, Any]:
    """1, 3 and 3bar of SU(3), with an empty element between 3 and 3bar."""
    rows = [
        {"name": name, "labels": labels, "dimension": dimension, "nality": nality}
        for name, labels, dimension, nality in (
            ("1", [0, 0], 1, 0),
            ("3", [1, 0], 3, 1),
            ("3bar", [0, 1], 3, 2),
        )
    ]
    return {
        "rows": rows,
        "order": 3,
        "pattern": {"bytes": [1, 1, 1, 1, 1, 0, 1, 1, 1]},
        "re": floats([1.0, 0.5, 0.25, 0.5, -0.125, 0.0, 0.25, 1e-9, 0.0]),
        "im": None,
        "selected": [-1, -1],
    }


def test_grid_draws_a_knot_exactly_where_the_pattern_says(mount: Mount) -> None:
    page = mount("grid.js", grid_traits())
    knots = page.locator('[role="gridcell"]').evaluate_all(
        "cells => cells.map(c => c.classList.contains('hl-knot'))"
    )
    assert knots == [True, True, True, True, True, False, True, True, True]


def test_grid_shows_nality_steps_signs_and_vanishing_elements(mount: Mount) -> None:
    page = mount("grid.js", grid_traits())
    cells = page.locator('[role="gridcell"]')
    assert "hl-k1" in (cells.nth(3).get_attribute("class") or "")
    assert "hl-k2" in (cells.nth(1).get_attribute("class") or "")
    assert "hl-negative" in (cells.nth(4).get_attribute("class") or "")
    assert "hl-vanishing" in (cells.nth(8).get_attribute("class") or "")
    assert cells.nth(5).get_attribute("aria-label") == "row 3, column 3bar: exactly zero"
    assert cells.nth(4).get_attribute("aria-label") == "row 3, column 3: N-ality step 0, value −0.125"


def test_grid_click_selects(mount: Mount) -> None:
    page = mount("grid.js", grid_traits())
    page.locator('[role="gridcell"]').nth(5).click()
    assert page.evaluate("[mock.get('selected'), saved]") == [[1, 2], 1]
    expect(page.locator('[aria-selected="true"]')).to_have_count(1)


def test_grid_has_one_tab_stop_and_moves_it_by_arrow_keys(mount: Mount) -> None:
    page = mount("grid.js", grid_traits())
    page.keyboard.press("Tab")
    for key in ("ArrowDown", "ArrowRight", "ArrowRight", "ArrowRight"):
        page.keyboard.press(key)
    focused = page.evaluate("[document.activeElement.dataset.row, document.activeElement.dataset.column]")
    assert focused == ["1", "2"]
    assert page.locator('[role="gridcell"][tabindex="0"]').count() == 1
    page.keyboard.press("Enter")
    assert page.evaluate("mock.get('selected')") == [1, 2]
    page.keyboard.press("Control+End")
    page.keyboard.press(" ")
    assert page.evaluate("mock.get('selected')") == [2, 2]


def test_grid_follows_a_new_basis_and_new_numbers(mount: Mount) -> None:
    page = mount("grid.js", grid_traits())
    smaller = grid_traits()
    page.evaluate(
        "traits => { for (const [k, v] of Object.entries(traits)) mock.set(k, v); }",
        {"rows": smaller["rows"][:1], "pattern": {"bytes": [1]}, "re": floats([2.0]), "selected": [0, 0]},
    )
    expect(page.locator('[role="gridcell"]')).to_have_count(1)
    expect(page.locator(".hl-readout")).to_have_text("row 1, column 1: N-ality step 0, value 2.00")


def test_grid_without_numbers_still_shows_the_pattern(mount: Mount) -> None:
    page = mount("grid.js", grid_traits() | {"re": None})
    assert page.locator('[role="gridcell"].hl-knot').count() == 8
    assert (
        page.locator('[role="gridcell"]').first.get_attribute("aria-label")
        == "row 1, column 1: N-ality step 0"
    )


def test_head_shows_its_traits_and_copies_the_code(mount: Mount) -> None:
    page = mount("head.js", {"title": "Spectrum", "status": "SU(3)", "code": "x = 1", "selvedge": "none"})
    expect(page.get_by_role("heading")).to_have_text("Spectrum")
    page.evaluate(
        "navigator.clipboard ? (navigator.clipboard.writeText = async t => { window.copied = t }) : 0"
    )
    page.evaluate("mock.set('code', 'x = 2')")
    page.get_by_role("button", name="Show the code").click()
    expect(page.locator("pre")).to_have_text("x = 2")
    page.get_by_role("button", name="as Python").click()
    expect(page.get_by_role("button", name="as Python")).not_to_have_text("Copy as Python")


def test_strip_toggles_stations_and_keeps_the_focus(mount: Mount) -> None:
    station = {"key": "link", "title": "Link weight", "summary": "heat kernel", "thread": "#5872b4"}
    page = mount("strip.js", {"stations": [station], "opened": []})
    button = page.get_by_role("button", name="Link weight")
    expect(button).to_have_attribute("aria-expanded", "false")
    button.click()
    assert page.evaluate("mock.get('opened')") == ["link"]
    expect(button).to_have_attribute("aria-expanded", "true")
    page.evaluate("s => mock.set('stations', [s])", station | {"summary": "Wilson"})
    expect(button).to_contain_text("Wilson")
    assert page.evaluate("document.activeElement.dataset.station") == "link"


@pytest.mark.parametrize(
    ("module", "traits"),
    [
        ("grid.js", grid_traits()),
        ("head.js", {"title": "", "status": "", "code": "", "selvedge": ""}),
        ("strip.js", {"stations": [], "opened": []}),
    ],
)
def test_cleanup_leaves_no_listener(mount: Mount, module: str, traits: dict[str, Any]) -> None:
    page = mount(module, traits)
    assert page.evaluate("mock.listening()") > 0
    page.evaluate("cleanup()")
    assert page.evaluate("mock.listening()") == 0
