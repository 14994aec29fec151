"""Numerical values of class functions on the maximal torus."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from functools import lru_cache
from typing import Any

import numpy as np
import sympy
from numpy.typing import NDArray

from haarloom.algebra.class_function import ClassFunction
from haarloom.exceptions import MissingValueError
from haarloom.torus.angles import full_angles
from haarloom.torus.characters import characters

__all__ = ["evaluate"]


def evaluate(function: ClassFunction, angles: Any, values: Mapping[str, Any]) -> NDArray[np.complex128]:
    """Σ_r a_r(values) χ_r(angles).

    Parameters
    ----------
    function : ClassFunction
    angles : array of shape (..., N − 1) or (..., N), radians
    values : mapping from parameter name to number or array
        Arrays broadcast against the leading axes ``...`` of the angles. Names the function does not use are
        ignored.

    Raises
    ------
    MissingValueError
        When a parameter of the function has no value.
    """
    missing = [symbol.name for symbol in function.parameters if symbol.name not in values]
    if missing:
        raise MissingValueError(
            f"no value for {', '.join(missing)}; give one by name: .at(angles, {missing[0]}=0.3)."
        )
    irreps = tuple(function)
    if not irreps:
        return np.zeros(full_angles(function.group.n, angles).shape[:-1], dtype=np.complex128)
    table = characters(irreps, angles)
    numbers = _compiled(function)(*(np.asarray(values[symbol.name]) for symbol in function.parameters))
    terms = [np.asarray(number) * table[..., place] for place, number in enumerate(numbers)]
    result: NDArray[np.complex128] = np.asarray(sum(terms), dtype=np.complex128)
    return result


@lru_cache(maxsize=64)
def _compiled(function: ClassFunction) -> Callable[..., list[Any]]:
    """The coefficients as one NumPy function of the parameters."""
    compiled: Callable[..., list[Any]] = sympy.lambdify(
        function.parameters, list(function.coefficients.values()), "numpy"
    )
    return compiled
