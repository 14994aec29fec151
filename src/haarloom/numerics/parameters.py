"""Values for the parameters of a model: checked once, matched by name, turned into arrays."""

from __future__ import annotations

from collections.abc import Mapping
from difflib import get_close_matches
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.exceptions import MissingValueError, ParameterError

if TYPE_CHECKING:
    from haarloom.ring.model import RingModel

__all__ = ["broadcast_shape", "checked_values", "parameter_names", "plain_numbers"]

Values = dict[str, NDArray[Any]]


def parameter_names(model: RingModel) -> tuple[str, ...]:
    """Names of the symbols that need a value, sorted."""
    return tuple(symbol.name for symbol in model.parameters)


def checked_values(model: RingModel, values: Mapping[str, Any]) -> Values:
    """Every parameter of the model as a float64 or complex128 array.

    Raises
    ------
    MissingValueError
        If a symbol is left without a value.
    ParameterError
        If a name belongs to no symbol of the model, or a value is no finite number.
    """
    names = parameter_names(model)
    missing = [name for name in names if name not in values]
    if missing:
        raise MissingValueError(
            f"no value for {', '.join(missing)}: the model needs a number for each of {', '.join(names)}, "
            f"e.g. {missing[0]}=1.0."
        )
    for name in values:
        if name not in names:
            near = get_close_matches(name, names, n=1)
            hint = f"did you mean {near[0]}?" if near else f"leave {name} out."
            allowed = ", ".join(names) or "no parameters at all"
            raise ParameterError(f"{name!r} is no parameter of this model, which has {allowed}; {hint}")
    return {name: _numbers(name, values[name]) for name in names}


def _numbers(name: str, given: Any) -> NDArray[Any]:
    try:
        array = np.asarray(given)
        if array.dtype.kind not in "fiubc":
            array = np.vectorize(_plain_number, otypes=[complex])(array)
        array = array.astype(complex if array.dtype.kind == "c" else float)
    except (TypeError, ValueError, OverflowError):
        raise ParameterError(
            f"{name} = {given!r} is no number: give a real or complex number, or an array of them "
            "(text such as '3/10' is for certify, where numbers are exact)."
        ) from None
    if not np.isfinite(array).all():
        raise ParameterError(f"{name} = {given!r} is not finite: give finite numbers only.")
    if array.dtype.kind == "c" and not array.imag.any():
        array = array.real.copy()
    return array


def _plain_number(given: Any) -> complex:
    return complex(given)


def broadcast_shape(values: Values) -> tuple[int, ...]:
    """The common shape of all parameter arrays.

    Raises
    ------
    ParameterError
        If they do not broadcast.
    """
    try:
        return np.broadcast_shapes(*(array.shape for array in values.values()))
    except ValueError:
        shapes = ", ".join(f"{name}: {array.shape}" for name, array in values.items())
        raise ParameterError(
            f"the parameter arrays have shapes that do not broadcast ({shapes}): "
            "give single numbers, or arrays of one shape."
        ) from None


def plain_numbers(values: Values) -> dict[str, float | complex]:
    """Values at a single point as Python numbers.

    Raises
    ------
    ParameterError
        If some value is an array of more than one number.
    """
    wide = [name for name, array in values.items() if array.size != 1]
    if wide:
        raise ParameterError(
            f"{', '.join(wide)} holds several numbers where one point is needed: "
            "give one number each, or scan over a grid."
        )
    return {name: array.reshape(()).item() for name, array in values.items()}
