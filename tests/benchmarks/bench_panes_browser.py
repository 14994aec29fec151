"""From a key press on a slider to the painted answer in the page, as a ratio to a bare echo widget.

    python tests/benchmarks/bench_panes_browser.py [--moves 20] [--json FILE]

Needs Chromium and JupyterLab. One Lab, one page, one run: an ipywidgets slider whose handler copies the
value into a label is the echo; the panes of Ember-I (an invented model; SpectrumPane: 200 points,
cutoff 6; ElementPane: 10 × 10 and 28 × 28) are driven the same way. Time runs from the
keydown event to the second animation frame after the awaited part of the page has changed. Absolute times
vary with the machine; the ratio is the figure to compare.
"""

from __future__ import annotations

import argparse
import json
import statistics
import sys
import tempfile
from pathlib import Path

from playwright.sync_api import Page, sync_playwright

sys.path.insert(0, str(Path(__file__).parents[1]))

from browser.harness import (
    BROWSER_ARGUMENTS,
    Notebook,
    find_browser,
    lab_server,
    open_lab,
    write_notebook,
)

CELLS = (
    """import ipywidgets
slider, label = ipywidgets.FloatSlider(min=0, max=3, step=0.01, value=1, description="z"), ipywidgets.Label()
label.add_class("echo")
slider.observe(lambda change: label.set_trait("value", str(change.new)), "value")
ipywidgets.VBox([slider, label])""",
    """G = hl.SU(3)
model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
hl.SpectrumPane(model, cutoff=6, values={"t": 1.0, "z": 1.0})""",
    """hl.ElementPane(model, cutoff=3, values={"t": 1.0, "z": 1.0})""",
    """hl.ElementPane(model, cutoff=6, values={"t": 1.0, "z": 1.0})""",
)

SUBJECTS = {
    "echo: slider to label": (0, "z", ".echo"),
    "SpectrumPane: move z": (1, "z", ".hl-scroll"),
    "SpectrumPane: move t (new scan)": (1, "t", ".hl-scroll"),
    "ElementPane 10 × 10: move z": (2, "z", ".hl-readout"),
    "ElementPane 10 × 10: move t": (2, "t", ".hl-readout"),
    "ElementPane 28 × 28: move z": (3, "z", ".hl-legend"),
    "ElementPane 28 × 28: move t": (3, "t", ".hl-legend"),
}
"""Name: cell, slider, and the part of the page that changes last."""

MOVE = """([handle, part, key]) => new Promise((resolve, reject) => {
  let start;
  const late = setTimeout(() => reject(new Error('nothing was painted within 20 s')), 20000);
  const seen = new MutationObserver(() => {
    seen.disconnect();
    requestAnimationFrame(() => requestAnimationFrame(() => {
      clearTimeout(late);
      resolve(performance.now() - start);
    }));
  });
  seen.observe(part, {subtree: true, childList: true, characterData: true});
  handle.focus();
  start = performance.now();
  for (const kind of ['keydown', 'keyup'])
    handle.dispatchEvent(new KeyboardEvent(kind, {key, bubbles: true, cancelable: true}));
})"""


def one_subject(page: Page, book: Notebook, cell: int, name: str, part: str, moves: int) -> list[float]:
    """Milliseconds of each move; the first two, which fill caches, are left out."""
    area = book.output(cell)
    handle = area.locator(".widget-slider", has_text=name).first.get_by_role("slider").element_handle()
    target = area.locator(part).first.element_handle()
    times = []
    for number in range(moves + 2):
        key = "ArrowLeft" if number % 2 else "ArrowRight"
        times.append(float(page.evaluate(MOVE, [handle, target, key])))
        page.wait_for_timeout(120)
    return times[2:]


def measured(moves: int) -> dict[str, list[float]]:
    """All subjects in one page, in one run."""
    with (
        tempfile.TemporaryDirectory() as home,
        lab_server(Path(home)) as server,
        sync_playwright() as playwright,
    ):
        browser = playwright.chromium.launch(executable_path=find_browser(), args=list(BROWSER_ARGUMENTS))
        page = open_lab(browser, server)
        write_notebook(server.folder / "latency.ipynb", CELLS)
        book = Notebook(page)
        book.open("latency.ipynb")
        book.run_all()
        page.wait_for_timeout(3000)
        results = {name: one_subject(page, book, *subject, moves) for name, subject in SUBJECTS.items()}
        book.close()
        browser.close()
    return results


def main() -> int:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--moves", type=int, default=20)
    parser.add_argument("--json", type=Path)
    options = parser.parse_args()
    if find_browser() is None:
        print("no Chromium on this machine: install one to run this benchmark", file=sys.stderr)
        return 1
    results = measured(options.moves)
    echo = statistics.median(results["echo: slider to label"])
    print(f"{'':36}{'p50 ms':>9}{'p95 ms':>9}{'p50 of echo':>13}")
    for name, times in results.items():
        middle, high = statistics.median(times), sorted(times)[int(0.95 * (len(times) - 1))]
        print(f"{name:36}{middle:9.0f}{high:9.0f}{middle / echo:13.2f}")
    if options.json:
        options.json.write_text(json.dumps(results, indent=1))
    return 0


if __name__ == "__main__":
    sys.exit(main())
