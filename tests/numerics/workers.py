"""Jobs that tell where they run; in a module of its own, so that spawned processes can import it."""

from __future__ import annotations

import os
import time
from pathlib import Path
from typing import Any

from haarloom.numerics.scan_chunk import solve_chunk

MEASURED = 2
"""Chunks that a scan solves in its own process before it starts workers."""

PATIENCE = 60.0
"""Seconds after which nobody waits any more for a worker."""


class KilledOnce:
    """Stands for ``solve_chunk``: the first worker process that is given a chunk dies in the middle of it.

    The process of the scan waits for that once the workers may have started: it would be done before.
    """

    def __init__(self, flag: str) -> None:
        self.flag, self.home, self.calls = flag, os.getpid(), 0

    def __call__(self, grid: Any, chunk: Any) -> Any:
        if os.getpid() != self.home:
            try:
                os.close(os.open(self.flag, os.O_CREAT | os.O_EXCL))
            except FileExistsError:
                pass
            else:
                os._exit(1)
        self.calls += 1
        if os.getpid() == self.home and self.calls > MEASURED:
            wait_for(Path(self.flag).exists)
        return solve_chunk(grid, chunk)


class SlowAtHome:
    """Stands for ``solve_chunk``: notes which process solves, and lets the workers catch up."""

    def __init__(self, folder: str) -> None:
        self.folder, self.home, self.calls = folder, os.getpid(), 0

    def __call__(self, grid: Any, chunk: Any) -> Any:
        self.calls += 1
        if os.getpid() != self.home:
            Path(self.folder, str(os.getpid())).touch()
        elif self.calls > MEASURED:
            wait_for(lambda: any(Path(self.folder).iterdir()))
        return solve_chunk(grid, chunk)


def wait_for(happened: Any) -> None:
    start = time.monotonic()
    while not happened() and time.monotonic() - start < PATIENCE:
        time.sleep(0.01)
