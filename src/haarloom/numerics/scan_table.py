"""The result of a scan as an xarray.Dataset: built, filled chunk by chunk, saved to NetCDF and read back."""

from __future__ import annotations

import json
import os
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from haarloom.exceptions import DocumentError
from haarloom.numerics.scan_chunk import ChunkResult
from haarloom.numerics.scan_grid import ScanGrid
from haarloom.numerics.verdicts import UNDECIDED, VERDICTS, verdict_words

if TYPE_CHECKING:
    import xarray

__all__ = ["check_same_scan", "empty_table", "fill", "read_scan", "save_scan", "scan_masses", "verdict_table"]

FORMAT = "Haarloom scan"
VERSION = 1

_MASS = {"units": "1 / lattice spacing", "long_name": "m_n = -ln(λ_n/λ_0)"}


def empty_table(grid: ScanGrid) -> xarray.Dataset:
    """A dataset of the grid's shape with nothing done."""
    import xarray

    from haarloom import __version__

    points, masses = grid.names, (*grid.names, "level")
    full = (*grid.shape, grid.levels - 1)
    data = {
        "mass_real": (masses, np.full(full, np.nan), {**_MASS, "description": "inverse decay length"}),
        "mass_imaginary": (masses, np.full(full, np.nan), {**_MASS, "description": "wave number in (-π, π]"}),
        "error": (masses, np.full(full, np.inf), {**_MASS, "long_name": "bound of the error of the mass"}),
        "verdict": (
            masses,
            np.full(full, VERDICTS.index(UNDECIDED), dtype=np.int8),
            {
                "long_name": "what the error allows to say",
                "flag_values": np.arange(len(VERDICTS), dtype=np.int8),
                "flag_meanings": " ".join(word.replace(" ", "_") for word in VERDICTS),
            },
        ),
        "ground_real": (points, np.full(grid.shape, np.nan), {"long_name": "Re λ_0"}),
        "ground_imaginary": (points, np.full(grid.shape, np.nan), {"long_name": "Im λ_0"}),
        "cutoff": (
            points,
            np.full(grid.shape, -1, dtype=np.int32),
            {"long_name": "K of the basis Σ a_i ≤ K"},
        ),
        "done": (points, np.zeros(grid.shape, dtype=np.int8), {"long_name": "1 where the point was solved"}),
    }
    coordinates = {name: (name, axis) for name, axis in zip(grid.names, grid.axes, strict=True)}
    attributes = {
        "format": FORMAT,
        "version": VERSION,
        "haarloom": __version__,
        "model": _model_text(grid),
        "fixed": json.dumps({name: _plain(value) for name, value in sorted(grid.fixed.items())}),
        "levels": grid.levels,
        "tolerance": grid.tolerance,
        "complete": 0,
        "notes": "",
    }
    levels = {"level": ("level", np.arange(1, grid.levels))}
    return xarray.Dataset(data, coordinates | levels, attributes)


def _plain(value: float | complex) -> Any:
    return value if isinstance(value, float) else [value.real, value.imag]


def _model_text(grid: ScanGrid) -> str:
    """The model document, or the model's text where documents do not know its weights."""
    from haarloom.documents.model_document import ModelDocument, to_document

    try:
        return json.dumps(to_document(ModelDocument(grid.model, levels=grid.levels)), ensure_ascii=False)
    except DocumentError:
        return repr(grid.model)


def fill(table: xarray.Dataset, grid: ScanGrid, result: ChunkResult) -> None:
    """Write the result of a chunk into the arrays of the table."""
    index = result.chunk.index(grid)
    parts: dict[str, Any] = {
        "mass_real": result.masses.real,
        "mass_imaginary": result.masses.imag,
        "error": result.error,
        "verdict": result.verdicts,
        "ground_real": result.ground.real,
        "ground_imaginary": result.ground.imag,
        "cutoff": result.cutoff,
        "done": np.ones(result.cutoff.shape, dtype=np.int8),
    }
    for name, part in parts.items():
        if result.chunk.turned(grid):
            part = np.swapaxes(part, 0, 1)
        target = table[name].values
        target[index] = part.reshape(target[index].shape)
    if result.note and not table.attrs["notes"]:
        table.attrs["notes"] = result.note
    table.attrs["complete"] = int(bool(table["done"].values.all()))


def save_scan(table: xarray.Dataset, path: str | os.PathLike[str]) -> Path:
    """Write a scan to NetCDF, beside the target first, then into its place: never half a file."""
    target = Path(path)
    beside = target.with_name(f".{target.name}.{os.getpid()}.part")
    try:
        table.to_netcdf(beside)
        os.replace(beside, target)
    finally:
        beside.unlink(missing_ok=True)
    return target


def read_scan(path: str | os.PathLike[str]) -> xarray.Dataset:
    """Read a scan, complete or not.

    Raises
    ------
    DocumentError
        If the file is damaged, or no scan of Haarloom.
    """
    import xarray

    try:
        with xarray.open_dataset(path) as opened:
            table = opened.load()
    except FileNotFoundError:
        raise
    except Exception as problem:
        raise DocumentError(
            f"{path} cannot be read as NetCDF ({type(problem).__name__}): it is damaged or another kind of "
            "file. It was left as it is; give another file name, or move it away to start afresh."
        ) from None
    if table.attrs.get("format") != FORMAT or not {"mass_real", "error", "done"} <= set(table.data_vars):
        raise DocumentError(
            f"{path} holds no scan of Haarloom (format {table.attrs.get('format', 'unknown')!r}): "
            "it was left as it is; give another file name."
        )
    return table


def check_same_scan(table: xarray.Dataset, grid: ScanGrid, source: str) -> None:
    """Make sure that a table belongs to this scan before it is filled further.

    Raises
    ------
    DocumentError
        If model, axes, fixed values, levels or tolerance differ; the message names the first difference.
    """
    wanted = empty_table(grid)
    for name in ("model", "fixed", "levels", "tolerance"):
        if table.attrs.get(name) != wanted.attrs[name]:
            raise DocumentError(
                f"{source} belongs to another scan: its {name} is {table.attrs.get(name)!r}, "
                f"not {wanted.attrs[name]!r}. Give another file name, or repeat the scan as it was."
            )
    for name, axis in zip(grid.names, grid.axes, strict=True):
        if name not in table.coords or not np.array_equal(table[name].values, axis):
            raise DocumentError(
                f"{source} belongs to another scan: the values of {name} differ. "
                "Give another file name, or repeat the scan as it was."
            )


def scan_masses(table: xarray.Dataset) -> xarray.DataArray:
    """Complex masses of a scan."""
    masses = table["mass_real"] + 1j * table["mass_imaginary"]
    masses.attrs = dict(_MASS)
    return masses


def verdict_table(table: xarray.Dataset) -> xarray.DataArray:
    """Verdicts of a scan in words."""
    return table["verdict"].copy(data=verdict_words(table["verdict"].values))
