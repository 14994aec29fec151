"""What a slider move costs the kernel in each pane, beside a plain NumPy script for the same scan.

    python tests/benchmarks/bench_panes.py [--rounds 20] [--json FILE]

Ember-I (an invented model) at cutoff 6 (28 irreps), 200 points along z. A move is one change of a
slider's value up to the last message that the pane hands to its comm; the journey to the page is not
in it. The plain script stacks the 200 matrices by hand and calls ``numpy.linalg.eigvals``: no
errors, no continuous branches, no drawing. Medians over the rounds, wall and CPU time (the second is
the one to trust on a busy machine); the aim for a move that redraws the spectrum is 100 ms.
"""

from __future__ import annotations

import argparse
import json
import statistics
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[2] / "src"))

import haarloom as hl
from haarloom.algebra.products import fusion_tensor

G = hl.SU(3)
MODEL = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
CUTOFF, POINTS = 6, 200


def timed(action: Callable[[int], Any], rounds: int) -> dict[str, float]:
    """Median milliseconds of a call, wall and CPU; the first one, which fills caches, is left out."""
    wall, cpu = [], []
    for number in range(rounds + 1):
        start = time.perf_counter(), time.process_time()
        action(number)
        wall.append(time.perf_counter() - start[0])
        cpu.append(time.process_time() - start[1])
    return {"wall": 1e3 * statistics.median(wall[1:]), "cpu": 1e3 * statistics.median(cpu[1:])}


def mover(pane: Any, name: str, low: float) -> Callable[[int], None]:
    """Move one slider a step further at each call."""
    slider = pane._sliders._sliders[name]

    def move(number: int) -> None:
        slider.value = low + 0.01 * number

    return move


def plain_scan() -> Callable[[int], Any]:
    """The script that a competent user writes: fixed basis, vectorised assembly, eigenvalues."""
    basis = G.irreps(CUTOFF)
    labels = tuple(irrep.labels for irrep in basis)
    casimirs = np.array([float(irrep.casimir(2)) for irrep in basis])
    parts = np.zeros((3, len(basis), len(basis)))
    for part, component in enumerate(((0, 0), (1, 0), (0, 1))):
        for row, column, count in fusion_tensor(labels, component):
            parts[part, row, column] = count
    z = np.linspace(0, 3, POINTS)
    site = np.tensordot(np.stack([1 + z**3, z, z**2], axis=-1), parts, axes=1)

    def scan(number: int) -> Any:
        root = np.exp(-(1 + 0.01 * number) * casimirs / 2)
        values = np.linalg.eigvals(root[:, None] * site * root)
        ordered = np.take_along_axis(values, np.argsort(-np.abs(values), axis=1)[:, :6], axis=1)
        return -np.log(ordered[:, 1:].astype(complex) / ordered[:, :1])

    return scan


def subjects() -> dict[str, Callable[[int], Any]]:
    """What is timed, by name."""
    spectrum = hl.SpectrumPane(MODEL, cutoff=CUTOFF)
    element = hl.ElementPane(MODEL, cutoff=CUTOFF)
    link, site = hl.LinkPane(MODEL.link), hl.SitePane(MODEL.site)
    loom = hl.Loom(MODEL, matrix={"cutoff": CUTOFF}, spectrum={"cutoff": CUTOFF})
    names = [irrep.name for irrep in G.irreps(CUTOFF)]
    return {
        "plain NumPy scan, 200 points": plain_scan(),
        "SpectrumPane: move t (new scan)": mover(spectrum, "t", 1.0),
        "SpectrumPane: move z (same scan)": mover(spectrum, "z", 0.3),
        "ElementPane 28 × 28: move z": mover(element, "z", 0.3),
        "ElementPane 28 × 28: choose an element": lambda number: element.set_trait(
            "element", (names[number % 28], "8")
        ),
        "ElementPane 28 × 28: build": lambda _: hl.ElementPane(MODEL, cutoff=CUTOFF),
        "LinkPane: move t": mover(link, "t", 1.0),
        "SitePane: move z": mover(site, "z", 0.3),
        "Loom, all open: move z": mover(loom.spectrum_pane, "z", 0.3),
        "Loom, all open: move t": mover(loom.spectrum_pane, "t", 1.0),
    }


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--rounds", type=int, default=20)
    parser.add_argument("--json", type=Path)
    options = parser.parse_args()
    results = {name: timed(action, options.rounds) for name, action in subjects().items()}
    plain = results["plain NumPy scan, 200 points"]["cpu"]
    print(f"{'':42}{'wall ms':>10}{'CPU ms':>10}{'of plain scan':>15}")
    for name, times in results.items():
        print(f"{name:42}{times['wall']:10.1f}{times['cpu']:10.1f}{times['cpu'] / plain:15.2f}")
    if options.json:
        options.json.write_text(json.dumps(results, indent=1))


if __name__ == "__main__":
    main()
