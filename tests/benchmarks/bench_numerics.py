"""The spectrum engine against plain scripts, on Ember-I (invented): times, ratios, exponents, memory.

    python tests/benchmarks/bench_numerics.py [SECTION ...] [--json FILE]

Sections: map, weak, apply, solve, scan, dask; all of them when none is named. Results are kept in FILE
(bench_numerics.json beside the working directory when left out), each section replacing its own entry.

The plain script is what one writes by hand with NumPy: T put together for many points at once on one fixed
basis that is large enough everywhere, then ``numpy.linalg.eigvals`` on the stack. It knows its one model by
heart. It is timed on part of the points and scaled up, as it is, and with its stacks handed to threads on all
cores.
"""

from __future__ import annotations

import argparse
import json
import os
import subprocess
import sys
from concurrent.futures import Executor, ProcessPoolExecutor, ThreadPoolExecutor
from functools import partial
from multiprocessing import get_context
from pathlib import Path
from statistics import median
from time import perf_counter
from typing import Any

import numpy as np

ROOT = Path(__file__).parents[2]
sys.path.insert(0, str(ROOT / "src"))

from plain_script import plain_matrices, plain_tables, timed  # noqa: E402

import haarloom as hl  # noqa: E402

MAP_POINTS = 256
TOLERANCE = 1e-10
CORES = os.cpu_count() or 1

Row = tuple[str, str, str, str]


def ember() -> hl.RingModel:
    G = hl.SU(3)
    return hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))


def sister(n: int) -> hl.RingModel:
    G = hl.SU(n)
    return hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))


def cpu_seconds() -> float:
    """Processor time of this process and its finished children: steadier than a clock on a shared machine."""
    times = os.times()
    return times.user + times.system + times.children_user + times.children_system


def exponent(sizes: list[int], times: list[float]) -> float:
    """Slope of log time against log size, by least squares."""
    return float(np.polyfit(np.log(sizes), np.log(times), 1)[0])


# the plain script --------------------------------------------------------------------------------------


def plain_masses(cutoff: int, t: np.ndarray, z: np.ndarray, levels: int = 4) -> np.ndarray:
    """Masses at many points, shape (M, levels − 1)."""
    values = np.linalg.eigvals(plain_matrices(plain_tables(cutoff), t, z))
    order = np.argsort(-np.abs(values), axis=1)[:, :levels]
    leading = np.take_along_axis(values, order, axis=1)
    return -np.log(leading[:, 1:].astype(complex) / leading[:, :1])


def plain_cutoff(t: float, z: float) -> int:
    """Smallest basis on which three masses at the hardest corner are right to the tolerance."""
    corner = np.array([t]), np.array([z])
    best = np.sort_complex(plain_masses(30, *corner)[0])
    for cutoff in range(2, 30):
        masses = np.sort_complex(plain_masses(cutoff, *corner)[0])
        if (np.abs(masses - best) <= TOLERANCE * np.abs(best)).all():
            return cutoff
    raise SystemExit("the plain script finds no basis that suffices")


def plain_seconds(cutoff: int, t: np.ndarray, z: np.ndarray, workers: int) -> float:
    """Seconds for all points in stacks of 256, on threads (LAPACK releases the interpreter's lock)."""
    parts = np.array_split(np.arange(len(t)), max(1, len(t) // 256))
    plain_masses(cutoff, t[:2], z[:2])
    start = perf_counter()
    with ThreadPoolExecutor(workers) as pool:
        list(pool.map(lambda part: plain_masses(cutoff, t[part], z[part]), parts))
    return perf_counter() - start


# sections ----------------------------------------------------------------------------------------------


def multiset_distance(one: np.ndarray, other: np.ndarray) -> np.ndarray:
    """Largest relative distance of two rows of three masses, pairs in either order, either member."""
    one, other = (masses.real + 1j * np.abs(masses.imag) for masses in (one, other))
    turned = other[:, [[0, 1, 2], [1, 0, 2], [0, 2, 1], [2, 1, 0], [1, 2, 0], [2, 0, 1]]]
    return (np.abs(one[:, None, :] - turned) / np.abs(one[:, None, :])).max(axis=2).min(axis=1)


def bench_map() -> tuple[list[Row], dict[str, Any]]:
    model, points = ember(), MAP_POINTS
    z, t = np.linspace(0.01, 1.0, points), np.linspace(0.2, 2.0, points)
    model.scan(z=z[:3], t=t[:3], levels=4, tolerance=TOLERANCE, progress=False)  # imports
    times, before = [], cpu_seconds()
    for _ in range(4):
        start = perf_counter()
        table = model.scan(z=z, t=t, levels=4, tolerance=TOLERANCE, progress=False)
        times.append(perf_counter() - start)
    ours, ours_cpu = median(times[1:]), (cpu_seconds() - before) / len(times)
    masses = (table["mass_real"] + 1j * table["mass_imaginary"]).transpose("t", "z", "level").values
    relative = table["error"].transpose("t", "z", "level").values / np.abs(masses)
    cutoff = max(plain_cutoff(0.2, float(value)) for value in np.linspace(0.05, 1.0, 20))
    rows = np.linspace(0, points - 1, 8).astype(int)
    sample_t, sample_z = np.repeat(t[rows], points), np.tile(z, len(rows))
    scale = points / len(rows)
    before = cpu_seconds()
    one = plain_seconds(cutoff, sample_t, sample_z, 1) * scale
    plain_cpu = (cpu_seconds() - before) * scale
    many = plain_seconds(cutoff, sample_t, sample_z, CORES) * scale
    apart = multiset_distance(masses[rows].reshape(-1, 3), plain_masses(cutoff, sample_t, sample_z))
    missed = float((relative > TOLERANCE).mean())
    found = {
        "first_seconds": times[0],
        "seconds": ours,
        "plain_seconds": one,
        "plain_seconds_on_threads": many,
        "ratio": one / ours,
        "ratio_to_threads": many / ours,
        "cpu_seconds": ours_cpu,
        "plain_cpu_seconds": plain_cpu,
        "cpu_ratio": plain_cpu / ours_cpu,
        "largest_relative_error": float(relative.max()),
        "share_of_masses_above_tolerance": missed,
        "plain_cutoff": cutoff,
        "plain_irreps": len(plain_tables(cutoff)[0]),
        "median_distance_to_plain": float(np.median(apart)),
        "largest_distance_to_plain": float(apart.max()),
        "cutoffs": [int(table["cutoff"].min()), int(table["cutoff"].max())],
    }
    name = f"{points} × {points} map in (z, t), 3 masses"
    script = f"plain script, {found['plain_irreps']} irreps ({len(sample_t):,} points, scaled)"
    return [
        (name, f"{ours:.2f} s", f"first time {times[0]:.2f} s", "1"),
        (script, f"{one:.1f} s", "aim 10 times slower", f"{one / ours:.1f}"),
        (f"its stacks handed to {CORES} threads by hand", f"{many:.1f} s", "", f"{many / ours:.1f}"),
        (
            "the first two in seconds of all processors together",
            f"{ours_cpu:.1f} s",
            f"plain {plain_cpu:.1f} s",
            f"{plain_cpu / ours_cpu:.1f}",
        ),
        ("masses above the tolerance", f"{missed:.2%}", f"error ≤ {relative.max():.1e}", "-"),
        (
            "distance to the plain script, median and largest",
            f"{np.median(apart):.1e}",
            f"{apart.max():.1e}",
            "-",
        ),
    ], found


WEAK = """
import json, resource, sys, time
sys.path.insert(0, {source!r})
import haarloom as hl
G = hl.SU(3)
model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
start = time.perf_counter()
spectrum = model.spectrum(levels=7, cutoff={cutoff}, t={t}, z={z})
first = time.perf_counter() - start
start = time.perf_counter()
model.spectrum(levels=7, cutoff={cutoff}, t={t}, z={z})
again = time.perf_counter() - start
print(json.dumps(dict(seconds=first, again=again, cutoff=spectrum.cutoff, irreps=len(spectrum.basis),
    error=float(spectrum.error.max()), solver=spectrum.solver, masses=[str(m) for m in spectrum.masses],
    peak_mb=resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024, before_mb=before / 1024)))
"""


def in_fresh_process(**given: Any) -> dict[str, Any]:
    script = WEAK.format(source=str(ROOT / "src"), **given)
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    return json.loads(done.stdout)


def bench_weak() -> tuple[list[Row], dict[str, Any]]:
    rows, found = [], {}
    for cutoff, z in ((None, 0.3), (None, 1.0), (101, 0.3), (140, 0.3)):
        got = in_fresh_process(cutoff=cutoff, t=0.002, z=z)
        name = f"t = 0.002, z = {z}, six masses, cutoff {got['cutoff']}{'' if cutoff else ' (chosen)'}"
        found[name] = got
        rows.append(
            (
                f"{name}, {got['irreps']:,} irreps",
                f"{got['seconds']:.2f} s",
                f"{got['peak_mb']:.0f} MB, again {got['again']:.2f} s",
                f"{2 / got['seconds']:.1f} of 2 s",
            )
        )
    start = perf_counter()
    got = found["t = 0.002, z = 0.3, six masses, cutoff 101"]
    values = np.linalg.eigvals(plain_matrices(plain_tables(60), np.array([0.002]), np.array([0.3])))[0]
    plain = (perf_counter() - start) * (got["irreps"] / 1891) ** 3
    rows.append(("plain script, one dense matrix of that size (scaled n³)", f"{plain:.0f} s", "", "1"))
    found["plain_seconds_scaled"] = plain
    found["plain_levels"] = len(values)
    return rows, found


LADDERS = {3: (31, 44, 62, 99, 140, 200, 315), 4: (13, 18, 27, 40, 65), 5: (8, 10, 14, 19, 32)}
"""Cutoffs from about 500 to about 50,000 irreps."""


def bench_apply() -> tuple[list[Row], dict[str, Any]]:
    from haarloom.numerics.truncation import truncate

    rows, found = [], {}
    for n, ladder in LADDERS.items():
        sizes, times = [], []
        for cutoff in ladder:
            truncation = truncate(sister(n), cutoff, {"t": 0.001, "z": 0.3})
            vector = np.random.default_rng(1).standard_normal(truncation.size)
            repeats = max(3, 200_000 // truncation.size)

            def many(truncation: Any = truncation, vector: Any = vector, repeats: int = repeats) -> None:
                for _ in range(repeats):
                    truncation.apply(vector)

            sizes.append(truncation.size)
            times.append(timed(many, 5) / repeats)
        power = exponent(sizes, times)
        found[f"SU({n})"] = {"irreps": sizes, "seconds": times, "exponent": power}
        name = f"SU({n}): one application, {sizes[0]:,} to {sizes[-1]:,} irreps"
        rows.append((name, f"{times[0] * 1e6:.0f} to {times[-1] * 1e6:.0f} µs", "n^1.1", f"n^{power:.2f}"))
    rows.append(_transform_row(found))
    return rows, found


def _transform_row(found: dict[str, Any]) -> Row:
    """The matrix-free operator: a loop field, whose W is dense, by fast transforms."""
    from haarloom.numerics.truncation import truncate

    G = hl.SU(3)
    model = hl.RingModel(hl.heat_kernel(G, "t"), hl.loop_field(G, {"3": "h"}))
    sizes, times = [], []
    for cutoff in LADDERS[3]:
        truncation = truncate(model, cutoff, {"t": 0.001, "h": 0.3})
        vector = np.random.default_rng(1).standard_normal(truncation.size)
        sizes.append(truncation.size)
        times.append(timed(lambda truncation=truncation, vector=vector: truncation.apply(vector), 7))
    power = exponent(sizes, times)
    found["SU(3) loop field, transforms"] = {"irreps": sizes, "seconds": times, "exponent": power}
    name = f"SU(3) loop field, transforms, {sizes[0]:,} to {sizes[-1]:,}"
    return (name, f"{times[0] * 1e6:.0f} to {times[-1] * 1e6:.0f} µs", "n^1.1", f"n^{power:.2f}")


def bench_solve() -> tuple[list[Row], dict[str, Any]]:
    rows, found = [], {}
    for n, ladder, t in ((3, LADDERS[3], 0.01), (4, LADDERS[4], 0.1), (5, LADDERS[5], 0.3)):
        model, sizes, times = sister(n), [], []
        for cutoff in ladder:
            sizes.append(model.group.count_irreps(cutoff))
            job = partial(model.spectrum, levels=7, cutoff=cutoff, t=t, z=0.3)
            times.append(timed(job, 1 if sizes[-1] > 10_000 else 3))
        power = exponent(sizes, times)
        found[f"SU({n}) fixed t = {t}"] = {"irreps": sizes, "seconds": times, "exponent": power}
        name = f"SU({n}): solve at fixed t = {t}, {sizes[0]:,} to {sizes[-1]:,} irreps"
        rows.append((name, f"{times[0]:.3f} to {times[-1]:.2f} s", "n^1.1", f"n^{power:.2f}"))
    for n, line in (
        (3, (0.01, 0.004, 0.002, 0.001, 0.0005, 0.0002)),
        (4, (0.2, 0.1, 0.05, 0.02)),
        (5, (0.5, 0.3, 0.2, 0.1)),
    ):
        model, sizes, times = sister(n), [], []
        for t in line:
            start = perf_counter()
            spectrum = model.spectrum(levels=7, t=t, z=0.3)
            times.append(perf_counter() - start)
            sizes.append(len(spectrum.right))
        power = exponent(sizes, times)
        found[f"SU({n}) t lowered"] = {"t": line, "irreps": sizes, "seconds": times, "exponent": power}
        name = f"SU({n}): solve, t from {line[0]} to {line[-1]}, {sizes[0]:,} to {sizes[-1]:,} irreps"
        rows.append((name, f"{times[0]:.3f} to {times[-1]:.2f} s", "n^1.6", f"n^{power:.2f}"))
    return rows, found


def _warm(executor: Executor, model: hl.RingModel, workers: int) -> None:
    """Start the workers and let each import what it needs."""
    axes = {"z": np.linspace(0.2, 0.3, 8), "t": np.linspace(0.5, 0.6, 34 * workers)}
    for _ in range(2):
        model.scan(executor=executor, progress=False, **axes)


def _scan_seconds(executor: Executor, model: hl.RingModel, points: int) -> float:
    z, t = np.linspace(0.01, 1.0, points), np.linspace(0.2, 2.0, points)
    start = perf_counter()
    table = model.scan(z=z, t=t, executor=executor, progress=False)
    assert table.attrs["complete"] == 1
    return perf_counter() - start


def pool(workers: int) -> ProcessPoolExecutor:
    return ProcessPoolExecutor(workers, mp_context=get_context("spawn"))


def bench_scan() -> tuple[list[Row], dict[str, Any]]:
    model, points, times = ember(), 384, {}
    for workers in (1, 2):
        with pool(workers) as executor:
            _warm(executor, model, workers)
            times[workers] = min(_scan_seconds(executor, model, points) for _ in range(2))
    found = {"points": points**2, "seconds": times, "speed_up": times[1] / times[2]}
    return [
        (
            f"scan of {points} × {points} points, {workers} process{'es' if workers > 1 else ''}",
            f"{seconds:.2f} s",
            f"{points**2 / seconds:,.0f} points/s",
            f"{times[1] / seconds:.2f}",
        )
        for workers, seconds in times.items()
    ], found


def bench_dask() -> tuple[list[Row], dict[str, Any]]:
    from dask.distributed import Client, LocalCluster

    model, points = ember(), 384
    with pool(2) as executor:
        _warm(executor, model, 2)
        plain = min(_scan_seconds(executor, model, points) for _ in range(2))
    with (
        LocalCluster(n_workers=2, threads_per_worker=1, processes=True, dashboard_address=None) as cluster,
        Client(cluster) as client,
        client.get_executor() as executor,
    ):
        _warm(executor, model, 2)
        dask = min(_scan_seconds(executor, model, points) for _ in range(2))
    found = {"points": points**2, "pool_seconds": plain, "dask_seconds": dask, "overhead": dask / plain - 1}
    return [
        (f"scan of {points} × {points} points, process pool of 2", f"{plain:.2f} s", "-", "1"),
        (
            "the same through a local Dask cluster of 2",
            f"{dask:.2f} s",
            f"{dask / plain - 1:+.0%}",
            f"{plain / dask:.2f}",
        ),
    ], found


SECTIONS = {
    "map": bench_map,
    "weak": bench_weak,
    "apply": bench_apply,
    "solve": bench_solve,
    "scan": bench_scan,
    "dask": bench_dask,
}


def keep(path: Path, section: str, found: dict[str, Any]) -> None:
    results = json.loads(path.read_text(encoding="utf-8")) if path.exists() else {}
    results[section] = found
    path.write_text(json.dumps(results, indent=1, default=float, ensure_ascii=False) + "\n", encoding="utf-8")


def main() -> None:
    parser = argparse.ArgumentParser(description="Benchmarks of the spectrum engine.")
    parser.add_argument("sections", nargs="*", metavar="SECTION", help=", ".join(SECTIONS))
    parser.add_argument("--json", type=Path, default=Path("bench_numerics.json"))
    arguments = parser.parse_args()
    unknown = set(arguments.sections) - set(SECTIONS)
    if unknown:
        parser.error(f"no section {', '.join(sorted(unknown))}: choose from {', '.join(SECTIONS)}")
    print(f"{CORES} cores, numpy {np.__version__}, Python {sys.version.split()[0]}")
    print(f"{'job':74} {'measured':>18} {'aim or detail':>22} {'ratio':>12}")
    for section in arguments.sections or SECTIONS:
        rows, found = SECTIONS[section]()
        for name, measured, detail, ratio in rows:
            print(f"{name:74} {measured:>18} {detail:>22} {ratio:>12}", flush=True)
        keep(arguments.json, section, found)


if __name__ == "__main__":
    main()
