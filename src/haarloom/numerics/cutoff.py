"""How many irreps: a cutoff raised until the truncation bound meets a tolerance."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to
from haarloom.algebra.whole_numbers import whole_number
from haarloom.exceptions import ConvergenceError, ParameterError
from haarloom.numerics.bounds import eigenvalue_errors, mass_errors
from haarloom.numerics.dense import EigenSystem
from haarloom.numerics.link_numbers import link_coefficients
from haarloom.numerics.solve import solve
from haarloom.numerics.truncation import Truncation, truncate

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["LARGEST", "automatic_truncation", "checked_levels", "closing_cutoff", "smallest_cutoff"]

LARGEST = 60_000
"""Most irreps in an automatic basis."""


def smallest_cutoff(rank: int, irreps: int) -> int:
    """Smallest K whose basis has at least this many irreps."""
    cutoff = 0
    while count_up_to(rank, cutoff) < irreps:
        cutoff += 1
    return cutoff


def closing_cutoff(model: RingModel, levels: int, values: Mapping[str, Any]) -> int:
    """First K at which ‖W‖ max|k| beyond the basis falls below the guessed size of the last level.

    The guess is a third of the ``levels``-th largest |k_r| times the mean of W. For a link that mixes
    irreps the search starts at the smallest basis.

    Raises
    ------
    ConvergenceError
        If no basis of 60,000 irreps gets there: the link coefficients do not fall.
    """
    rank = model.group.rank
    first = smallest_cutoff(rank, levels + 2)
    if not model.link.diagonal:
        return first
    k, _ = link_coefficients(model.link, first + 2, values)
    weakest = np.sort(np.abs(k))[::-1][levels - 1]
    mean = abs(complex(np.max(model.site.coefficients_at((model.group.trivial,), values)[0])))
    norm = float(np.max(model.site.norm_bound(values)))
    wanted = weakest * max(mean, 1e-3 * norm) / (3 * norm)
    cutoff = first
    while _outside(model, cutoff, values) > wanted:
        cutoff += 1
        if count_up_to(rank, cutoff) > LARGEST:
            raise ConvergenceError(
                f"the truncation bound does not close at {dict(values)}: beyond {LARGEST:,} irreps "
                f"|k_r| still reaches {_outside(model, cutoff - 1, values):.2g}, so that what"
                "  is cut off could hold a leading level. Give cutoff=K for the spectrum of the "
                "truncated T, whose error then stays unknown, or move towards stronger coupling."
            )
    return cutoff


def _outside(model: RingModel, cutoff: int, values: Mapping[str, Any]) -> float:
    return float(np.max(model.link.largest_outside(cutoff, values)))


def automatic_truncation(
    model: RingModel, levels: int, values: Mapping[str, Any], tolerance: float
) -> tuple[Truncation, EigenSystem, NDArray[np.float64]]:
    """Truncation, solution and eigenvalue errors at the first cutoff whose bound meets the tolerance.

    Raises
    ------
    ConvergenceError
        If the basis would pass 60,000 irreps first.
    """
    cutoff = closing_cutoff(model, levels, values)
    while True:
        truncation = truncate(model, cutoff, values)
        system = solve(truncation, levels)
        cut = eigenvalue_errors(truncation, system, levels, noise=0.0)
        ground = float(cut[0] / np.abs(system.values[0]))
        worst = float(np.max(mass_errors(system.values[:levels], cut), initial=ground))
        if worst <= tolerance or truncation.outside == 0:
            return truncation, system, eigenvalue_errors(truncation, system, levels)
        cutoff += max(1, cutoff // 6)
        if count_up_to(model.group.rank, cutoff) > LARGEST:
            raise ConvergenceError(
                f"the truncation error is still {worst:.1e} with {truncation.size:,} irreps (cutoff "
                f"{truncation.cutoff}) at {dict(values)}, above the tolerance {tolerance:.0e}: give cutoff= "
                "to accept it (its error then says what is known), or move towards stronger coupling."
            )


def checked_levels(levels: object, size: int | None = None) -> int:
    """A number of levels as a plain int.

    Raises
    ------
    ParameterError
        If it is not a whole number ≥ 1, or more than the ``size`` irreps of the basis.
    """
    count = whole_number("levels", levels, 1, "the leading eigenvalue counts as one")
    if size is not None and count > size:
        raise ParameterError(
            f"{count} levels are more than the {size} irreps of the basis: "
            "ask for fewer levels, or take a larger cutoff."
        )
    return count
