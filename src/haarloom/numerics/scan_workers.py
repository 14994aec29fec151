"""Worker processes of our own for long scans."""

from __future__ import annotations

import pickle
import signal
import sys
from collections.abc import Callable, Iterator
from concurrent.futures import Future, ProcessPoolExecutor
from contextlib import contextmanager
from multiprocessing import get_context
from types import ModuleType
from typing import Any

__all__ = ["Workers", "sendable"]


class Workers:
    """Processes that start with the first job, while this process goes on working.

    Parameters
    ----------
    count
        Number of processes.
    """

    def __init__(self, count: int) -> None:
        # spawned, not forked: a kernel has threads, whose locks a fork would copy in any state
        self._pool = ProcessPoolExecutor(count, get_context("spawn"), initializer=_ignore_interrupts)

    def submit(self, job: Callable[..., Any], *arguments: Any) -> Future[Any]:
        """Hand a job over, like ``Executor.submit``."""
        with _main_out_of_sight():
            return self._pool.submit(job, *arguments)

    def stop(self) -> None:
        """End the processes after the jobs they are at; nobody waits for those."""
        self._pool.shutdown(wait=False, cancel_futures=True)


def sendable(*wanted: Any) -> bool:
    """Whether another process can receive something; a weight class of the running script it cannot."""
    with _main_out_of_sight():
        try:
            pickle.dumps(wanted)
        except (AttributeError, TypeError, ImportError, pickle.PicklingError):
            return False
    return True


def _ignore_interrupts() -> None:
    # Ctrl-C reaches the whole process group; only the process that runs the scan answers it
    signal.signal(signal.SIGINT, signal.SIG_IGN)


@contextmanager
def _main_out_of_sight() -> Iterator[None]:
    """Keep new worker processes from running the user's script again.

    A spawned process imports the main module of its parent; a script without the guard
    ``if __name__ == "__main__"`` would start the same scan there. Workers need haarloom alone.
    """
    main = sys.modules["__main__"]
    sys.modules["__main__"] = ModuleType("__main__")
    try:
        yield
    finally:
        sys.modules["__main__"] = main
