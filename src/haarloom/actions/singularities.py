"""Poles and branch cuts of a class expression on the torus of eigenphases: found, named, refused."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr

from haarloom.actions.class_expression import ClassExpression
from haarloom.algebra.group import SU
from haarloom.exceptions import ConvergenceError
from haarloom.torus.alcove import alcove_grid

__all__ = ["refuse_singularities"]

_GRID = {2: 2001, 3: 121, 4: 41, 5: 25, 6: 20, 7: 18, 8: 18}
_STARTS = 4
_ZERO = 1e-7

Point = tuple[tuple[str, complex], ...]


@dataclass(frozen=True)
class _Base:
    """What stands under a negative or fractional power, or inside a logarithm."""

    expression: Expr
    pole: bool
    cut: bool
    shown: str


@lru_cache(maxsize=256)
def refuse_singularities(function: ClassExpression, point: Point) -> None:
    """Raise if the class expression has a pole or a branch cut on the torus at one point of parameter space.

    Each base of a negative or fractional power and each argument of a logarithm is followed to its smallest
    modulus from the best nodes of a grid. A base that vanishes is a pole (a logarithm's included); one that
    crosses the negative real axis under a fractional power or a logarithm is a branch cut.

    Raises
    ------
    ConvergenceError
        With the eigenphases of the singular place.
    """
    for base in _bases(function):
        _check(function, base, dict(point))


def _bases(function: ClassExpression) -> list[_Base]:
    words = set(function.words)
    found: list[_Base] = []
    for part in sympy.preorder_traversal(function.expression):
        if not (part.atoms(sympy.Symbol, sympy.core.function.AppliedUndef) & words):
            continue
        if isinstance(part, sympy.log):
            found.append(_Base(part.args[0], True, True, str(part)))
        elif isinstance(part, sympy.Pow) and part.base != sympy.E:
            negative = part.exp.could_extract_minus_sign()
            if negative or not part.exp.is_Integer:
                found.append(_Base(part.base, negative, not part.exp.is_Integer, str(part)))
    return found


def _check(function: ClassExpression, base: _Base, values: dict[str, complex]) -> None:
    group, inner = function.group, function.part(base.expression)
    nodes = _nodes(group)
    sampled = inner.at(nodes, values)
    size = float(np.abs(sampled).max()) or 1.0
    if base.pole:
        for start in nodes[np.argsort(np.abs(sampled))[:_STARTS]]:
            place, least = _least(inner, start, values)
            if least <= _ZERO * size:
                raise ConvergenceError(
                    f"{base.shown} is infinite at eigenphases {_named(place)}: a pole on the torus. Change "
                    f"the parameters "
                    "so that it stays away from zero."
                )
    if base.cut:
        _refuse_cut(base, nodes, sampled, size)


def _refuse_cut(base: _Base, nodes: NDArray[np.float64], sampled: NDArray[Any], size: float) -> None:
    """Values left of the imaginary axis on both sides of the real one, or on it, mean that the cut is met."""
    tiny = 1e-9 * size
    left = sampled.real < -tiny
    above, below = left & (sampled.imag > tiny), left & (sampled.imag < -tiny)
    on = left & ~above & ~below
    if on.any() or (above.any() and below.any()):
        candidates = np.flatnonzero(on if on.any() else left)
        place = nodes[candidates[np.argmin(np.abs(sampled[candidates].imag))]]
        raise ConvergenceError(
            f"{base.shown} has its branch cut on the torus, near eigenphases {_named(place)}: the weight "
            f"jumps there. "
            "Change the parameters so that the base keeps off the negative real axis."
        )


@lru_cache(maxsize=8)
def _nodes(group: SU) -> NDArray[np.float64]:
    angles, _ = alcove_grid(group, _GRID[group.n])
    centre = [np.full(group.n, 2 * np.pi * k / group.n) for k in range(group.n)]
    return np.concatenate([angles, centre])


def _least(
    inner: ClassExpression, start: NDArray[np.float64], values: dict[str, complex]
) -> tuple[NDArray[Any], float]:
    """The smallest modulus near a node, and where it is."""
    from scipy.optimize import minimize

    def modulus(free: NDArray[np.float64]) -> float:
        return float(np.abs(inner.at(free, values)))

    options = {"xatol": 1e-11, "fatol": 1e-15, "maxiter": 2000}
    best = minimize(modulus, start[:-1], method="Nelder-Mead", options=options)
    place = np.append(best.x, -best.x.sum())
    return place, float(best.fun)


def _named(phases: NDArray[np.float64]) -> str:
    wrapped = phases - 2 * np.pi * np.round(phases / (2 * np.pi))
    return "(" + ", ".join(f"{phase:.4f}" for phase in wrapped) + ")"
