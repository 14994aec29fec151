"""Where a table of coefficients by irrep may come from: a mapping, a CSV file, an array."""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np

from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ParameterError, SizeError

__all__ = ["coefficient_mapping"]

_MOST_ROWS = 100_000


def coefficient_mapping(group: SU, source: Any) -> Mapping[Irrep | str, Any]:
    """A mapping from irreps to raw values, whatever the source was.

    Parameters
    ----------
    group : SU
    source : mapping, str, Path or array
        A mapping is taken as it is. Text or a path names a CSV file with a header, either ``irrep,k``
        (trade names) or ``a1,…,a{N−1},k`` (Dynkin labels). An array of one dimension lists k_r in basis
        order; one of N − 1 dimensions is indexed by the labels.
    """
    if isinstance(source, Mapping):
        return source
    if isinstance(source, str | Path):
        return _from_csv(group, Path(source))
    if isinstance(source, Sequence | np.ndarray):
        return _from_array(group, np.asarray(source))
    raise ParameterError(
        f"coefficients = {type(source).__name__} is no table: give a mapping from irreps to values, the "
        f"path of a CSV "
        "file, or an array."
    )


def _from_array(group: SU, array: Any) -> dict[Irrep | str, Any]:
    if array.dtype == object or not np.issubdtype(array.dtype, np.number):
        raise ParameterError(
            f"An array of {array.dtype} given; an array of coefficients must hold numbers: for expressions "
            "use a mapping."
        )
    if array.ndim == 1:
        cutoff = 0
        while group.count_irreps(cutoff) < len(array):
            cutoff += 1
        return {irrep: value.item() for irrep, value in zip(group.irreps(cutoff), array, strict=False)}
    if array.ndim == group.rank:
        return {group.irrep(*map(int, place)): value.item() for place, value in np.ndenumerate(array)}
    raise ParameterError(
        f"An array of shape {array.shape} is no table for {group}: give k_r in basis order (one dimension) "
        f"or by labels "
        f"({group.rank} dimensions)."
    )


def _from_csv(group: SU, path: Path) -> dict[Irrep | str, Any]:
    try:
        with path.open(newline="", encoding="utf-8") as file:
            rows = [row for row in csv.reader(file) if any(cell.strip() for cell in row)]
    except (OSError, UnicodeDecodeError) as problem:
        raise ParameterError(
            f"The table {path} cannot be read ({problem}); give the path of a CSV file."
        ) from None
    if len(rows) > _MOST_ROWS:
        raise SizeError(
            f"The table {path} has {len(rows):,} rows, more than {_MOST_ROWS:,}; keep the irreps that matter."
        )
    head = [cell.strip().lower() for cell in rows[0]] if rows else []
    by_name, by_labels = ["irrep", "k"], [*(f"a{i}" for i in range(1, group.n)), "k"]
    if head not in (by_name, by_labels):
        raise ParameterError(
            f"The table {path} must begin with the line {','.join(by_name)} or {','.join(by_labels)}; "
            f"found {','.join(head) or 'nothing'}."
        )
    found: dict[Irrep | str, Any] = {}
    for line, row in enumerate(rows[1:], start=2):
        cells = [cell.strip() for cell in row]
        irrep = _row_irrep(group, cells, head == by_name, f"{path}, line {line}")
        if irrep in found:
            raise ParameterError(
                f"{path}, line {line}: the irrep {irrep.name} occurs twice; keep one of the two."
            )
        found[irrep] = row[-1].strip()
    return found


def _row_irrep(group: SU, cells: list[str], named: bool, place: str) -> Irrep:
    width = 2 if named else group.n
    if len(cells) != width:
        what = "a name and k" if named else f"{group.rank} labels and k"
        raise ParameterError(f"{place}: {len(cells)} cells found, {width} are needed; write {what}.")
    if named:
        return group.irrep(cells[0])
    if not all(cell.isdigit() for cell in cells[:-1]):
        raise ParameterError(
            f"{place}: {', '.join(cells[:-1])} found; labels are whole numbers ≥ 0, write them without signs."
        )
    return group.irrep(*map(int, cells[:-1]))
