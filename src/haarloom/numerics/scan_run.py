"""One scan under way: who solves which chunk, how large chunks are, what is kept and saved."""

from __future__ import annotations

import time
from collections.abc import Callable
from concurrent.futures import FIRST_COMPLETED, BrokenExecutor, Executor, Future, wait
from contextlib import nullcontext
from dataclasses import dataclass, field
from math import ceil
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.exceptions import HaarloomError, ScanError
from haarloom.numerics.scan_chunk import ChunkResult, solve_chunk
from haarloom.numerics.scan_grid import Chunk, ScanGrid
from haarloom.numerics.scan_table import fill, save_scan
from haarloom.numerics.scan_workers import Workers, sendable
from haarloom.numerics.threads import cores, cores_shared

if TYPE_CHECKING:
    import xarray

__all__ = ["ScanRun"]

CHUNK_SECONDS = 1.0
"""Most work in a chunk: long against the cost of sending it, short against what an interrupt may lose."""

POOL_SECONDS = 6.0
"""Estimated work left from which worker processes pay. They take seconds to start and to warm up, and
the estimate is high where the hard part of a map comes first."""

LONGEST_SECONDS = 30.0
"""Most work in a chunk where it has to be longer, for large bases: smaller ones waste the warm starts."""

GAIN = 4
"""How many times cheaper than single points whole rows are hoped to be, at least, when first tried."""

SAVE_SECONDS = 5.0
"""Shortest time between two writes of the result file."""

FIRST_POINTS = 8
"""Points of the first chunk, solved in this process: it shows whether they can be solved together."""

LEAST_ROWS = 32
"""Rows of a chunk where whole rows are solved together: fewer would waste the nodes of the warm starts."""

MOST_COLUMNS = 512
"""Columns of the first chunk of whole rows, whose cost is not known yet."""

WAVE = 8
"""Chunks with an executor at once for each core of this machine; how many it has itself is not known."""

BREAKDOWNS = 3
"""Broken worker pools in a row, without a chunk between, after which this process does the work."""


@dataclass(eq=False)
class ScanRun:
    """The one mutable thing of a scan: the table that fills up, the size of chunks, and the last save.

    Attributes
    ----------
    taken
        Points that are done or with a worker, shape of the grid.
    share
        Chunks that each core should still get; 0 where this process works alone.
    rows, columns
        Size of the next chunk.
    """

    grid: ScanGrid
    table: xarray.Dataset
    file: Path | None
    taken: NDArray[np.bool_] = field(init=False)
    share: int = 0
    rows: int = 1
    columns: int = FIRST_POINTS
    saved: float = field(default_factory=time.monotonic)
    bar: Any = None

    def __post_init__(self) -> None:
        self.taken = self.table["done"].values == 1

    @property
    def done(self) -> int:
        """Points that are done."""
        return int(self.table["done"].values.sum())

    def progress_bar(self, wanted: bool) -> Any:
        """A context with a bar that counts points; without tqdm an empty one."""
        if not wanted:
            return nullcontext()
        try:
            from tqdm.auto import tqdm
        except ImportError:
            return nullcontext()
        self.bar = tqdm(total=self.grid.points, initial=self.done, unit="point", desc="scan")
        return self.bar

    def save(self) -> None:
        """Write the table to its file, if it has one."""
        if self.file is not None:
            save_scan(self.table, self.file)
            self.saved = time.monotonic()

    def work(self, executor: Executor | None) -> None:
        """Solve what is missing, through an executor, or here with worker processes of our own."""
        self.share = 0 if executor is None else WAVE
        first = self._next()
        if first is None:
            return
        self._solve(first)
        if executor is not None:
            return self._through(executor)
        if self._seconds_left() > POOL_SECONDS and cores() > 1 and sendable(self.grid):
            self._with_workers()
        self._here()

    def _seconds_left(self) -> float:
        """Estimated work left, from one more chunk that is solved here."""
        chunk = self._next()
        if chunk is None:
            return 0.0
        return self._solve(chunk).seconds / chunk.points * (self.grid.points - self.done)

    def _solve(self, chunk: Chunk) -> ChunkResult:
        result = solve_chunk(self.grid, chunk)
        self._keep(result)
        return result

    def _here(self) -> None:
        self.taken = self.table["done"].values == 1
        while (chunk := self._next()) is not None:
            self._solve(chunk)

    def _next(self) -> Chunk | None:
        return next(iter(self.grid.chunks(self.rows, self.columns, self.taken)), None)

    def _keep(self, result: ChunkResult) -> None:
        before = self.done
        fill(self.table, self.grid, result)
        self.taken[result.chunk.index(self.grid)] = True
        self._resize(result)
        if self.bar is not None:
            self.bar.update(self.done - before)
        if time.monotonic() - self.saved > SAVE_SECONDS:
            self.save()

    def _resize(self, result: ChunkResult) -> None:
        """Size of the next chunk.

        A part of what is left, so that all are busy to the end (guided self-scheduling,
        C. D. Polychronopoulos, D. J. Kuck, *IEEE Trans. Comput.* C-36 (1987) 1425), within bounds.
        """
        columns = self.grid.shape[self.grid.plane[1]]
        points = CHUNK_SECONDS * result.chunk.points / max(result.seconds, 1e-9)
        if not result.together:
            self.rows, self.columns = 1, int(np.clip(points, 1, columns))
        elif result.chunk.points <= FIRST_POINTS:
            # solved densely: a point of a whole row is many times cheaper
            rough = points / CHUNK_SECONDS * LONGEST_SECONDS * GAIN / LEAST_ROWS
            self.rows, self.columns = LEAST_ROWS, int(np.clip(rough, 1, min(columns, MOST_COLUMNS)))
        else:
            rows_left = ceil((self.taken.size - int(self.taken.sum())) / columns)
            even = ceil(rows_left / (2 * self.share * cores())) if self.share else rows_left
            square = points / CHUNK_SECONDS * LONGEST_SECONDS >= LEAST_ROWS**2
            self.rows = max(LEAST_ROWS, min(even, int(points / columns)))
            least = min(columns, LEAST_ROWS) if square else 1
            self.columns = int(np.clip(points / LEAST_ROWS, least, columns))

    def _with_workers(self) -> None:
        """Share the chunks with worker processes, one on each other core; one that dies is replaced."""
        self.share, breakdowns = 1, 0
        while breakdowns < BREAKDOWNS and self.done < self.grid.points:
            workers = Workers(cores() - 1)
            handed = _Handed(self, workers.submit, 2 * (cores() - 1))
            try:
                with cores_shared():
                    handed.work(helping=True)
            except BrokenExecutor:
                breakdowns = 0 if handed.heard else breakdowns + 1
            finally:
                workers.stop()
        self.share = 0

    def _through(self, executor: Executor) -> None:
        try:
            _Handed(self, executor.submit, WAVE * cores()).work(helping=False)
        except HaarloomError:
            raise
        except Exception as problem:
            self.save()
            where = f"in {self.file}" if self.file else "in the partial attribute of this error"
            failure = ScanError(
                f"the executor {type(executor).__name__} failed ({type(problem).__name__}: {problem}). "
                f"{self.done:,} of {self.grid.points:,} points are done and kept {where}: repeat the call "
                "with file= or resume=, and another executor or none."
            )
            failure.partial = self.table
            raise failure from problem


@dataclass(eq=False)
class _Handed:
    """Chunks handed out until all points are done, or until handing out fails.

    Attributes
    ----------
    most
        Chunks handed out at once.
    heard
        Whether any result has come back.
    """

    run: ScanRun
    submit: Callable[..., Future[Any]]
    most: int
    waiting: dict[Future[Any], Chunk] = field(default_factory=dict)
    heard: bool = False

    def work(self, helping: bool) -> None:
        """Hand out chunks and keep what comes back; if ``helping``, solve some in this process."""
        run = self.run
        run.taken = run.table["done"].values == 1
        try:
            while run.done < run.grid.points:
                self._hand_out()
                chunk = self._own() if helping else None
                if chunk is not None:
                    run._solve(chunk)
                self._collect(block=chunk is None)
        finally:
            for future in self.waiting:
                future.cancel()

    def _hand_out(self) -> None:
        run = self.run
        while len(self.waiting) < self.most and (chunk := run._next()) is not None:
            self.waiting[self.submit(solve_chunk, run.grid, chunk)] = chunk
            run.taken[chunk.index(run.grid)] = True

    def _own(self) -> Chunk | None:
        """A chunk for this process: a free one or, while the workers are still starting, one of theirs."""
        run = self.run
        free = run._next()
        if free is not None or self.heard:
            return free
        done = run.table["done"].values
        return next((chunk for chunk in self.waiting.values() if not done[chunk.index(run.grid)].all()), None)

    def _collect(self, block: bool) -> None:
        if block:
            wait(self.waiting, return_when=FIRST_COMPLETED)
        problem: BaseException | None = None
        for future in [future for future in self.waiting if future.done()]:
            chunk = self.waiting.pop(future)
            problem = problem or future.exception()
            if future.exception() is None:
                self.heard = True
                self.run._keep(future.result())
            else:
                self.run.taken[chunk.index(self.run.grid)] = False
        if problem is not None:
            raise problem
