"""Maps of masses over any number of parameters, on all cores, saved as they grow."""

from __future__ import annotations

import os
import sys
import time
import warnings
from collections.abc import Iterator
from concurrent.futures import BrokenExecutor, Executor, Future, ProcessPoolExecutor, as_completed
from contextlib import contextmanager
from dataclasses import dataclass, field
from itertools import islice
from math import ceil
from multiprocessing import get_context
from pathlib import Path
from pickle import PicklingError
from types import ModuleType
from typing import TYPE_CHECKING, Any

from haarloom.exceptions import HaarloomError, ScanError
from haarloom.numerics.scan_chunk import solve_chunk
from haarloom.numerics.scan_grid import Chunk, ScanGrid, scan_grid
from haarloom.numerics.scan_table import check_same_scan, empty_table, fill, read_scan, save_scan

if TYPE_CHECKING:
    import xarray

    from haarloom.ring.model import RingModel

__all__ = ["scan"]

CHUNK_SECONDS = 1.0
"""Work in a chunk: long against the cost of sending it, short against what an interrupt may lose."""

POOL_SECONDS = 6.0
"""Remaining work from which starting worker processes pays."""

SAVE_SECONDS = 5.0
"""Shortest time between two writes of the result file."""

FIRST_POINTS = 8
"""Points of the first chunk, solved in this process to measure what a point costs."""

SLOW_POINT = 0.02
"""Seconds for a point from which rows are no longer solved together."""

LEAST_ROWS = 64
"""Rows of a chunk where whole rows are solved together: fewer would waste the nodes of the warm starts."""

WAVE = 8
"""Chunks handed out at once for each core; their cost sets the size of the next ones."""

BREAKDOWNS = 3
"""Broken worker pools in a row, without a chunk between, after which this process does the work."""


def scan(
    model: RingModel,
    levels: int = 4,
    tolerance: float = 1e-10,
    executor: Executor | None = None,
    file: str | os.PathLike[str] | None = None,
    resume: xarray.Dataset | None = None,
    progress: bool = True,
    **values: Any,
) -> xarray.Dataset:
    """Masses on a grid.

    Parameters
    ----------
    levels
        Eigenvalues at each point, the ground level included.
    tolerance
        Relative error of the masses that cutoffs are chosen for; ``error`` in the result is the bound
        at each point, whether met or not.
    executor
        Any ``concurrent.futures.Executor``: a process pool, ``client.get_executor()`` of a Dask
        cluster. Left out, a process pool is used where there is more than one core and enough work.
    file
        NetCDF file that the result is written to as it grows. If it holds part of the same scan, only
        what is missing is computed.
    resume
        A partial result of the same scan, in place of a file.
    progress
        Whether to show a progress bar (needs tqdm).
    **values
        A list or array for each axis, rising or falling; one number for each other parameter.

    Returns
    -------
    xarray.Dataset
        ``mass_real``, ``mass_imaginary``, ``error``, ``verdict`` over the axes and ``level``;
        ``ground_real``, ``ground_imaginary``, ``cutoff``, ``done`` over the axes; the model document
        and what was asked for in its attributes. After an interrupt it is partial
        (``attrs["complete"] == 0``) and a warning says so.

    Raises
    ------
    ParameterError, MissingValueError
        For bad axes or values, before anything is computed.
    DocumentError
        If the file is damaged, foreign, or belongs to another scan; it is left as it is.
    ScanError
        If the executor fails; what was done is in the file, and in ``partial`` of the error.

    Examples
    --------
    >>> import haarloom as hl
    >>> G = hl.SU(3)
    >>> model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    >>> table = scan(model, z=[0.1, 0.2, 0.3], t=1.0, progress=False)
    >>> dict(table.sizes)
    {'z': 3, 'level': 3}
    """
    grid = scan_grid(model, values, levels, tolerance)
    table = _table(grid, file, resume)
    run = _Run(grid, table, None if file is None else Path(file))
    with run.progress_bar(progress):
        try:
            run.work(executor)
        except KeyboardInterrupt:
            run.save()
            done = int(table["done"].values.sum())
            warnings.warn(
                f"interrupted: {done:,} of {grid.points:,} points are done; repeat the call with the same "
                "file=, or with resume= this result, to go on.",
                stacklevel=2,
            )
    run.save()
    return table


def _table(
    grid: ScanGrid, file: str | os.PathLike[str] | None, resume: xarray.Dataset | None
) -> xarray.Dataset:
    if resume is not None:
        check_same_scan(resume, grid, "the result given as resume")
        return resume.copy(deep=True)
    if file is not None and Path(file).exists():
        table = read_scan(file)
        check_same_scan(table, grid, str(file))
        return table
    return empty_table(grid)


@dataclass(eq=False)
class _Run:
    """The one mutable thing of a scan: the table that fills up, the size of chunks, and the last save."""

    grid: ScanGrid
    table: xarray.Dataset
    file: Path | None
    rows: int = 1
    columns: int = FIRST_POINTS
    saved: float = field(default_factory=time.monotonic)
    bar: Any = None

    def progress_bar(self, wanted: bool) -> Any:
        from contextlib import nullcontext

        if not wanted:
            return nullcontext()
        try:
            from tqdm.auto import tqdm
        except ImportError:
            return nullcontext()
        done = int(self.table["done"].values.sum())
        self.bar = tqdm(total=self.grid.points, initial=done, unit="point", desc="scan")
        return self.bar

    def save(self) -> None:
        if self.file is not None:
            save_scan(self.table, self.file)
            self.saved = time.monotonic()

    def keep(self, result: Any) -> None:
        before = int(self.table["done"].values.sum())
        fill(self.table, self.grid, result)
        if self.bar is not None:
            self.bar.update(int(self.table["done"].values.sum()) - before)
        if time.monotonic() - self.saved > SAVE_SECONDS:
            self.save()

    def missing(self) -> list[Chunk]:
        """Chunks of the present size that are not done, as many as are handed out at once."""
        done = self.table["done"].values == 1
        return list(islice(self.grid.chunks(self.rows, self.columns, done), WAVE * _workers()))

    @property
    def left(self) -> int:
        """Points that are not done."""
        return int((self.table["done"].values == 0).sum())

    def work(self, executor: Executor | None) -> None:
        seconds = self._measured()
        if executor is not None:
            self._through(executor)
        elif _workers() > 1 and seconds > POOL_SECONDS:
            self._through_own_pool()
        else:
            self._here()

    def _measured(self) -> float:
        """Estimated seconds of work left, from a small chunk or two; they set the size of the others."""
        each = self._one_chunk()
        columns = self.grid.shape[self.grid.plane[1]]
        if each > SLOW_POINT:
            self.rows, self.columns = 1, max(1, min(columns, ceil(CHUNK_SECONDS / each)))
            return each * self.left
        # whole rows are solved together, many times cheaper than point by point
        self.rows, self.columns = LEAST_ROWS, columns
        each = self._one_chunk()
        self.rows = max(LEAST_ROWS, ceil(CHUNK_SECONDS / max(each * columns, 1e-9)))
        return each * self.left

    def _one_chunk(self) -> float:
        """Solve the next chunk here: seconds for each of its points."""
        first = self.missing()
        if not first:
            return 0.0
        result = solve_chunk(self.grid, first[0])
        self.keep(result)
        return result.seconds / first[0].points

    def _resized(self, seconds: list[float]) -> None:
        """Make the next chunks smaller where the last ones took long, larger where they were short."""
        typical = sorted(seconds)[len(seconds) // 2]
        columns = self.grid.shape[self.grid.plane[1]]
        if typical > 2 * CHUNK_SECONDS and self.rows > 1:
            self.rows = max(1, self.rows // 2)
        elif typical > 2 * CHUNK_SECONDS:
            self.columns = max(1, self.columns // 2)
        elif typical < CHUNK_SECONDS / 4 and self.columns < columns:
            self.columns = min(columns, 2 * self.columns)
        elif typical < CHUNK_SECONDS / 4:
            self.rows *= 2

    def _here(self) -> None:
        while chunks := self.missing():
            result = solve_chunk(self.grid, chunks[0])
            self.keep(result)
            self._resized([result.seconds])

    def _through_own_pool(self) -> None:
        """Worker processes of our own: one that dies is replaced, and its chunk done again.

        What cannot be sent to another process, such as a weight class of the running script, is
        solved in this one.
        """
        breakdowns = 0
        while self.left:
            if breakdowns == BREAKDOWNS:
                return self._here()
            before = self.left
            with ProcessPoolExecutor(mp_context=get_context("spawn")) as pool, _main_out_of_sight():
                try:
                    self._collect(pool)
                except BrokenExecutor:
                    breakdowns = breakdowns + 1 if self.left == before else 0
                except (AttributeError, TypeError, ImportError, PicklingError):
                    return self._here()
        return None

    def _through(self, executor: Executor) -> None:
        try:
            self._collect(executor)
        except HaarloomError:
            raise
        except Exception as problem:
            self.save()
            done = int(self.table["done"].values.sum())
            where = f"in {self.file}" if self.file else "in the partial attribute of this error"
            failure = ScanError(
                f"the executor {type(executor).__name__} failed ({type(problem).__name__}: {problem}). "
                f"{done:,} of {self.grid.points:,} points are done and kept {where}: repeat the call with "
                "file= or resume=, and another executor or none."
            )
            failure.partial = self.table
            raise failure from problem

    def _collect(self, executor: Executor) -> None:
        """Hand out chunks, a wave at a time, and keep what comes back."""
        while chunks := self.missing():
            waiting: list[Future[Any]] = []
            seconds: list[float] = []
            broken: BaseException | None = None
            try:
                waiting += [executor.submit(solve_chunk, self.grid, chunk) for chunk in chunks]
                for future in as_completed(waiting):
                    problem = future.exception()
                    if problem is None:
                        self.keep(future.result())
                        seconds.append(future.result().seconds)
                    broken = broken or problem
            finally:
                for future in waiting:
                    future.cancel()
            if broken is not None:
                raise broken
            self._resized(seconds)


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


def _workers() -> int:
    return os.cpu_count() or 1
