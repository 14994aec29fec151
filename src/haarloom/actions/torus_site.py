"""Site weights that are no finite combination of characters: their coefficients by transform on the torus."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from functools import lru_cache
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray
from sympy import Expr

from haarloom.actions.base import Site
from haarloom.actions.multiplicative import eigenvalue_factor, multiplicative_coefficients
from haarloom.actions.multiplicative_digits import digits_of
from haarloom.actions.named_coefficient import NamedCoefficient
from haarloom.actions.parameters import Values, evaluate
from haarloom.actions.torus_coefficients import sampled_function
from haarloom.algebra.irrep import Irrep
from haarloom.torus.determinant_forms import EigenvalueProduct

__all__ = ["Point", "TorusSite", "each_point", "summed_tail"]

Point = tuple[tuple[str, complex], ...]

_SAFETY = 1.25
_LAST_SUMMED = {2: 40, 3: 14, 4: 8, 5: 6, 6: 4, 7: 3, 8: 3}
_LAST_SHELL = {2: 120, 3: 36, 4: 12, 5: 7, 6: 5, 7: 4, 8: 3}


def each_point(weight: Any, values: Values) -> tuple[tuple[int, ...], list[Point]]:
    """The points that arrays of values span: their shape, and (name, number) pairs of each."""
    names = [symbol.name for symbol in weight.parameters]
    if not names:
        return (), [()]
    arrays = np.broadcast_arrays(*evaluate(weight.parameters, values))
    flat = [array.ravel() for array in arrays]
    points = [
        tuple((name, a[p].item()) for name, a in zip(names, flat, strict=True)) for p in range(flat[0].size)
    ]
    return arrays[0].shape, points


class TorusSite(Site):
    """Base of infinite site weights given by `density_at` alone.

    Coefficients come from a transform on the maximal torus; the grid is doubled until the
    change is down to rounding or the largest grid is reached, and the last change is the stated error.
    """

    finite: ClassVar[bool] = False
    bounds_proven: ClassVar[bool] = False
    accuracy: ClassVar[str] = (
        "Transform on the torus of eigenphases; its error is measured by refining the grid."
    )
    letter: ClassVar[str] = "w"

    def density_at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """W at the given eigenphases, at one point of parameter space."""
        raise NotImplementedError

    def coefficient(self, irrep: Irrep) -> Expr:
        """A named coefficient that evaluates itself when its parameters have numbers."""
        return NamedCoefficient.of(self, irrep)

    def support(self) -> tuple[Irrep, ...]:
        """Raises: infinitely many irreps occur."""
        return tuple(self.class_function())

    def coefficients_at(self, irreps: Sequence[Irrep], values: Values) -> tuple[NDArray[Any], NDArray[Any]]:
        """w_c by transform, with the change on the last doubling of the grid as error."""
        shape, points = each_point(self, values)
        pairs = [sampled_function(self, "density_at", point).coefficients(irreps) for point in points]
        w = np.array([w for w, _ in pairs]).reshape((*shape, len(irreps)))
        error = np.array([error for _, error in pairs]).reshape((*shape, len(irreps)))
        real = np.all(np.abs(w.imag) <= error)
        return self._below_noise(irreps, values, w.real if real else w, error)

    def _below_noise(
        self, irreps: Sequence[Irrep], values: Values, w: NDArray[Any], error: NDArray[np.float64]
    ) -> tuple[NDArray[Any], NDArray[np.float64]]:
        """Zero in place of rounding noise where |w_c| d_c ≤ the tail from its shell on says more."""
        shells = np.array([sum(irrep.labels) for irrep in irreps], dtype=int)
        dimensions = np.array([float(irrep.dimension) for irrep in irreps])
        for shell in range(1, int(shells.max(initial=0)) + 1):
            members = shells == shell
            bound = np.asarray(self.tail_bound(shell - 1, values))[..., None] / dimensions[members]
            better = bound < error[..., members]
            w[..., members] = np.where(better, 0, w[..., members])
            error[..., members] = np.where(better, bound, error[..., members])
        return w, error

    def digits_of(self, irrep: Irrep, values: Mapping[str, Expr], digits: int) -> Expr | None:
        """w_c to any number of digits where W is a product over eigenvalues at real parameters, else None."""
        factors = getattr(self, "factors", None)
        return digits_of(factors, irrep, values, digits) if factors else None

    def determinant_form(self, values: Values) -> EigenvalueProduct | None:
        """W as a product over eigenvalues, where it is one."""
        factors = getattr(self, "factors", None)
        if not factors:
            return None
        return EigenvalueProduct(self.group, lambda phases: eigenvalue_factor(factors, phases, values))

    def norm_bound(self, values: Values) -> NDArray[Any]:
        """Largest |W| on a grid of the torus, a quarter added: an *estimate* of the supremum."""
        shape, points = each_point(self, values)
        largest = [sampled_function(self, "density_at", point).supremum() for point in points]
        return _SAFETY * np.array(largest).reshape(shape)

    def tail_bound(self, cutoff: int, values: Values) -> NDArray[Any]:
        """Σ |w_c| d_c beyond the cutoff: an *estimate*, shells summed and continued geometrically."""
        shape, points = each_point(self, values)
        return np.array([_tail(self, cutoff, point) for point in points]).reshape(shape)

    def latex(self) -> str:
        """Its expansion in characters."""
        return r"W(P)=\sum_c w_c\,\chi_c(P)"


def summed_tail(
    site: TorusSite, cutoff: int, values: Values, proven: Callable[[int, Values], NDArray[np.float64]]
) -> NDArray[np.float64]:
    """Σ |w_c| d_c beyond the cutoff: moderate shells summed with their errors, a proven bound for the rest.

    Parameters
    ----------
    site : TorusSite
    cutoff : int
    values : mapping
    proven : callable
        Takes a cutoff and values, returns a bound of the whole sum beyond that cutoff, loose or not.
    """
    last = _LAST_SUMMED[site.group.n]
    if cutoff >= last:
        return proven(cutoff, values)
    shape, points = each_point(site, values)
    rest = np.array([_summed_shells(site, point)[cutoff + 1 :].sum() for point in points]).reshape(shape)
    return np.asarray(np.minimum(rest + proven(last, values), proven(cutoff, values)))


@lru_cache(maxsize=1024)
def _summed_shells(site: TorusSite, point: Point) -> NDArray[np.float64]:
    """Σ (|w_c| + error) d_c for each shell up to the last one that is summed."""
    irreps = site.group.irreps(_LAST_SUMMED[site.group.n])
    factors = getattr(site, "factors", None)
    if factors:
        w, error = multiplicative_coefficients(factors, irreps, dict(point))
    else:
        w, error = sampled_function(site, "density_at", point).coefficients(irreps)
    sizes = (np.abs(w) + error) * np.array([float(irrep.dimension) for irrep in irreps])
    return np.asarray(np.bincount([sum(irrep.labels) for irrep in irreps], sizes), dtype=float)


@lru_cache(maxsize=256)
def _shell_sums(site: TorusSite, point: Point) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Σ |w_c| d_c for each shell Σ a_i = 0, 1, …, and what rounding and aliasing may make of each."""
    irreps = site.group.irreps(_LAST_SHELL[site.group.n])
    w, error = sampled_function(site, "density_at", point).coefficients(irreps)
    dimensions = np.array([float(irrep.dimension) for irrep in irreps])
    shell = np.array([sum(irrep.labels) for irrep in irreps])
    sums, slack = (np.bincount(shell, size * dimensions) for size in (np.abs(w), error))
    return np.asarray(sums, dtype=float), np.asarray(slack, dtype=float)


def _tail(site: TorusSite, cutoff: int, point: Point) -> float:
    sums, errors = _shell_sums(site, point)
    window = site.group.n + 1
    seen = np.flatnonzero(sums > 4 * errors)
    last = int(seen[-1]) if len(seen) else 0
    # decay over the last shells above the noise; N + 1 of them, since N-ality may leave some empty
    upper, lower = (
        sums[max(0, last - window + 1) : last + 1].max(),
        sums[max(0, last - 2 * window + 1) : last - window + 1],
    )
    ratio = min((upper / lower.max()) ** (1 / window), 0.999) if len(lower) and lower.max() > 0 else 0.5
    beyond = upper * ratio ** max(1, cutoff - last) / (1 - ratio)
    return float(
        sums[cutoff + 1 : last + 1].sum() + (beyond if cutoff >= last else upper * ratio / (1 - ratio))
    )
