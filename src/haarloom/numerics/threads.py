"""Threads: one in BLAS, several of our own over stacks of matrices.

The matrices of a truncated T are small: handing each to several threads costs more than it saves, and
stalls where other processes hold the cores. A stack of them is cut into one part for each core.
"""

from __future__ import annotations

import threading
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from functools import lru_cache, wraps
from itertools import pairwise
from multiprocessing import parent_process
from os import cpu_count
from typing import Any, ParamSpec, TypeVar

__all__ = ["cores", "cores_shared", "in_parallel", "single_threaded", "split"]

P = ParamSpec("P")
R = TypeVar("R")
T = TypeVar("T")


def cores() -> int:
    """Processors this process may use."""
    try:
        from os import sched_getaffinity
    except ImportError:
        return cpu_count() or 1
    return len(sched_getaffinity(0))


def single_threaded(function: Callable[P, R]) -> Callable[P, R]:
    """Run a function with BLAS on one thread; several threads of Python may be inside at once."""

    @wraps(function)
    def wrapped(*arguments: P.args, **keywords: P.kwargs) -> R:
        with _limited():
            return function(*arguments, **keywords)

    return wrapped


def in_parallel(job: Callable[[T], R], parts: Sequence[T]) -> Iterator[R]:
    """Results of a job for each part, in order.

    Of use for jobs that spend their time in few long calls of NumPy, which let other threads run. A
    job must not call this function itself: all threads could be waiting for a free one.
    """
    if len(parts) < 2 or _threads() < 2:
        return map(job, parts)
    return _pool().map(job, parts)


def split(length: int, least: int) -> list[slice]:
    """A stack in equal parts, one for each thread, none shorter than ``least``."""
    count = max(1, min(_threads(), length // least))
    edges = [length * part // count for part in range(count + 1)]
    return [slice(start, stop) for start, stop in pairwise(edges)]


@contextmanager
def cores_shared() -> Iterator[None]:
    """While worker processes have the other cores, this process keeps to one thread."""
    _SHARED.append(True)
    try:
        yield
    finally:
        _SHARED.pop()


_SHARED: list[bool] = []


def _threads() -> int:
    # a process that was started by another shares the cores with its siblings
    return 1 if _SHARED or parent_process() is not None else cores()


@lru_cache(maxsize=1)
def _pool() -> ThreadPoolExecutor:
    return ThreadPoolExecutor(cores(), thread_name_prefix="haarloom")


@contextmanager
def _limited() -> Iterator[None]:
    """The limit holds for the whole process: whoever sets it lifts it, and others inside leave it alone."""
    if not _SETTING.acquire(blocking=False):
        yield
        return
    try:
        with _controller().limit(limits=1, user_api="blas"):
            yield
    finally:
        _SETTING.release()


_SETTING = threading.Lock()


@lru_cache(maxsize=1)
def _controller() -> Any:
    # the controller sees only what is loaded: SciPy brings a BLAS of its own
    import scipy.linalg  # noqa: F401
    from threadpoolctl import ThreadpoolController

    return ThreadpoolController()
