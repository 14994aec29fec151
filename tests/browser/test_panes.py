"""The panes as a user meets them: clicks, keys, sliders and bad input in a real JupyterLab."""

from __future__ import annotations

import re
from collections.abc import Callable

from playwright.sync_api import Locator, expect

from browser.harness import ROOT, Notebook

Opener = Callable[..., Notebook]

MODEL = """import haarloom as hl
G = hl.SU(3)
model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
values = {"t": 1.0, "z": 0.5}"""

FIRST = ROOT / "notebooks/01-from-action-to-mass.ipynb"


def field(area: Locator, name: str) -> Locator:
    """The text box or menu with exactly this label."""
    return area.locator("input, select").and_(area.get_by_label(name, exact=True))


def slide(area: Locator, name: str, keys: str, times: int = 1) -> None:
    """Press a key on the slider of a parameter."""
    handle = area.locator(".widget-slider", has_text=re.compile(f"^{name}")).get_by_role("slider")
    handle.focus()
    for _ in range(times):
        area.page.keyboard.press(keys)


def settle(book: Notebook) -> None:
    """Wait until the page has no more changes to send and the kernel has answered them all."""
    for _ in range(3):
        book.page.wait_for_timeout(150)
        book.evaluate("0")


def test_first_notebook_from_action_to_mass(notebook: Opener) -> None:
    book = notebook(FIRST)
    book.run_all()
    loom = book.page.locator(
        ".jp-NotebookPanel:not(.lm-mod-hidden) .jp-Cell-outputArea", has=book.page.locator(".hl-strip")
    )
    expect(loom.locator(".hl-strip button")).to_have_count(4)
    expect(loom.locator(".hl-steps li")).to_have_count(4)
    expect(loom.locator("svg.bqplot, .bqplot svg").first).to_be_visible()


def test_click_an_element_and_read_its_derivation(notebook: Opener) -> None:
    book = notebook(MODEL + "\npane = hl.ElementPane(model, cutoff=2, values=values)\npane")
    book.run_all()
    pane = book.output(0)
    pane.get_by_role("gridcell", name="row 3, column 3bar").click()
    expect(pane.locator(".hl-steps li")).to_have_count(4)
    expect(pane.locator(".hl-steps li").first).to_contain_text("Expand the site weight in characters")
    expect(pane.locator(".hl-steps .hl-verified.hl-good")).to_have_count(4)
    expect(pane.locator(".hl-steps mjx-container").first).to_be_visible()
    settle(book)
    assert book.evaluate("pane.fault") == "''"
    assert (
        book.evaluate("pane.element, str(pane.derivation.element)") == "(('3', '3bar'), 'z**2*exp(-4*t/3)')"
    )


def test_an_element_that_vanishes_says_why(notebook: Opener) -> None:
    book = notebook(MODEL + "\npane = hl.ElementPane(model, cutoff=2, values=values)\npane")
    book.run_all()
    cell = book.output(0).get_by_role("gridcell", name="row 1, column 8: exactly zero")
    cell.click()
    expect(cell).to_have_attribute("aria-selected", "true")
    settle(book)
    assert book.evaluate("pane.derivation.element") == "0"
    assert book.evaluate("pane.verification.passed") == "True"


def test_choose_an_element_by_keyboard_alone(notebook: Opener) -> None:
    book = notebook(MODEL + "\npane = hl.ElementPane(model, cutoff=2, values=values)\npane")
    book.run_all()
    pane, keys = book.output(0), book.page.keyboard
    pane.locator('[role="gridcell"][tabindex="0"]').focus()
    for key in ("ArrowDown", "ArrowDown", "ArrowRight", "Enter"):
        keys.press(key)
    expect(pane.get_by_role("gridcell", name="row 3bar, column 3:")).to_have_attribute(
        "aria-selected", "true"
    )
    settle(book)
    assert book.evaluate("pane.element") == "('3bar', '3')"
    # the letters that Lab takes as commands outside a focused cell must not reach it
    keys.press("d")
    keys.press("d")
    expect(pane.get_by_role("grid")).to_be_visible()


def test_move_z_and_see_two_real_masses_merge(notebook: Opener) -> None:
    book = notebook(MODEL + "\npane = hl.SpectrumPane(model, values=values)\npane")
    book.run_all()
    pane = book.output(0)
    first, second = (pane.locator(".hl-table tr").nth(row) for row in (1, 2))
    expect(first).to_contain_text("real")
    expect(pane.locator(".hl-column").first).to_be_visible()
    slide(pane, "z", "ArrowLeft", 15)
    expect(first).to_contain_text("complex pair")
    expect(second).to_contain_text("complex pair")
    settle(book)
    assert book.evaluate("round(pane.values['z'], 10)") == "0.35"
    upper, lower = (row.locator("td").nth(2).inner_text() for row in (first, second))
    assert upper.startswith("+")
    assert lower == upper.replace("+", "−")
    expect(pane).to_contain_text("Shaded: the lowest mass is one of a complex pair")


def test_the_latest_slider_position_wins(notebook: Opener) -> None:
    book = notebook(
        MODEL + "\npane = hl.SpectrumPane(model, values=values)\ndrawn = []\n"
        "pane.observe(lambda change: drawn.append(change.new['t']), 'values')\npane"
    )
    book.run_all()
    pane = book.output(0)
    expect(pane.locator(".hl-table")).to_be_visible()
    slide(pane, "t", "ArrowRight", 60)
    settle(book)
    expect(pane.locator(".widget-readout").first).to_have_text("1.60")
    assert book.evaluate("round(drawn[-1], 10), round(pane.spectrum.values['t'], 10)") == "(1.6, 1.6)"
    assert int(book.evaluate("len(drawn)")) < 60


def test_bad_input_leaves_a_line_beside_the_field_and_the_last_good_result(notebook: Opener) -> None:
    book = notebook(
        MODEL + "\nlink = hl.LinkPane(model.link)\nlink",
        "pane = hl.SpectrumPane(model, values=values)\npane",
    )
    book.run_all()
    link, spectrum = book.output(0), book.output(1)
    box = field(link, "t")
    box.fill("-2")
    box.press("Enter")
    expect(link.get_by_role("alert")).to_contain_text("t = -2")
    settle(book)
    assert book.evaluate("link.weight == model.link") == "True"
    box.fill("2*t")
    box.press("Enter")
    expect(link.get_by_role("alert")).not_to_be_visible()
    expect(link.locator("mjx-container").first).to_be_visible()
    cutoff = field(spectrum, "cutoff K")
    cutoff.fill("many")
    cutoff.press("Enter")
    expect(spectrum.get_by_role("alert")).to_contain_text("'many' is no truncation")
    expect(spectrum.locator(".hl-table tr").nth(1)).to_contain_text("real")


def test_loom_change_the_action_and_all_follow(notebook: Opener) -> None:
    book = notebook(MODEL + "\nloom = hl.Loom(model, values=values)\nloom")
    book.run_all()
    loom = book.output(0)
    strip = loom.locator(".hl-strip")
    expect(strip.get_by_role("button", name="Spectrum")).to_contain_text("m₁ = 1.4409")
    field(loom, "kind").first.select_option("Wilson")
    expect(strip.get_by_role("button", name="Link weight")).to_contain_text("Wilson")
    expect(strip.get_by_role("button", name="Spectrum")).not_to_contain_text("1.4409")
    settle(book)
    assert book.evaluate("loom.spectrum_pane.spectrum.model.link == hl.wilson(G, 'beta')") == "True"
    grid = loom.get_by_role("grid")
    expect(grid).to_be_visible()
    strip.get_by_role("button", name="Transfer matrix").click()
    expect(grid).not_to_be_visible()


def test_add_a_factor_of_matter_and_take_it_out_again(notebook: Opener) -> None:
    book = notebook(MODEL + "\nsite = hl.SitePane(model.site)\nsite")
    book.run_all()
    pane = book.output(0)
    field(pane, "add").select_option("loop field")
    pane.get_by_role("button", name="Add factor").click()
    expect(pane.locator(".hl-card")).to_have_count(2)
    expect(pane.locator(".hl-table")).to_be_visible()
    pane.get_by_role("button", name="Remove").last.click()
    expect(pane.locator(".hl-card")).to_have_count(1)
    settle(book)
    assert book.evaluate("site.weight == model.site") == "True"


def test_code_is_shown_copied_and_follows_the_slider(notebook: Opener) -> None:
    book = notebook(MODEL + "\npane = hl.SpectrumPane(model, values=values)\npane")
    book.run_all()
    pane = book.output(0)
    pane.get_by_role("button", name="Show the code of Spectrum").click()
    code = pane.locator("pre").inner_text()
    assert code == eval(book.evaluate("pane.code"))
    copy = pane.get_by_role("button", name="Copy Spectrum as Python")
    copy.click()
    expect(copy).to_have_text(re.compile("Copied|Press Ctrl"))
    slide(pane, "z", "ArrowRight")
    expect(pane.locator("pre")).to_contain_text('"z": 0.51')


def test_every_control_of_a_loom_has_a_name_and_a_ring(notebook: Opener) -> None:
    book = notebook(MODEL + "\nloom = hl.Loom(model, values=values)\nloom")
    book.run_all()
    loom = book.output(0)
    expect(loom.get_by_role("slider", name="z", exact=True)).to_have_count(3)
    expect(loom.get_by_role("slider", name="t", exact=True)).to_have_count(3)
    expect(loom.get_by_role("textbox", name="value of z")).to_have_count(3)
    field(loom, "kind").first.select_option("Wilson")
    expect(loom.get_by_role("slider", name="β", exact=True)).to_have_count(3)
    loom.get_by_role("button", name="Copy Loom as Python").focus()
    bare, inside = [], 0
    while inside < 80:
        book.page.keyboard.press("Tab")
        kind, style, width, within = book.page.evaluate("""() => {
            const node = document.activeElement, look = getComputedStyle(node);
            return [node.tagName + '.' + node.className, look.outlineStyle,
                    parseFloat(look.outlineWidth), Boolean(node.closest('.hl-pane'))];
        }""")
        if not within:
            break
        inside += 1
        if style == "none" or width < 1:
            bare.append(kind)
    assert inside > 30
    assert bare == []


def test_dark_theme_darkens_every_part(notebook: Opener) -> None:
    book = notebook(MODEL + "\nloom = hl.Loom(model, values=values)\nloom")
    book.run_all()
    book.theme("Dark")
    loom = book.output(0)
    expect(loom.get_by_role("grid")).to_be_visible()
    book.page.wait_for_function("document.body.dataset.jpThemeLight === 'false'")
    for part in (".hl-pane", ".hl-frame", ".hl-head"):
        colour = loom.locator(part).first.evaluate("node => getComputedStyle(node).backgroundColor")
        assert max(map(int, re.findall(r"\d+", colour)[:3])) < 0x60, part


def test_no_part_is_wider_than_the_cell_in_a_narrow_page(notebook: Opener) -> None:
    book = notebook(MODEL + "\nloom = hl.Loom(model, values=values)\nloom")
    book.run_all()
    size = book.page.viewport_size
    book.page.set_viewport_size({"width": 760, "height": 1200})
    try:
        book.page.wait_for_timeout(400)
        pane = book.output(0).locator(".hl-pane").first
        wide = pane.evaluate("""pane => [...pane.querySelectorAll('*')]
            .filter(node => !node.closest('mjx-container, svg, .hl-frame, pre, .hl-table'))
            .filter(node => node.getBoundingClientRect().right > pane.getBoundingClientRect().right + 1)
            .map(node => node.className)""")
        assert wide == []
    finally:
        book.page.set_viewport_size(size)
