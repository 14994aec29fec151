"""What a pane's constructor is given, checked before anything is built from it."""

from __future__ import annotations

from collections.abc import Mapping
from math import isfinite
from typing import TYPE_CHECKING, Any

from haarloom.exceptions import ParameterError, SizeError

if TYPE_CHECKING:
    from haarloom.algebra.group import SU
    from haarloom.ring.model import RingModel

__all__ = [
    "brisk_cutoff",
    "checked_choice",
    "checked_element",
    "checked_mapping",
    "checked_model",
    "checked_span",
    "checked_weight",
    "drawable_cutoff",
    "scannable_cutoff",
]

MOST_ROWS = 100
"""Largest grid: 10,000 cells are what a page draws at once and an eye still scans."""

MOST_SCANNED = 250
"""Largest basis for a scan: 200 matrices of that size take some seconds and 100 MB."""

BRISK = 60
"""Irreps up to which a scan of 200 points follows a slider without a wait."""

_MARKS = {"link": "largest_outside", "site": "norm_bound"}
_MAKERS = {"link": 'heat_kernel(G, "t")', "site": 'static_fermions(G, "z")'}


def checked_model(model: Any) -> RingModel:
    """The model, or a ParameterError that says what one is."""
    from haarloom.ring.model import RingModel

    if not isinstance(model, RingModel):
        raise ParameterError(
            f"model = {model!r} is no ring model: give RingModel(link, site), "
            'for instance hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z")).'
        )
    return model


def checked_weight(family: str, weight: Any) -> Any:
    """A link or site weight, or a ParameterError that says what one is."""
    if not hasattr(weight, _MARKS[family]):
        raise ParameterError(
            f"weight = {weight!r} is no {family} weight: build one with the functions of haarloom.actions, "
            f"for instance hl.{_MAKERS[family]}."
        )
    return weight


def checked_span(name: str, span: Any) -> tuple[float, float]:
    """The two ends of a range, the lower one first."""
    try:
        low, high = (float(end) for end in span)
    except (TypeError, ValueError):
        raise ParameterError(f"{name} = {span!r} is no range: give two numbers, e.g. (0, 2).") from None
    if not (isfinite(low) and isfinite(high) and low < high):
        raise ParameterError(
            f"{name} = {span!r} is no range: the first number must be below the second, both finite."
        )
    return low, high


def checked_choice(name: str, given: Any, allowed: Any) -> str:
    """One of the allowed words."""
    words = [str(word) for word in allowed]
    if given not in words:
        raise ParameterError(f"{name} = {given!r} is not allowed: choose from {', '.join(words) or 'none'}.")
    return str(given)


def checked_element(model: RingModel, cutoff: int, element: Any) -> tuple[str, str]:
    """Names of row and column, both inside the basis; the trivial irrep twice where left out."""
    if element is None:
        return (model.group.trivial.name, model.group.trivial.name)
    if isinstance(element, str) or not hasattr(element, "__len__") or len(element) != 2:
        raise ParameterError(
            f"element = {element!r} names no element: give a row and a column, for instance "
            f'("{model.group.fundamental.name}", "{model.group.trivial.name}").'
        )
    row, column = (model.group.irrep(irrep) for irrep in element)
    for irrep in (row, column):
        if sum(irrep.labels) > cutoff:
            raise ParameterError(
                f"element = {element!r}: irrep {irrep.name} with labels {irrep.labels} lies outside "
                f"the basis Σ a_i ≤ {cutoff}: take cutoff ≥ {sum(irrep.labels)}."
            )
    return (row.name, column.name)


def brisk_cutoff(group: SU, most: int, irreps: int = BRISK) -> int:
    """The largest K ≤ ``most`` whose basis has at most so many irreps, and at least 1.

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> [brisk_cutoff(SU(n), 6) for n in (2, 3, 4, 5, 8)]
    [6, 6, 5, 3, 2]
    """
    return next((k for k in range(most, 1, -1) if group.count_irreps(k) <= irreps), 1)


def drawable_cutoff(group: SU, cutoff: int) -> int:
    """The cutoff, if a grid can show its basis."""
    size = group.count_irreps(cutoff)
    if size > MOST_ROWS:
        raise SizeError(
            f"cutoff K = {cutoff} means {size:,} irreps; a grid shows at most {MOST_ROWS}: take a smaller "
            f"cutoff here, or work with model.transfer_matrix(cutoff={cutoff}) in a cell."
        )
    return cutoff


def scannable_cutoff(group: SU, cutoff: int, points: int) -> int:
    """The cutoff, if a scan over so many points can follow a slider with it."""
    size = group.count_irreps(cutoff)
    if size > MOST_SCANNED:
        raise SizeError(
            f"cutoff K = {cutoff} means {size:,} irreps at each of {points} points; a pane that follows "
            f"sliders is limited to {MOST_SCANNED}. Take a smaller cutoff, or work with "
            f"model.spectrum(cutoff={cutoff}, …) in a cell."
        )
    return cutoff


def checked_mapping(name: str, given: Any) -> Mapping[str, Any]:
    """A mapping, empty where nothing is given."""
    if given is None:
        return {}
    if not isinstance(given, Mapping):
        raise ParameterError(f'{name} = {given!r} is no table: give a dictionary such as {{"z": 0.3}}.')
    return given
