"""T on a truncated basis in ball arithmetic: the block inside, both couplings outwards, proven norms.

Finite and infinite site weights go one way: their exact factors give balls w_c for every c that can connect
two irreps of the basis and its shell, and a bound of all that lie beyond (:mod:`ball_characters`).
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any

import flint
import sympy

from haarloom.actions.character_factors import BosonFactor, ExponentialFactor, FiniteFactor
from haarloom.algebra.labels import count_up_to
from haarloom.numerics.ball_characters import GUARD, character_balls
from haarloom.numerics.ball_elements import site_elements
from haarloom.numerics.ball_links import BallLink, ball_link, link_source
from haarloom.numerics.balls import coefficient_balls, precision, upper_float
from haarloom.numerics.labels import conjugation
from haarloom.numerics.majorant import Majorant, factor_balls

if TYPE_CHECKING:
    from haarloom.actions.character_factors import CharacterFactor
    from haarloom.actions.protocols import SiteWeight
    from haarloom.algebra.class_function import ClassFunction
    from haarloom.ring.model import RingModel

__all__ = ["BallTruncation", "ball_truncation", "refuse_unproven"]

SPARE = 40
"""Bits of the precision that the coupling beyond the explicit shell need not reach."""


@dataclass(frozen=True, eq=False)
class BallTruncation:
    """S W S Φ of :mod:`haarloom.numerics.truncation`, every element a ball.

    Attributes
    ----------
    matrix
        T inside, acb_mat (n, n).
    upwards, downwards
        C, (m + n, n), and B, (n, m + n): to the m irreps of the shell that W reaches, or that are followed
        of an infinite W; n more rows and columns bound in norm what it couples farther out.
    outer_norm
        Upper bound of ‖W‖ max |k_r| beyond the basis, a float rounded up.
    real
        Whether every element is real.
    hermitian
        Whether T is exactly Hermitian, shown with exact numbers.
    """

    matrix: Any
    upwards: Any
    downwards: Any
    outer_norm: float
    real: bool
    hermitian: bool


def ball_truncation(model: RingModel, cutoff: int, values: Mapping[str, Any]) -> BallTruncation:
    """T at exact values in the current precision of Arb.

    Parameters
    ----------
    values
        What :func:`~haarloom.numerics.balls.as_exact` returns, for each parameter.

    Raises
    ------
    ConvergenceError
        If the site weight has no exact factors, a coefficient has no ball arithmetic, or the link weight
        has no proven bound on its tail.
    """
    site, rank = model.site, model.group.rank
    farthest = cutoff + (int(site.reach(values) or 0) if site.finite else max(cutoff, 2))
    link = ball_link(model.link, values, farthest)
    factors = _character_factors(site)
    bits = flint.ctx.prec + GUARD
    with precision(bits):
        balls = factor_balls(factors, lambda expressions: coefficient_balls(expressions, values))
    majorant = Majorant(balls, bits)
    outer = farthest if site.finite else _outer(link, majorant, cutoff, farthest)
    characters = character_balls(balls, majorant, rank, farthest if site.finite else cutoff + outer)
    k = link.coefficients(outer)
    root, phase = _roots(k)
    blocks = _Blocks(count_up_to(rank, cutoff), count_up_to(rank, outer), root, phase)
    blocks.fill(site_elements(site, characters, cutoff, outer), conjugation(rank, outer).tolist())
    dimensions = [irrep.dimension for irrep in model.group.irreps(characters.reach)]
    blocks.couple_far(characters.beyond(outer - cutoff, dimensions) * flint.arb(link.outside(outer)).sqrt())
    # beyond the shell signs are known by theorem, or there is nothing
    positive = link.positive or (all(p == 1 for p in phase) and link.outside(outer) == 0)
    return BallTruncation(
        *blocks.matrices(),
        upper_float(majorant.total * link.outside(cutoff)),
        all(isinstance(number, flint.arb) for number in (*characters.coefficients, *k)),
        positive and _exactly_hermitian(model, values),
    )


def refuse_unproven(model: RingModel, values: Mapping[str, Any]) -> None:
    """Raise the `ConvergenceError` of :func:`ball_truncation` before anything is computed."""
    link_source(model.link, values)
    _character_factors(model.site)


@lru_cache(maxsize=32)
def _character_factors(site: SiteWeight) -> tuple[CharacterFactor, ...]:
    return site.character_factors()


def _outer(link: BallLink, majorant: Majorant, cutoff: int, farthest: int) -> int:
    """Σ a_i to which the coupling outwards of an infinite W is explicit.

    From there on it is taken by its norm, which enters eigenvalues squared; at most as far again as the
    basis.
    """
    negligible = majorant.total**2 * flint.arb(2) ** (SPARE - flint.ctx.prec)
    for outer in range(cutoff + 1, farthest):
        if majorant.tail(outer - cutoff) ** 2 * link.outside(outer) < negligible:
            return outer
    return farthest


class _Blocks:
    """A, C and B of T, filled element by element."""

    def __init__(self, size: int, outer_size: int, root: list[Any], phase: list[Any]) -> None:
        shell = outer_size - size
        self._size, self._root, self._phase = size, root, phase
        self._inside = flint.acb_mat(size, size)
        # the last rows of C and columns of B stand for everything farther out
        self._upwards = flint.acb_mat(shell + size, size)
        self._downwards = flint.acb_mat(size, shell + size)

    def fill(self, elements: Iterable[tuple[int, int, Any]], mirror: list[int]) -> None:
        """S W S Φ from the elements of W between kets inside and all bras."""
        size, root, phase = self._size, self._root, self._phase
        kets = [r * p for r, p in zip(root, phase, strict=True)]
        for row, column, element in elements:
            if row < size:
                self._inside[row, column] = root[row] * element * kets[column]
            else:
                self._upwards[row - size, column] = root[row] * element * kets[column]
                # W_{io} = W_{ō ī}
                o, i = mirror[row], mirror[column]
                self._downwards[i, o - size] = root[i] * element * kets[o]

    def couple_far(self, strength: Any) -> None:
        """Rows and columns whose norms bound what T couples beyond the explicit shell.

        ‖P_far T x‖ ≤ √k_far Σ_{c far} |w_c| d_c ‖S x‖, the norm of a diagonal matrix on x, since |χ_c| ≤ d_c.
        """
        if strength == 0:
            return
        first = self._downwards.ncols() - self._size
        for place in range(self._size):
            self._upwards[first + place, place] = strength * self._root[place]
            self._downwards[place, first + place] = strength * self._root[place]

    def matrices(self) -> tuple[Any, Any, Any]:
        """A, C and B."""
        return self._inside, self._upwards, self._downwards


def _roots(k: list[Any]) -> tuple[list[Any], list[Any]]:
    """√|k| and k/|k|; [−1, 1] where the sign of a real k is undecided."""
    roots, phases = [], []
    for number in k:
        size = abs(number)
        roots.append(size.sqrt())
        if isinstance(number, flint.acb):
            phases.append(number / size if number != 0 else flint.acb(1))
        else:
            phases.append(_sign(number))
    return roots, phases


def _sign(number: Any) -> Any:
    if number >= 0:
        return flint.arb(1)
    return flint.arb(-1) if number < 0 else flint.arb(0, 1)


def _exactly_hermitian(model: RingModel, values: Mapping[str, Any]) -> bool:
    """Whether W(P) is real because each factor is, with exact numbers; an interval never counts."""
    exact = {}
    for symbol in model.site.parameters:
        value = values[symbol.name]
        if hasattr(value, "numerator"):
            value = sympy.Rational(value.numerator, value.denominator)
        if not isinstance(value, sympy.Expr):
            return False
        exact[symbol] = value
    factors = _character_factors(model.site)
    functions = [_function(factor) for factor in factors if not isinstance(factor, BosonFactor)]
    bosons = [factor for factor in factors if isinstance(factor, BosonFactor)]
    return all(_real_valued(function, exact) for function in functions) and _paired(bosons, exact)


def _function(factor: FiniteFactor | ExponentialFactor) -> ClassFunction:
    return factor.function if isinstance(factor, FiniteFactor) else factor.exponent


def _real_valued(function: ClassFunction, exact: Mapping[sympy.Symbol, sympy.Expr]) -> bool:
    """w_c̄ = w_c*."""
    return all(
        sympy.expand(value.subs(exact) - sympy.conjugate(function[c.conjugate].subs(exact))) == 0
        for c, value in function.coefficients.items()
    )


def _paired(bosons: Sequence[BosonFactor], exact: Mapping[sympy.Symbol, sympy.Expr]) -> bool:
    """Whether complex conjugation, z in R to z* in R̄, maps the determinants onto one another."""
    numbers = [(b.irrep, b.copies, sympy.expand(b.fugacity.subs(exact))) for b in bosons]
    images = [(r.conjugate, copies, sympy.expand(sympy.conjugate(z))) for r, copies, z in numbers]
    return all(images.count(one) == numbers.count(one) for one in numbers)
