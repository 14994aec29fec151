"""A real JupyterLab with settings of its own, and a notebook open in it that a test can drive.

The waiting is done inside the page, on Lab's own promises: a cold server that is asked to run a
notebook before its kernel is connected drops the request without a word.
"""

from __future__ import annotations

import contextlib
import json
import os
import shutil
import subprocess
import sys
import time
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import nbformat
from playwright.sync_api import Browser, ConsoleMessage, Locator, Page, Request

ROOT = Path(__file__).parents[2]
BROWSERS = ("chromium", "chromium-browser", "google-chrome")
BROWSER_ARGUMENTS = (
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
)
SETTINGS: dict[str, dict[str, Any]] = {
    "apputils-extension/notification": {"fetchNews": "false", "checkForUpdates": False},
    # Off-screen cells must exist in the page, or no locator finds them.
    "notebook-extension/tracker": {"windowingMode": "none", "autoRenderMarkdownCells": True},
}
# Lab's own debugger asks each new kernel for its state, and complains when a test ends the kernel first.
NOT_OURS = ("Could not restore the debugger state",)
OPEN = """async name => {
  const app = window.jupyterapp; await app.restored;
  const panel = await app.commands.execute('docmanager:open', {path: name, factory: 'Notebook'});
  await panel.context.ready; await panel.sessionContext.ready;
  const kernel = () => panel.sessionContext.session?.kernel;
  for (let i = 0; i < 300 && kernel()?.connectionStatus !== 'connected'; i++)
    await new Promise(done => setTimeout(done, 100));
  await kernel().info;
  window.openPanel = panel;
}"""
RUN_ALL = """async () => {
  const panel = window.openPanel;
  window.jupyterapp.shell.activateById(panel.id);
  await window.jupyterapp.commands.execute('notebook:run-all-cells');
  return panel.content.model.sharedModel.toJSON().cells.flatMap((cell, i) => (cell.outputs || [])
    .filter(out => out.output_type === 'error').map(out => `cell ${i}: ${out.ename}: ${out.evalue}`));
}"""
EVALUATE = """async code => {
  const kernel = window.openPanel.sessionContext.session.kernel;
  const request = kernel.requestExecute(
    {code: '', silent: false, store_history: false, user_expressions: {value: code}});
  const value = (await request.done).content.user_expressions.value;
  return value.status === 'ok'
    ? ['ok', value.data['text/plain']]
    : ['error', `${value.ename}: ${value.evalue}`];
}"""
CLOSE = """async () => {
  const panel = window.openPanel;
  if (!panel) return;
  await panel.sessionContext.shutdown();
  panel.dispose();
  window.openPanel = undefined;
}"""


def find_browser() -> str | None:
    """Path of an installed Chromium, or None."""
    return next((path for name in BROWSERS if (path := shutil.which(name))), None)


@dataclass(frozen=True)
class LabServer:
    """A running JupyterLab: where it listens, and the folder that it serves."""

    url: str
    token: str
    folder: Path

    @property
    def address(self) -> str:
        """The page to open first."""
        return f"{self.url}lab?token={self.token}&reset"


@contextlib.contextmanager
def lab_server(home: Path) -> Iterator[LabServer]:
    """Run JupyterLab on a free port with every folder of its own below ``home``."""
    folder = _prepare(home)
    command = [sys.executable, "-m", "jupyterlab", "--no-browser", "--allow-root", "--ip=127.0.0.1"]
    command += ["--ServerApp.port=0", "--expose-app-in-browser", f"--ServerApp.root_dir={folder}"]
    with (home / "lab.log").open("w") as log:
        process = subprocess.Popen(command, env=_environment(home), stdout=log, stderr=subprocess.STDOUT)
        try:
            info = _wait_for_server(process, home)
            yield LabServer(info["url"].replace("localhost", "127.0.0.1"), info["token"], folder)
        finally:
            process.terminate()
            try:
                process.wait(20)
            except subprocess.TimeoutExpired:
                process.kill()
                process.wait(20)


def _prepare(home: Path) -> Path:
    for name, values in SETTINGS.items():
        path = home / "config/lab/user-settings/@jupyterlab" / f"{name}.jupyterlab-settings"
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(json.dumps(values))
    # The kernelspec as shipped, so that the tests also run from a checkout that is not installed.
    shutil.copytree(ROOT / "share/jupyter/kernels", home / "data/kernels")
    folder = home / "notebooks"
    folder.mkdir()
    return folder


def _environment(home: Path) -> dict[str, str]:
    return dict(
        os.environ,
        JUPYTER_CONFIG_DIR=str(home / "config"),
        JUPYTER_DATA_DIR=str(home / "data"),
        JUPYTER_RUNTIME_DIR=str(home / "run"),
        IPYTHONDIR=str(home / "ipython"),
        PYTHONPATH=os.pathsep.join(filter(None, [str(ROOT / "src"), os.environ.get("PYTHONPATH")])),
    )


def _wait_for_server(process: subprocess.Popen[bytes], home: Path) -> dict[str, Any]:
    for _ in range(600):
        for path in (home / "run").glob("jpserver-*.json"):
            with contextlib.suppress(ValueError):  # the file may be half written
                info: dict[str, Any] = json.loads(path.read_text())
                return info
        if process.poll() is not None:
            break
        time.sleep(0.1)
    raise RuntimeError(f"JupyterLab did not start:\n{(home / 'lab.log').read_text()[-2000:]}")


@dataclass
class Notebook:
    """A notebook open in the page. Cells count from 0.

    Console errors and requests to other hosts are gathered from the moment it is opened; the
    fixture that made it fails the test if there were any.
    """

    page: Page
    console: list[str] = field(default_factory=list)
    left: list[str] = field(default_factory=list)

    def open(self, name: str) -> None:
        """Open a file of the served folder and wait until its kernel answers."""
        self.page.evaluate(OPEN, name)

    def run_all(self, *, allow_errors: bool = False) -> list[str]:
        """Run every cell; the errors of cells, which are refused unless ``allow_errors``."""
        errors: list[str] = self.page.evaluate(RUN_ALL)
        assert allow_errors or not errors, errors
        return errors

    def evaluate(self, expression: str) -> str:
        """``repr`` of a Python expression in the kernel, e.g. what a click did to a pane's traits."""
        status, text = self.page.evaluate(EVALUATE, expression)
        assert status == "ok", text
        return str(text)

    def cell(self, index: int) -> Locator:
        """One cell."""
        return self.page.locator(".jp-NotebookPanel:not(.lm-mod-hidden) .jp-Notebook .jp-Cell").nth(index)

    def output(self, index: int) -> Locator:
        """The outputs of one cell."""
        return self.cell(index).locator(".jp-Cell-outputArea")

    def theme(self, name: str) -> None:
        """Switch Lab to the ``"Light"`` or the ``"Dark"`` theme."""
        self.page.evaluate(
            "name => window.jupyterapp.commands.execute('apputils:change-theme', {theme: name})",
            f"JupyterLab {name}",
        )

    def close(self) -> None:
        """End the kernel and drop the document unsaved."""
        self.page.evaluate(CLOSE)

    def note_console(self, message: ConsoleMessage) -> None:
        """Keep what the page reports as an error."""
        if message.type == "error" and not message.text.startswith(NOT_OURS):
            self.console.append(message.text[:300])

    def note_request(self, request: Request) -> None:
        """Keep the address of every request that leaves this machine."""
        if not request.url.startswith(("http://127.0.0.1", "ws://127.0.0.1", "data:", "blob:")):
            self.left.append(request.url)


def write_notebook(path: Path, cells: tuple[str, ...]) -> None:
    """A notebook of code cells for the Haarloom kernel."""
    notebook = nbformat.v4.new_notebook(cells=[nbformat.v4.new_code_cell(cell) for cell in cells])
    notebook.metadata["kernelspec"] = {"name": "haarloom", "display_name": "Haarloom", "language": "python"}
    nbformat.write(notebook, path)


def open_lab(browser: Browser, server: LabServer, width: int = 1400, height: int = 1200) -> Page:
    """A page with Lab restored and the side bar folded away."""
    page = browser.new_page(viewport={"width": width, "height": height})
    page.goto(server.address)
    page.wait_for_selector("#jp-main-dock-panel", timeout=60_000)
    page.evaluate(
        "async () => { await window.jupyterapp.restored;"
        " await window.jupyterapp.commands.execute('application:toggle-left-area'); }"
    )
    return page
