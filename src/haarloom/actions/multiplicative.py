"""Numbers for site weights that are products over the eigenvalues of P, W(P) = ∏_j φ(x_j).

φ is a product of simple factors: (1 + zx)^n of fermions, (1 − zx)^{−n} of bosons, exp(hx) of loop fields,
and the same in 1/x for antiparticles and for L*. Products of such weights are again of this form.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray
from sympy import Expr

from haarloom.actions.parameters import Values, evaluate
from haarloom.actions.toeplitz import difference_rows, toeplitz_complex, toeplitz_sums
from haarloom.algebra.irrep import Irrep
from haarloom.exceptions import ConvergenceError

__all__ = ["Factor", "eigenvalue_factor", "multiplicative_coefficients"]

_BITS = 224  # of the fixed-point numbers that hold φ
_MOST_ORDERS = 3000
_OMITTED_BITS = 64


@dataclass(frozen=True)
class Factor:
    """One factor of φ(x).

    Attributes
    ----------
    form : {"fermion", "boson", "field"}
        (1 + a y)^n, (1 − a y)^{−n} or exp(a y).
    argument : Expr
        a.
    copies : int
        n; 1 for a field.
    direction : {1, -1}
        y = x or y = 1/x.
    """

    form: Literal["fermion", "boson", "field"]
    argument: Expr
    copies: int
    direction: int


@dataclass(frozen=True)
class _Number:
    """A factor with its argument at one point."""

    form: str
    argument: complex | float
    copies: int
    direction: int


def multiplicative_coefficients(
    factors: Sequence[Factor], irreps: Sequence[Irrep], values: Values
) -> tuple[NDArray[Any], NDArray[np.float64]]:
    """w_c = Σ_m det[φ_{λ_j − j + i + m}] and its error, by Toeplitz determinants.

    Parameters
    ----------
    factors : sequence of Factor
    irreps : sequence of Irrep
        At least one, all of one group.
    values : mapping
        Numbers or arrays for all symbols.

    Returns
    -------
    w, error : ndarray, shape (values broadcast) + (n_irreps,)
        Complex only if an argument is.

    Raises
    ------
    ConvergenceError
        If a boson fugacity is so near to 1 that more than some thousand orders of φ matter.
    """
    arguments = np.broadcast_arrays(*evaluate([factor.argument for factor in factors], values))
    shape = arguments[0].shape
    partitions = np.array([irrep.partition for irrep in irreps])
    flat = [argument.ravel() for argument in arguments]
    points = [
        tuple(
            _Number(f.form, argument[p].item(), f.copies, f.direction)
            for f, argument in zip(factors, flat, strict=True)
        )
        for p in range(flat[0].size)
    ]
    results = [_one_point(partitions, point) for point in points]
    w = np.array([w for w, _ in results]).reshape((*shape, len(irreps)))
    error = np.array([error for _, error in results]).reshape((*shape, len(irreps)))
    return w, error


def eigenvalue_factor(
    factors: Sequence[Factor], phases: NDArray[np.float64], values: Values
) -> NDArray[np.complex128]:
    """φ(e^{iθ}) at one point of parameter space, from the closed forms of its factors."""
    result = np.ones(np.shape(phases), dtype=np.complex128)
    arguments = evaluate([factor.argument for factor in factors], values)
    for factor, argument in zip(factors, arguments, strict=True):
        inner = argument * np.exp(1j * factor.direction * phases)
        if factor.form == "field":
            result *= np.exp(inner)
        else:
            result *= (
                (1 + inner) ** factor.copies if factor.form == "fermion" else (1 - inner) ** -factor.copies
            )
    return result


def _one_point(
    partitions: NDArray[np.int_], point: tuple[_Number, ...]
) -> tuple[NDArray[Any], NDArray[np.float64]]:
    n = partitions.shape[1]
    order, margin = _orders(point, n)
    reach = int(partitions.max()) + margin + 2 * n
    if any(isinstance(factor.argument, complex) for factor in point):
        phi = _laurent(point, order, reach + n, _complex_series)
        complex_w, error = toeplitz_complex(partitions, np.array(phi, dtype=complex), margin)
        return complex_w, error + float(np.abs(phi).max()) ** n * 2.0**-_OMITTED_BITS
    phi = _laurent(point, order, reach + n, _integer_series)
    rows = difference_rows(phi, n)
    scale = rows.scale / (1 << n * _BITS)
    w, error = toeplitz_sums(partitions, [rows], margin)
    largest = max(map(abs, phi)) / (1 << _BITS)
    return w[0] * scale, error[0] * scale + largest**n * 2.0**-_OMITTED_BITS


def _orders(point: tuple[_Number, ...], n: int) -> tuple[int, int]:
    """Order L to which each one-sided series is taken, and the margin of shifts for N columns."""
    forward = [f for f in point if f.direction > 0]
    backward = [f for f in point if f.direction < 0]
    order = max(_falling(side, 160) for side in (forward, backward))
    if order > _MOST_ORDERS:
        raise ConvergenceError(
            f"The fugacity is so near to the edge |z| = 1 that {order:,} orders of the expansion matter, "
            f"more than {_MOST_ORDERS:,}; move it away from 1."
        )
    bits = _OMITTED_BITS + n * n
    margin = max(_falling(side, math.ceil(bits / n) + 8) for side in (forward, backward)) + n
    return order, margin


def _falling(factors: Sequence[_Number], bits: int) -> int:
    """Order from which the series of the product of these factors stays below 2^−bits of its largest term."""
    if not factors:
        return 0
    order = 16
    while True:
        sizes = np.array(_series(factors, order, lambda f, top: _complex_series(_absolute(f), top))).real
        small = np.flatnonzero(sizes > sizes.max() * 2.0**-bits)
        if small[-1] < order // 2 or order > 2 * _MOST_ORDERS:
            return int(small[-1]) + 1
        order *= 2


def _absolute(factor: _Number) -> _Number:
    return _Number(factor.form, abs(factor.argument), factor.copies, factor.direction)


def _laurent(point: tuple[_Number, ...], order: int, reach: int, series: Any) -> list[Any]:
    """φ_l for l = −reach … reach from the two one-sided series."""
    forward = _series([f for f in point if f.direction > 0], order, series)
    backward = _series([f for f in point if f.direction < 0], order, series)
    product = _convolved(forward, backward[::-1])  # place order + l
    places = range(order - reach, order + reach + 1)
    return [product[place] if 0 <= place < len(product) else 0 for place in places]


def _series(factors: Sequence[_Number], order: int, series: Any) -> list[Any]:
    one = series(_Number("field", 0.0, 1, 1), order)
    for factor in factors:
        one = _convolved(one, series(factor, order))[: order + 1]
    return list(one)


def _convolved(a: Sequence[Any], b: Sequence[Any]) -> list[Any]:
    if isinstance(a[0], int):
        return _integer_convolution(a, b)
    return list(np.convolve(a, b))


def _integer_convolution(a: Sequence[int], b: Sequence[int]) -> list[int]:
    """Product of two fixed-point series by one multiplication of long integers (Kronecker substitution)."""
    width = (
        (max(map(abs, a)).bit_length() + max(map(abs, b)).bit_length() + len(a).bit_length() + 16) // 8 * 8
    )
    packed = _unpack(_pack(a, width) * _pack(b, width), len(a) + len(b) - 1, width)
    return [value >> _BITS for value in packed]


def _pack(series: Sequence[int], width: int) -> int:
    """Σ a_k 2^{width·k}; negative entries borrow from the next."""
    size = width // 8
    half = 1 << (width - 1)
    blocks = b"".join((value + half).to_bytes(size, "little") for value in series)
    offset = int.from_bytes(half.to_bytes(size, "little") * len(series), "little")
    return int.from_bytes(blocks, "little") - offset


def _unpack(packed: int, length: int, width: int) -> list[int]:
    size = width // 8
    half = 1 << (width - 1)
    offset = int.from_bytes(half.to_bytes(size, "little") * length, "little")
    data = (packed + offset).to_bytes(size * (length + 1), "little")
    return [int.from_bytes(data[k * size : (k + 1) * size], "little") - half for k in range(length)]


def _complex_series(factor: _Number, order: int) -> list[Any]:
    """Coefficients of one factor up to the order, as floats."""
    a, n = factor.argument, factor.copies
    ratios = {
        "fermion": lambda k: a * (n - k + 1) / k,
        "boson": lambda k: a * (n + k - 1) / k,
        "field": lambda k: a / k,
    }[factor.form]
    steps = np.array([1.0, *(ratios(k) for k in range(1, order + 1))])
    return list(np.cumprod(steps))


@lru_cache(maxsize=64)
def _integer_series(factor: _Number, order: int) -> list[int]:
    """The same as fixed-point integers with `_BITS` bits behind the point."""
    a = Fraction(factor.argument.real)
    numerator, denominator, n = a.numerator, a.denominator, factor.copies
    series = [1 << _BITS]
    for k in range(1, order + 1):
        weight = {"fermion": n - k + 1, "boson": n + k - 1, "field": 1}[factor.form]
        series.append(series[-1] * numerator * weight // (denominator * k))
    return series
