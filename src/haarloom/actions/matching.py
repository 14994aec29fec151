"""Matching: the couplings at which two actions share an observable, the string tension first of all."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from haarloom.actions.pictures import line_picture, table_html
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ConvergenceError, ParameterError, SizeError

if TYPE_CHECKING:
    from haarloom.actions.base import Link

__all__ = ["OBSERVABLES", "MatchingCurve", "matching_coupling", "matching_curve"]

Observable = Literal["string tension", "coefficient", "tension ratio"]

OBSERVABLES: dict[str, str] = {
    "string tension": "σ_r = −ln(k_r)/N_t of one irrep",
    "coefficient": "k_r of one irrep, the whole strip",
    "tension ratio": "σ_r/σ_F of one irrep; it does not depend on the coupling under Casimir scaling",
}

_LOW, _HIGH = 1e-3, 1e3
_EPS = float(np.finfo(float).eps)


@dataclass(frozen=True, eq=False)
class MatchingCurve:
    """Pairs of couplings of two actions with equal observable.

    Attributes
    ----------
    first, second : Link
        The two actions, each with one coupling left as a symbol.
    observable : str
    irrep : Irrep
    x, y : ndarray, shape (points,)
        Couplings of the first and of the second.
    value : ndarray, shape (points,)
        The shared observable.
    error : ndarray, shape (points,)
        Error of y: that of the observables divided by the slope.
    """

    first: Link
    second: Link
    observable: str
    irrep: Irrep
    x: NDArray[np.float64]
    y: NDArray[np.float64]
    value: NDArray[np.float64]
    error: NDArray[np.float64]

    @property
    def names(self) -> tuple[str, str]:
        """Names of the two couplings."""
        return self.first.parameters[0].name, self.second.parameters[0].name

    def _title(self) -> str:
        return f"{self.first.kind} and {self.second.kind}: same {self.observable} of {self.irrep.name}"

    def __repr__(self) -> str:
        head = f"{self._title()}\n{self.names[0]:>14}{self.names[1]:>18}{self.observable:>18}\n"
        rows = zip(self.x, self.y, self.value, strict=True)
        return head + "\n".join(f"{x:14.6g}{y:18.10g}{v:18.10g}" for x, y, v in rows)

    def _repr_html_(self) -> str:
        picture = line_picture(
            self.x, [self.y], f"{self.first.kind}: {self.names[0]}", f"{self.second.kind}: {self.names[1]}"
        )
        columns = zip(self.x, self.y, self.value, self.error, strict=True)
        rows = [[f"{x:.6g}", f"{y:.10g}", f"{value:.10g}", f"{e:.1e}"] for x, y, value, e in columns]
        return picture + table_html(
            [*self.names, self.observable, f"error of {self.names[1]}"], rows, self._title()
        )


def matching_curve(
    first: Link,
    second: Link,
    grid: ArrayLike,
    observable: Observable = "string tension",
    irrep: Irrep | str | None = None,
) -> MatchingCurve:
    """Couplings of the second action at which it shares an observable with the first.

    Parameters
    ----------
    first, second : Link
        Diagonal link weights of one group, each with exactly one symbol.
    grid : array of couplings of the first
    observable : {"string tension", "coefficient", "tension ratio"}
    irrep : Irrep or name, optional
        The fundamental unless said otherwise.

    Raises
    ------
    ParameterError
        If a weight has not exactly one symbol, or the observable is unknown.
    ConvergenceError
        If the second action cannot reach a value of the first.

    Examples
    --------
    >>> from haarloom.actions import heat_kernel, wilson
    >>> from haarloom.algebra.group import SU
    >>> curve = matching_curve(wilson(SU(2), "beta"), heat_kernel(SU(2), "t"), [2.0, 4.0])
    >>> [round(t, 6) for t in curve.y.tolist()]
    [1.115631, 0.557971]
    """
    group = first.group
    r = group.fundamental if irrep is None else group.irrep(irrep)
    if observable not in OBSERVABLES:
        raise ParameterError(
            f"observable = {observable!r} is unknown; choose one of {', '.join(OBSERVABLES)}."
        )
    x = np.atleast_1d(np.asarray(grid, dtype=float))
    value, spread = observable_at(first, r, observable, x)
    pairs = [matching_coupling(float(v), second, r, observable) for v in value]
    y = np.array([solution for solution, _ in pairs])
    slope = np.array([slope for _, slope in pairs])
    own = observable_at(second, r, observable, y)[1]
    return MatchingCurve(
        first, second, observable, r, x, y, value, (spread + own) / np.abs(slope) + 4 * _EPS * y
    )


def observable_at(
    link: Link, irrep: Irrep, observable: str, couplings: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """The observable at an array of couplings, and its error."""
    if len(link.parameters) != 1:
        names = ", ".join(symbol.name for symbol in link.parameters) or "none"
        raise ParameterError(
            f"Matching needs a link weight with exactly one symbol; '{link.kind}' has: {names}. Give "
            "numbers for all but one."
        )
    k, error = link.coefficients_at([irrep, link.group.fundamental], {link.parameters[0].name: couplings})
    k, error = np.asarray(k).real, np.asarray(error)
    if observable == "coefficient":
        return k[..., 0], error[..., 0]
    with np.errstate(all="ignore"):
        tension, spread = -np.log(k) / link.plaquettes, error / (np.abs(k) * link.plaquettes)
        if observable == "string tension":
            return tension[..., 0] + 0.0, spread[..., 0]
        ratio = tension[..., 0] / tension[..., 1]
    return ratio, (spread[..., 0] + np.abs(ratio) * spread[..., 1]) / np.abs(tension[..., 1])


def matching_coupling(
    value: float, link: Link, irrep: Irrep, observable: Observable = "string tension"
) -> tuple[float, float]:
    """The coupling at which a link weight has the given observable, and the slope of the observable there.

    Raises
    ------
    ConvergenceError
        If no coupling between 0.001 and 1000 gives the value.
    """
    from scipy.optimize import brentq

    def gap(log: float) -> float:
        number = float(observable_at(link, irrep, observable, np.array([np.exp(log)]))[0][0])
        return number - value

    low, high = _bracket(gap, value, link, observable)
    log = float(brentq(gap, low, high, xtol=1e-15, rtol=4 * _EPS))
    step = 1e-4
    slope = (gap(log + step) - gap(log - step)) / (2 * step * np.exp(log))
    return float(np.exp(log)), float(slope)


def _bracket(gap: Callable[[float], float], value: float, link: Link, observable: str) -> tuple[float, float]:
    """Two neighbouring logarithms of the coupling between which the observable passes the value."""

    def gap_or_nan(log: float) -> float:
        try:
            return gap(log)
        except (ConvergenceError, SizeError):  # a coupling too extreme for this weight
            return float("nan")

    logs = np.linspace(np.log(_LOW), np.log(_HIGH), 41).tolist()
    before = gap_or_nan(logs[0])
    for low, high in pairwise(logs):
        after = gap_or_nan(high)
        if np.isfinite(before) and np.isfinite(after) and before * after <= 0:
            return low, high
        before = after
    raise ConvergenceError(
        f"No coupling {link.parameters[0].name} of '{link.kind}' between {_LOW} and {_HIGH} has "
        f"{observable} = "
        f"{value:.6g}; match at other couplings or with another observable."
    )
