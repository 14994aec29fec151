"""What one writes by hand with NumPy for Ember-I (invented): T put together for many points at once."""

from __future__ import annotations

from collections.abc import Callable
from statistics import median
from time import perf_counter
from typing import Any

import numpy as np

Tables = tuple[np.ndarray, np.ndarray]


def plain_tables(cutoff: int) -> Tables:
    """Casimirs, and which elements hold z: neighbours by one box. The transpose holds z²."""
    labels = [(p, level - p) for level in range(cutoff + 1) for p in range(level, -1, -1)]
    place = {pair: i for i, pair in enumerate(labels)}
    casimir = np.array([(p * p + q * q + p * q) / 3 + p + q for p, q in labels])
    up = np.zeros((len(labels),) * 2)
    for (p, q), column in place.items():
        for row in ((p + 1, q), (p - 1, q + 1), (p, q - 1)):
            if row in place:
                up[place[row], column] = 1
    return casimir, up


def plain_matrices(tables: Tables, t: np.ndarray, z: np.ndarray) -> np.ndarray:
    """T at many points, shape (M, n, n)."""
    casimir, up = tables
    roots = np.exp(-t[:, None] / 2 * casimir)
    z = z[:, None, None]
    site = (1 + z**3) * np.eye(len(casimir)) + z * up + z**2 * up.T
    return roots[:, :, None] * site * roots[:, None, :]


def timed(job: Callable[[], Any], repeats: int) -> float:
    """Median time of a job that has run once before."""
    job()
    times = []
    for _ in range(repeats):
        start = perf_counter()
        job()
        times.append(perf_counter() - start)
    return median(times)
