"""Fixtures of the browser tests: one Lab and one page for all, a fresh notebook for each test."""

from __future__ import annotations

import os
import shutil
from collections.abc import Callable, Iterator
from itertools import count
from pathlib import Path

import pytest
from playwright.sync_api import Browser, Page, sync_playwright

from browser.harness import (
    BROWSER_ARGUMENTS,
    LabServer,
    Notebook,
    find_browser,
    lab_server,
    open_lab,
    write_notebook,
)

_names = count(1)


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """Mark everything in this folder as a browser test."""
    for item in items:
        if Path(__file__).parent in item.path.parents:
            item.add_marker(pytest.mark.browser)


@pytest.fixture(scope="session")
def chromium() -> str:
    """Path of the browser. Without one the tests are skipped, except in CI, where that is a failure."""
    path = find_browser()
    if path is None and os.environ.get("CI") == "true":
        pytest.fail("no Chromium on this machine: CI must install one")
    if path is None:
        pytest.skip("no Chromium on this machine: install one to run the browser tests")
    return path


@pytest.fixture(scope="session")
def server(chromium: str, tmp_path_factory: pytest.TempPathFactory) -> Iterator[LabServer]:
    """A JupyterLab for the whole run (asking for the browser first, so that a skip costs nothing)."""
    with lab_server(tmp_path_factory.mktemp("lab")) as running:
        yield running


@pytest.fixture(scope="session")
def browser(chromium: str) -> Iterator[Browser]:
    """A headless Chromium for the whole run."""
    with sync_playwright() as playwright:
        instance = playwright.chromium.launch(executable_path=chromium, args=list(BROWSER_ARGUMENTS))
        yield instance
        instance.close()


@pytest.fixture(scope="session")
def page(browser: Browser, server: LabServer) -> Page:
    """Lab, restored, in the one page that the tests share."""
    return open_lab(browser, server)


@pytest.fixture
def notebook(page: Page, server: LabServer) -> Iterator[Callable[..., Notebook]]:
    """Open a notebook: ``notebook("code of cell 0", "code of cell 1")`` or ``notebook(Path(...))``.

    The kernel is connected when it returns; nothing has run yet. Afterwards the test fails if the
    page reported an error or asked another host for anything.
    """
    opened = Notebook(page)
    page.on("console", opened.note_console)
    page.on("request", opened.note_request)

    def open_notebook(*content: str | Path) -> Notebook:
        name = f"test-{next(_names)}.ipynb"
        if len(content) == 1 and isinstance(content[0], Path):
            shutil.copy(content[0], server.folder / name)
        else:
            write_notebook(server.folder / name, tuple(map(str, content)))
        opened.open(name)
        return opened

    yield open_notebook
    opened.theme("Light")
    opened.close()
    page.remove_listener("console", opened.note_console)
    page.remove_listener("request", opened.note_request)
    assert not opened.console, f"the page reported errors: {opened.console}"
    assert not opened.left, f"requests left this machine: {opened.left}"
