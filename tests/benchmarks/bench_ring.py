"""The symbolic and the compiled transfer matrix of Ember-I (invented): times, and ratios to a plain script.

    python tests/benchmarks/bench_ring.py

The plain script knows the tables of its one model by heart and assembles T with NumPy; it stands for what one
writes by hand, after the algebra has been done.
"""

from __future__ import annotations

import sys
from pathlib import Path
from time import perf_counter

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[2] / "src"))

from plain_script import plain_matrices, plain_tables, timed

import haarloom as hl

POINTS = 1000


def cold_symbolic(cutoff: int) -> float:
    """The first symbolic matrix of a model, with nothing of it cached."""
    G = hl.SU(3)
    model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    start = perf_counter()
    assert model.transfer_matrix(cutoff).matrix.shape[0] == len(G.irreps(cutoff))
    return perf_counter() - start


def main() -> None:
    symbolic = cold_symbolic(6)
    G = hl.SU(3)
    model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    rng = np.random.default_rng(3)
    t, z = rng.uniform(0.5, 2, POINTS), rng.uniform(0, 1, POINTS)
    T = model.transfer_matrix(8)
    tables = plain_tables(8)
    assert np.allclose(T.numeric(t=t, z=z), plain_matrices(tables, t, z), rtol=1e-13, atol=1e-18)
    ours = timed(lambda: T.numeric(t=t, z=z), 9) / POINTS
    plain = timed(lambda: plain_matrices(tables, t, z), 9) / POINTS
    single = timed(lambda: T.numeric(t=1.0, z=0.3), 30)
    print(f"{'job':58} {'time':>12} {'aim':>10} {'ratio to plain script':>22}")
    rows = [
        ("symbolic T, cutoff 6 (28 irreps), first time", f"{symbolic * 1e3:.0f} ms", "1 s", "-"),
        (
            f"T.numeric, cutoff 8 (45 irreps), a point of {POINTS}",
            f"{ours * 1e6:.1f} µs",
            "100 µs",
            f"{ours / plain:.2f}",
        ),
        ("T.numeric, cutoff 8, one point alone", f"{single * 1e6:.0f} µs", "-", "-"),
        (f"plain NumPy script, a point of {POINTS}", f"{plain * 1e6:.1f} µs", "-", "1"),
    ]
    for job, time, aim, ratio in rows:
        print(f"{job:58} {time:>12} {aim:>10} {ratio:>22}")


if __name__ == "__main__":
    main()
