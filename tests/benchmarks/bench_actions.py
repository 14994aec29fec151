"""Speed of coefficients, as ratios to plain scripts that call SciPy term by term.

    python tests/benchmarks/bench_actions.py

Wilson SU(3): 1,000 irreps at 200 values of β. The plain script calls ``scipy.special.ive`` for each entry
of each 3×3 determinant and sums over the shift; it is timed on a sample of pairs (irrep, β) and scaled up.
The largest deviation between the two is printed beside its time. Best of several rounds; a busy machine
makes all of them longer.
"""

from __future__ import annotations

import itertools
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import sympy
from scipy.special import ive

sys.path.insert(0, str(Path(__file__).parents[2] / "src"))

from haarloom.actions import loop_field, manton, mixed_wilson, static_fermions, torus_coefficients, wilson
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep

G = SU(3)


def best(action: Callable[[], Any], rounds: int = 3) -> float:
    """Shortest time of one call in seconds."""
    times = []
    for _ in range(rounds):
        start = time.perf_counter()
        action()
        times.append(time.perf_counter() - start)
    return min(times)


def term_by_term(irrep: Irrep, beta: float) -> float:
    """k_r by one SciPy call for every Bessel function of every determinant."""
    x = beta / 3

    def total(rows: tuple[int, ...]) -> float:
        result, span = 0.0, rows[0] + 30
        for n in range(-span, span + 1):
            m = [[float(ive(rows[j] - j + i + n, x)) for j in range(3)] for i in range(3)]
            result += (
                m[0][0] * (m[1][1] * m[2][2] - m[1][2] * m[2][1])
                - m[0][1] * (m[1][0] * m[2][2] - m[1][2] * m[2][0])
                + m[0][2] * (m[1][0] * m[2][1] - m[1][1] * m[2][0])
            )
        return result

    return total(irrep.partition) / (irrep.dimension * total((0, 0, 0)))


def wilson_table() -> None:
    irreps, betas = G.irreps(44)[:1000], np.linspace(0.1, 20, 200)
    link = wilson(G, "beta")
    ours = best(lambda: link.coefficients_at(irreps, {"beta": betas}))
    k, error = link.coefficients_at(irreps, {"beta": betas})
    rng = np.random.default_rng(5)
    sample = [(int(rng.integers(1000)), int(rng.integers(200))) for _ in range(40)]
    plain = best(lambda: [term_by_term(irreps[i], betas[j]) for i, j in sample], 1) / len(sample)
    deviation = max(abs(term_by_term(irreps[i], betas[j]) - k[j, i]) for i, j in sample)
    relative = (error / np.maximum(k, 1e-300)).max()
    print(f"Wilson SU(3), 1,000 irreps × 200 β       {ours:8.3f} s   stated relative error ≤ {relative:.1e}")
    print(
        f"  SciPy term by term, scaled up           {plain * 200_000:8.1f} s   ratio "
        f"{plain * 200_000 / ours:,.0f}"
    )
    print(f"  largest deviation on {len(sample)} pairs            {deviation:8.1e}")


def others() -> None:
    fresh = itertools.count(1)  # a new coupling each time, so that no cache helps
    symbol, beta = wilson(G, "beta").coefficient(G.adjoint), sympy.Symbol("beta")
    rows: list[tuple[str, Callable[[], Any]]] = [
        ("Wilson SU(3), 28 irreps × 200 β", lambda: _points(wilson(G, "beta"), 6, "beta", 200)),
        ("Wilson SU(4), 35 irreps × 50 β", lambda: _points(wilson(SU(4), "beta"), 4, "beta", 50)),
        ("Wilson SU(8), 8 irreps × 10 β", lambda: _points(wilson(SU(8), "beta"), 1, "beta", 10)),
        ("mixed SU(3), 28 irreps × 20 β", lambda: _points(mixed_wilson(G, {"3": "beta"}), 6, "beta", 20)),
        ("Manton SU(3), 28 irreps × 20 β", lambda: _points(manton(G, "beta"), 6, "beta", 20)),
        ("fermions n = 1, 28 irreps × 1,000 z", lambda: _points(static_fermions(G, "z"), 6, "z", 1000)),
        (
            "fermions n = 24 + 24, 28 irreps × 20 z",
            lambda: _points(static_fermions(G, "z", "z", 24), 6, "z", 20),
        ),
        (
            "field on 3 and 3bar, 28 irreps × 200",
            lambda: _points(loop_field(G, {"3": "h", "3bar": "h"}), 6, "h", 200),
        ),
        ("field on 8, 28 irreps × 20", lambda: _points(loop_field(G, {"8": "h"}), 6, "h", 20)),
        (
            "one coefficient to 500 digits",
            lambda: symbol.subs(beta, 6 + sympy.Rational(1, next(fresh))).evalf(500),
        ),
        (
            "strong-coupling series to order 40",
            lambda: wilson(G, f"b{next(fresh)}").strong_coupling(G.adjoint, 40),
        ),
    ]
    for name, action in rows:
        print(f"{name:<40}{best(action) * 1e3:10.1f} ms")


def _points(weight: Any, cutoff: int, name: str, count: int) -> None:
    torus_coefficients.sampled_function.cache_clear()
    values = np.linspace(0.05, 0.9, count) * (20 if name == "beta" else 1)
    weight.coefficients_at(weight.group.irreps(cutoff), {name: values})


if __name__ == "__main__":
    wilson_table()
    others()
