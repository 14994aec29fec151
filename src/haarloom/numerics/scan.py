"""Maps of masses over any number of parameters, on all cores, saved as they grow."""

from __future__ import annotations

import os
import time
import warnings
from concurrent.futures import BrokenExecutor, Executor, Future, ProcessPoolExecutor, as_completed
from dataclasses import dataclass, field
from math import ceil
from multiprocessing import get_context
from pathlib import Path
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

POOL_SECONDS = 3.0
"""Remaining work from which starting worker processes pays."""

SAVE_SECONDS = 5.0
"""Shortest time between two writes of the result file."""

FIRST_ROWS = 32
"""Rows solved in this process, to measure what a row costs."""

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
        cluster. Left out, a process pool is used where there is more than one core and enough work;
        in a script the call then belongs under ``if __name__ == "__main__":``.
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
    """The one mutable thing of a scan: the table that fills up, and when it was last saved."""

    grid: ScanGrid
    table: xarray.Dataset
    file: Path | None
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

    def missing(self, rows: int) -> list[Chunk]:
        return list(self.grid.chunks(rows, self.table["done"].values == 1))

    def work(self, executor: Executor | None) -> None:
        rows, seconds = self._measured()
        chunks = self.missing(rows)
        if not chunks:
            return
        if executor is not None:
            self._through(executor, chunks)
        elif (os.cpu_count() or 1) > 1 and len(chunks) > 1 and seconds > POOL_SECONDS:
            self._through_own_pool(rows)
        else:
            self._here(chunks)

    def _measured(self) -> tuple[int, float]:
        """Rows for a chunk, and seconds of work left, from the time that a first small chunk takes."""
        first = self.missing(FIRST_ROWS)
        if not first:
            return FIRST_ROWS, 0.0
        start = time.perf_counter()
        self.keep(solve_chunk(self.grid, first[0]))
        each = (time.perf_counter() - start) / (first[0].stop - first[0].start)
        left = int((self.table["done"].values == 0).sum())
        columns = self.grid.shape[self.grid.plane[1]]
        return max(FIRST_ROWS, ceil(CHUNK_SECONDS / each)), each * left / columns

    def _here(self, chunks: list[Chunk]) -> None:
        for chunk in chunks:
            self.keep(solve_chunk(self.grid, chunk))

    def _through_own_pool(self, rows: int) -> None:
        """Worker processes of our own: one that dies is replaced, and its chunk done again."""
        breakdowns = 0
        while chunks := self.missing(rows):
            if breakdowns == BREAKDOWNS:
                return self._here(chunks)
            before = len(chunks)
            with ProcessPoolExecutor(mp_context=get_context("spawn")) as pool:
                try:
                    self._collect(pool, chunks)
                except BrokenExecutor:
                    breakdowns = breakdowns + 1 if len(self.missing(rows)) == before else 0
        return None

    def _through(self, executor: Executor, chunks: list[Chunk]) -> None:
        try:
            self._collect(executor, chunks)
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

    def _collect(self, executor: Executor, chunks: list[Chunk]) -> None:
        waiting: list[Future[Any]] = []
        broken: BaseException | None = None
        try:
            waiting += [executor.submit(solve_chunk, self.grid, chunk) for chunk in chunks]
            for future in as_completed(waiting):
                problem = future.exception()
                if problem is None:
                    self.keep(future.result())
                broken = broken or problem
        finally:
            for future in waiting:
                future.cancel()
        if broken is not None:
            raise broken
