"""The kernel and the page as a user meets them, and proof that the harness notices what goes wrong."""

from __future__ import annotations

from collections.abc import Callable

import pytest
from playwright.sync_api import expect

from browser.harness import Notebook

Opener = Callable[..., Notebook]


def test_kernel_has_haarloom_loaded_and_prints_mathematics(notebook: Opener) -> None:
    book = notebook("import sympy\nsympy.sqrt(sympy.Symbol('t')) / 3", "hl.__name__")
    book.run_all()
    expect(book.output(0).locator("mjx-container")).to_be_visible()
    expect(book.output(1)).to_contain_text("haarloom")


def test_each_notebook_has_a_kernel_of_its_own(notebook: Opener) -> None:
    first = notebook("mark = 17")
    first.run_all()
    assert first.evaluate("mark + 1") == "18"
    first.close()
    second = notebook("1")
    second.run_all()
    assert second.evaluate("'mark' in dir()") == "False"


def test_failing_cell_is_reported(notebook: Opener) -> None:
    book = notebook("1 / 0", "2")
    with pytest.raises(AssertionError, match="ZeroDivisionError"):
        book.run_all()


def test_widget_click_reaches_the_kernel(notebook: Opener) -> None:
    book = notebook(
        "import ipywidgets\nhits = []\n"
        "button = ipywidgets.Button(description='press')\nbutton.on_click(hits.append)\nbutton"
    )
    book.run_all()
    book.output(0).get_by_role("button", name="press").click()
    book.page.wait_for_timeout(300)
    assert book.evaluate("len(hits)") == "1"


def test_console_errors_and_requests_elsewhere_are_noticed(notebook: Opener) -> None:
    book = notebook("1")
    book.page.evaluate("() => console.error('seen')")
    book.page.evaluate("() => fetch('http://nowhere.invalid/').catch(() => 0)")
    book.page.wait_for_timeout(300)
    assert "seen" in book.console
    assert book.left == ["http://nowhere.invalid/"]
    book.console.clear()
    book.left.clear()


def test_theme_switches(notebook: Opener) -> None:
    book = notebook("1")
    book.theme("Dark")
    expect(book.page.locator("body")).to_have_attribute("data-jp-theme-light", "false")
