"""Perturbation series of eigenvalues and masses in a small parameter, with exact coefficients."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
import sympy

from haarloom.exceptions import ConvergenceError
from haarloom.numerics.cutoff import checked_levels
from haarloom.numerics.effective import effective_matrices
from haarloom.numerics.parameters import parameter_names
from haarloom.numerics.power_series import Rooted, add, divided, logarithm, product, square_root
from haarloom.numerics.series_problem import SeriesProblem, leading_groups, series_problem

if TYPE_CHECKING:
    from haarloom.algebra.irrep import Irrep
    from haarloom.ring.model import RingModel

__all__ = ["LevelSeries", "MassSeries", "SeriesComparison", "series"]

Terms = dict[Fraction, sympy.Expr]


@dataclass(frozen=True, eq=False)
class LevelSeries:
    """One level.

    Attributes
    ----------
    irreps
        Irreps that the level starts from; more than one where it starts degenerate.
    branch
        +1 or −1: the sign of the square root of a level that starts degenerate, else 0.
    eigenvalue, mass
        Coefficients by power of the parameter; half-integer powers where levels start degenerate.
        ``mass`` is empty for the ground level.
    neglected
        Power from which on terms were left out; the coefficient of that one may vanish.
    """

    parameter: sympy.Symbol
    irreps: tuple[Irrep, ...]
    branch: int
    eigenvalue: Terms
    mass: Terms
    neglected: Fraction

    def expression(self, of: str = "mass") -> sympy.Expr:
        """The truncated series as a SymPy expression; ``of`` is "mass" or "eigenvalue"."""
        terms = self.mass if of == "mass" else self.eigenvalue
        return sympy.Add(
            *(
                c * self.parameter ** sympy.Rational(p.numerator, p.denominator)
                for p, c in sorted(terms.items())
            )
        )

    def _repr_latex_(self) -> str:
        which = "mass" if self.mass else "eigenvalue"
        power = sympy.Rational(self.neglected.numerator, self.neglected.denominator)
        rest = sympy.latex(self.parameter**power)
        return rf"${sympy.latex(self.expression(which))} + O\left({rest}\right)$"


@dataclass(frozen=True, eq=False)
class SeriesComparison:
    """A series beside numbers.

    Attributes
    ----------
    values
        Where.
    series, numbers, difference
        Masses from the series and from :func:`haarloom.numerics.spectrum.spectrum`, shape (L − 1,).
    measured_order
        Power with which the difference falls when the parameter is halved. For a small parameter it is
        ``expected_order``, the power from which on terms were left out, or more if that one vanishes.
    """

    values: Mapping[str, float | complex]
    series: np.ndarray
    numbers: np.ndarray
    difference: np.ndarray
    measured_order: np.ndarray
    expected_order: tuple[Fraction, ...]

    def _repr_html_(self) -> str:
        from haarloom.numerics.faces import table_html

        columns = zip(
            self.series, self.numbers, self.difference, self.measured_order, self.expected_order, strict=True
        )
        rows = [
            (str(n), f"{mine:.10g}", f"{theirs:.10g}", f"{abs(apart):.1e}", f"{found:.2f}", str(expected))
            for n, (mine, theirs, apart, found, expected) in enumerate(columns, start=1)
        ]
        point = ", ".join(f"{name} = {value:.6g}" for name, value in self.values.items())
        head = ("n", "series", "numbers", "apart by", "which falls like the power", "left out from")
        return table_html(f"Masses at {point}", head, rows, "")


@dataclass(frozen=True, eq=False)
class MassSeries:
    """Series of the leading levels in one parameter around 0.

    Attributes
    ----------
    levels
        λ_0 first, then by falling size at the start; of a pair the branch +√ first.
    order
        Highest power that is kept.
    """

    model: RingModel
    parameter: sympy.Symbol
    order: int
    levels: tuple[LevelSeries, ...]

    def __repr__(self) -> str:
        return f"MassSeries({self.parameter} to order {self.order}; {len(self.levels) - 1} masses)"

    @property
    def masses(self) -> tuple[sympy.Expr, ...]:
        """Truncated series of m_1, m_2, …"""
        return tuple(level.expression("mass") for level in self.levels[1:])

    @cached_property
    def _functions(self) -> list[Any]:
        names = [sympy.Symbol(name) for name in parameter_names(self.model)]
        # numbers under a root may be negative and real: there the root is imaginary
        modules = [{"sqrt": np.emath.sqrt}, "numpy"]
        return [sympy.lambdify(names, mass, modules=modules) for mass in self.masses]

    def at(self, **values: float | complex) -> np.ndarray:
        """Masses from the truncated series as complex numbers, shape (L − 1,)."""
        arguments = [complex(values.get(name, 0.0)) for name in parameter_names(self.model)]
        return np.array([complex(function(*arguments)) for function in self._functions])

    def compare(self, **values: float | complex) -> SeriesComparison:
        """Series and numbers at one point, and the order with which they part."""
        half = {**values, self.parameter.name: complex(values[self.parameter.name]) / 2}
        pairs = [self._beside(point) for point in (values, {k: _plain(v) for k, v in half.items()})]
        (mine, theirs), (mine_half, theirs_half) = pairs
        with np.errstate(divide="ignore", invalid="ignore"):
            measured = np.log2(np.abs(mine - theirs) / np.abs(mine_half - theirs_half))
        expected = tuple(level.neglected for level in self.levels[1:])
        return SeriesComparison(dict(values), mine, theirs, mine - theirs, measured, expected)

    def _beside(self, values: Mapping[str, Any]) -> tuple[np.ndarray, np.ndarray]:
        from scipy.optimize import linear_sum_assignment

        from haarloom.numerics.spectrum import spectrum

        mine = self.at(**values)
        theirs = spectrum(self.model, levels=len(self.levels), **values).masses
        order = linear_sum_assignment(np.abs(mine[:, None] - theirs[None, :]))[1]
        return mine, theirs[order]

    def _repr_latex_(self) -> str:
        lines = [
            rf"m_{{{number}}} = {level._repr_latex_().strip('$')}"
            for number, level in enumerate(self.levels[1:], start=1)
        ]
        return (
            r"$\begin{aligned}"
            + r" \\ ".join(line.replace("=", "&=", 1) for line in lines)
            + r"\end{aligned}$"
        )


def _plain(value: Any) -> Any:
    number = complex(value)
    return number.real if number.imag == 0 else number


def series(
    model: RingModel, parameter: str | sympy.Symbol, order: int = 6, levels: int = 3, **values: Any
) -> MassSeries:
    """Expand the leading levels in a parameter around 0.

    Parameters
    ----------
    parameter
        The small parameter; T at parameter = 0 must be diagonal (no matter, or no coupling that mixes
        irreps).
    order
        Highest power to keep.
    levels
        Eigenvalues wanted, the ground level included; a pair that starts degenerate is kept whole.
    **values
        Exact numbers for some of the other parameters; the rest stay symbols.

    Raises
    ------
    ParameterError
        For an unknown parameter or an order below 1.
    ConvergenceError
        If T at parameter = 0 is not diagonal, W has infinitely many characters, or more than two
        levels that start degenerate mix.

    Examples
    --------
    >>> import haarloom as hl
    >>> G = hl.SU(3)
    >>> model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    >>> series(model, "z", order=2, levels=1).levels[0].expression("eigenvalue")
    1
    """
    problem = series_problem(model, parameter, order, values)
    groups = leading_groups(problem, checked_levels(levels))
    found: list[LevelSeries] = []
    ground: Rooted | None = None
    for group in groups:
        start, branches = _branches(problem, group)
        for branch, level in branches:
            if ground is None:
                ground, ground_start = _relative(level, start), start
            found.append(_level(problem, group, branch, level, start, ground, ground_start, bool(found)))
    return MassSeries(model, problem.symbol, order, tuple(found))


def _branches(problem: SeriesProblem, group: list[int]) -> tuple[Any, list[tuple[int, Rooted]]]:
    """Starting eigenvalue and the shifts of all its levels."""
    zero = problem.field.zero
    start = problem.starts[group[0]]
    if start == 0:
        raise ConvergenceError(
            "a level starts at eigenvalue 0, so that its mass is infinite: ask for fewer levels."
        )
    matrices = effective_matrices(problem.starts, problem.perturbation, group, problem.inner, zero)
    blocks = _blocks(matrices, len(group))
    found: list[tuple[int, Rooted]] = []
    for block in blocks:
        entries = {(a, b): [zero, *(matrix[a][b] for matrix in matrices)] for a in block for b in block}
        found += _block_levels(problem, block, entries)
    return start, found


def _blocks(matrices: list[list[list[Any]]], size: int) -> list[list[int]]:
    """Parts of the effective matrix that do not talk to each other at any order."""
    part = list(range(size))
    for matrix in matrices:
        for a in range(size):
            for b in range(size):
                if matrix[a][b] != 0:
                    part = [part[a] if p == part[b] else p for p in part]
    return [[a for a in range(size) if part[a] == p] for p in sorted(set(part))]


def _block_levels(
    problem: SeriesProblem, block: list[int], entries: Mapping[tuple[int, int], list[Any]]
) -> list[tuple[int, Rooted]]:
    zero = problem.field.zero
    length = problem.inner + 1
    nothing = [zero] * length
    if len(block) == 1:
        return [(0, Rooted(entries[block[0], block[0]], nothing, zero, 0))]
    if len(block) > 2:
        names = ", ".join(problem.basis[place].name for place in block)
        raise ConvergenceError(
            f"{len(block)} levels that start degenerate mix ({names}): series are built in for one or two; "
            "ask for fewer levels."
        )
    a, b = block
    mean = divided(add(entries[a, a], entries[b, b]), 2)
    square = _discriminant(entries, a, b, zero)
    valuation = next((power for power, c in enumerate(square) if c != 0), None)
    if valuation is None:
        return [(0, Rooted(mean, nothing, zero, 0))] * 2
    first = square[valuation]
    rest = [c / first for c in square[valuation:]]
    root = (square_root(rest) + nothing)[:length]
    level = Rooted(mean, root, first, valuation)
    return [(1, level), (-1, level.conjugated())]


def _discriminant(entries: Mapping[tuple[int, int], list[Any]], a: int, b: int, zero: Any) -> list[Any]:
    """((h_aa − h_bb)/2)² + h_ab h_ba, to where it is complete: entries that start late carry further."""
    half = divided(add(entries[a, a], [-x for x in entries[b, b]]), 2)
    parts = (half, entries[a, b], entries[b, a])
    latest = len(half)
    late = min(next((power for power, c in enumerate(part) if c != 0), latest) for part in parts)
    longer = [part + [zero] * min(late, latest) for part in parts]
    return add(product(longer[0], longer[0]), product(longer[1], longer[2]))


def _relative(level: Rooted, start: Any) -> Rooted:
    return Rooted(divided(level.plain, start), divided(level.rooted, start), level.square, level.valuation)


def _level(
    problem: SeriesProblem,
    group: list[int],
    branch: int,
    level: Rooted,
    start: Any,
    ground: Rooted,
    ground_start: Any,
    excited: bool,
) -> LevelSeries:
    plain = [start + level.plain[0], *level.plain[1:]]
    eigenvalue = _terms(problem, Rooted(plain, level.rooted, level.square, level.valuation))
    mass: Terms = {}
    if excited:
        own, other = logarithm(_relative(level, start)), logarithm(ground)
        difference = add(other.plain, [-x for x in own.plain])
        shift = Rooted(difference, [-x for x in own.rooted], own.square, own.valuation)
        mass = _terms(problem, shift)
        beginning = sympy.expand_log(-sympy.log(problem.field.expression(start / ground_start)), force=True)
        mass = {Fraction(0): sympy.simplify(beginning), **mass}
    irreps = tuple(problem.basis[place] for place in group)
    return LevelSeries(problem.symbol, irreps, branch, eigenvalue, mass, _neglected(problem, level))


def _terms(problem: SeriesProblem, level: Rooted) -> Terms:
    """Coefficients by power, up to the order that is kept."""
    found: Terms = {}
    for power, c in enumerate(level.plain[: problem.order + 1]):
        if c != 0:
            found[Fraction(power)] = problem.field.expression(c)
    if level.square != 0:
        root = problem.field.root(level.square)
        for power, c in enumerate(level.rooted):
            exponent = Fraction(power) + Fraction(level.valuation, 2)
            if c != 0 and exponent <= problem.order:
                found[exponent] = found.get(exponent, sympy.S.Zero) + root * problem.field.expression(c)
    return found


def _neglected(problem: SeriesProblem, level: Rooted) -> Fraction:
    return Fraction(problem.order) + (Fraction(1, 2) if level.valuation % 2 else 1)
