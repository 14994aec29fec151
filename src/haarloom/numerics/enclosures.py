"""Proven discs around the eigenvalues of the untruncated T.

With X an approximate matrix of eigenvectors, X⁻¹ A X = Λ + Δ. For |λ| > d ≥ ‖D‖ an eigenvalue of the
untruncated T solves (Λ + Δ + E(λ)) v = λ v with |E_ij| ≤ bᵢ cⱼ/(|λ| − d), bᵢ = ‖(X⁻¹ B)ᵢ‖, cⱼ = ‖(C X)ⱼ‖.
Let M be an element-wise bound of |Δ| + |E|. If some u > 0 satisfies (M u)ᵢ < |λ − Λᵢ| uᵢ for all i, then λ
is no eigenvalue: Gershgorin's theorem with weights (S. Gershgorin, *Izv. Akad. Nauk SSSR* 7 (1931) 749;
R. S. Varga, *Geršgorin and His Circles* (2004)). If that holds on a whole circle, it holds for s M,
0 ≤ s ≤ 1, and the number of eigenvalues inside is that of the Λᵢ inside.

Sums of non-negative floats with n terms are accurate to n·2⁻⁵³; a slack of 10⁻⁹ covers their rounding.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import flint
import numpy as np
from numpy.typing import NDArray

from haarloom.numerics.ball_truncation import BallTruncation
from haarloom.numerics.balls import upper_float

__all__ = ["Disc", "Enclosure", "enclose"]

SLACK = 1 + 1e-9


@dataclass(frozen=True, eq=False)
class Disc:
    """A disc that holds exactly ``count`` eigenvalues of the untruncated T (with multiplicity)."""

    centre: Any
    radius: float
    count: int


@dataclass(frozen=True, eq=False)
class Enclosure:
    """Discs of the leading levels.

    Attributes
    ----------
    discs
        One for each level, None where nothing could be shown.
    leading
        Whether it is shown that no other eigenvalue exceeds the last of these in modulus.
    """

    discs: tuple[Disc | None, ...]
    leading: bool


@dataclass(frozen=True, eq=False)
class _Problem:
    centres: list[Any]
    deviation: NDArray[np.float64]
    downwards: NDArray[np.float64]
    upwards: NDArray[np.float64]
    beyond: float

    def bound(self, modulus: float) -> NDArray[np.float64]:
        """M for |λ| ≥ modulus."""
        room = (modulus - self.beyond) / SLACK
        if room <= 0:
            return np.full_like(self.deviation, np.inf)
        return np.asarray((self.deviation + self.downwards[:, None] * (self.upwards / room)) * SLACK)


def enclose(truncation: BallTruncation, vectors: Any, levels: int) -> Enclosure:
    """Discs of the first ``levels`` eigenvalues, in the order of the columns of ``vectors``.

    Parameters
    ----------
    vectors
        X, an acb_mat of approximate eigenvectors without radii, columns in spectral order.

    Raises
    ------
    ZeroDivisionError
        If X cannot be inverted at this precision.
    """
    problem = _problem(truncation, vectors)
    discs = tuple(_disc(problem, level) for level in range(levels))
    return Enclosure(discs, _no_other(problem, _with_equals(problem, levels)))


def _problem(truncation: BallTruncation, vectors: Any) -> _Problem:
    transformed = vectors.solve(truncation.matrix * vectors)
    dual = vectors.solve(truncation.downwards)
    image = truncation.upwards * vectors
    size = transformed.nrows()
    centres = [_centre(transformed[i, i], truncation.real) for i in range(size)]
    for i in range(size):
        transformed[i, i] -= centres[i]
    deviation = np.array([[upper_float(x) for x in row] for row in transformed.table()])
    downwards = np.array([np.linalg.norm([upper_float(x) for x in row]) for row in dual.table()]) * SLACK
    columns = image.transpose().table()
    upwards = np.array([np.linalg.norm([upper_float(x) for x in column]) for column in columns]) * SLACK
    return _Problem(centres, deviation.reshape(size, size), downwards, upwards, truncation.outer_norm)


def _centre(number: Any, real: bool) -> Any:
    """Mid-point of a diagonal element, put on the real axis where it may be real."""
    middle = number.mid()
    if real and abs(middle.imag) < abs(middle) * flint.arb(2) ** (-flint.ctx.prec // 2):
        return flint.acb(middle.real)
    return middle


def _distances(problem: _Problem, point: Any) -> NDArray[np.float64]:
    """Lower bounds of |Λᵢ − point|."""
    return np.array([float(abs(centre - point).lower()) for centre in problem.centres]) / SLACK


def _disc(problem: _Problem, level: int) -> Disc | None:
    centre = problem.centres[level]
    apart = np.maximum(_distances(problem, centre), 0.0)
    order = np.argsort(apart, kind="stable")
    modulus = float(abs(centre).lower())
    for count in range(1, min(len(order), 6)):
        inside = order[:count]
        outermost = float(apart[inside].max()) * SLACK**2 if count > 1 else 0.0
        nearest = float(apart[order[count]])
        radius = _smallest_radius(problem, modulus, apart, inside, outermost, nearest)
        if radius is not None:
            return Disc(centre, radius, count)
    return None


def _smallest_radius(
    problem: _Problem,
    modulus: float,
    apart: NDArray[np.float64],
    inside: NDArray[np.int64],
    outermost: float,
    nearest: float,
) -> float | None:
    """A radius whose whole circle is free of eigenvalues, between the members and the next level."""
    if not outermost < nearest:
        return None
    bound = problem.bound(modulus - (outermost + nearest) / 2)
    if not np.isfinite(bound).all():
        return None
    radius = outermost
    for _ in range(4):
        weights = _weights(bound, apart, inside, radius)
        radius = outermost + 1.01 * float((bound[inside] @ weights / weights[inside]).max()) + 1e-300
        if radius > (outermost + nearest) / 2:
            return None
        clear = np.abs(apart - radius)
        clear[inside] = radius - apart[inside] * SLACK**2
        if (bound @ weights * SLACK < clear / SLACK * weights).all():
            return radius
    return None


def _weights(
    bound: NDArray[np.float64], apart: NDArray[np.float64], inside: NDArray[np.int64], radius: float
) -> NDArray[np.float64]:
    """u: one for the members, for every other level twice what they feed into it."""
    weights = np.zeros(len(apart))
    weights[inside] = 1.0
    gap = np.maximum(apart - radius, 1e-30 * apart.max() + 1e-200)
    others = np.ones(len(apart), dtype=bool)
    others[inside] = False
    fed = bound[:, inside].sum(axis=1) / gap
    weights[others] = 2 * fed[others] + 1e-280
    for _ in range(3):
        again = 2 * (bound @ weights) / gap
        weights[others] = np.maximum(weights[others], again[others])
    return weights


def _with_equals(problem: _Problem, levels: int) -> int:
    """The number of levels enlarged by those of the same modulus as the last, such as its partner."""
    sizes = [float(abs(centre)) for centre in problem.centres]
    last = min(sizes[:levels])
    return levels + sum(size >= last * (1 - 1e-12) for size in sizes[levels:])


def _no_other(problem: _Problem, levels: int) -> bool:
    """No eigenvalue on a circle about 0 between the last level asked for and the next one."""
    if levels >= len(problem.centres):
        return False
    sizes = np.array([float(abs(centre)) for centre in problem.centres])
    circle = (sizes[:levels].min() + sizes[levels:].max()) / 2
    if not sizes[levels:].max() < sizes[:levels].min():
        return False
    gap = np.abs(sizes - circle) / SLACK**2
    bound = problem.bound(circle)
    if not np.isfinite(bound).all():
        return False
    weights = np.ones(len(sizes))
    for _ in range(8):
        if (bound @ weights * SLACK < gap * weights).all():
            return True
        weights = np.maximum(weights, 2 * (bound @ weights) / np.maximum(gap, 1e-30 * gap.max()))
        weights /= weights.max()
    return False
