"""Maps of masses over any number of parameters, on all cores, saved as they grow."""

from __future__ import annotations

import os
import warnings
from concurrent.futures import Executor
from pathlib import Path
from typing import TYPE_CHECKING, Any

from haarloom.numerics.scan_grid import ScanGrid, scan_grid
from haarloom.numerics.scan_run import ScanRun
from haarloom.numerics.scan_table import check_same_scan, empty_table, read_scan

if TYPE_CHECKING:
    import xarray

    from haarloom.ring.model import RingModel

__all__ = ["scan"]


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
        at each point, whether met or not. Where points are solved together from interpolated subspaces it
        counts their residuals to second order, with a resolvent of the other levels that is measured at
        some points; ``certify`` gives proofs.
    executor
        Any ``concurrent.futures.Executor``: a process pool, ``client.get_executor()`` of a Dask
        cluster. Left out, this process does the work on all cores, and shares it with worker processes
        where there is much of it.
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
    run = ScanRun(grid, table, None if file is None else Path(file))
    with run.progress_bar(progress):
        try:
            run.work(executor)
        except KeyboardInterrupt:
            run.save()
            warnings.warn(
                f"interrupted: {run.done:,} of {grid.points:,} points are done; repeat the call with the "
                "same file=, or with resume= this result, to go on.",
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
