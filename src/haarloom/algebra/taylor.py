"""Exact truncated Taylor expansions of exp and log of a class function in a coupling.

Each order is a finite class function. With E = exp f the derivative E′ = f′E gives, order by order,
n E_n = Σ_{k=1}^n k f_k E_{n−k}; with Λ = log f, f′ = Λ′f gives n f_0 Λ_n = n f_n − Σ_{k=1}^{n−1} k Λ_k
f_{n−k}.
"""

from __future__ import annotations

from dataclasses import dataclass

from sympy import Add, Expr, Integer, S, Symbol, exp, factorial, latex, log

from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.coefficients import normal_form, total
from haarloom.algebra.labels import Labels
from haarloom.algebra.powers import validated_power
from haarloom.exceptions import ConvergenceError, ParameterError

__all__ = ["TaylorSeries", "exponential_series", "logarithm_series", "taylor_coefficients"]


@dataclass(frozen=True)
class TaylorSeries:
    """Σ_n c_n g^n, known for n = 0 … order.

    Attributes
    ----------
    coupling : Symbol
        The parameter g.
    coefficients : tuple of ClassFunction
        c_0 … c_order, free of g.
    """

    coupling: Symbol
    coefficients: tuple[ClassFunction, ...]

    @property
    def order(self) -> int:
        """The highest order that is known."""
        return len(self.coefficients) - 1

    def __getitem__(self, n: int) -> ClassFunction:
        return self.coefficients[n]

    def __len__(self) -> int:
        return len(self.coefficients)

    def truncated(self) -> ClassFunction:
        """The polynomial Σ_{n ≤ order} c_n g^n as one class function."""
        gathered: dict[Labels, list[Expr]] = {}
        for n, coefficient in enumerate(self.coefficients):
            for labels, value in coefficient.by_labels().items():
                gathered.setdefault(labels, []).append(normal_form(value * self.coupling**n))
        terms = {labels: total(parts) for labels, parts in gathered.items()}
        return ClassFunction.from_terms(self.coefficients[0].group, terms)

    def haar(self) -> tuple[Expr, ...]:
        """Haar integrals of the coefficients, order by order."""
        return tuple(coefficient.haar() for coefficient in self.coefficients)

    def latex(self) -> str:
        """The series in LaTeX, closed by the order of what is left out."""
        name = latex(self.coupling)
        parts = [
            rf"\left({coefficient.latex()}\right)" + (f" {name}^{{{n}}}" if n else "")
            for n, coefficient in enumerate(self.coefficients)
            if coefficient
        ]
        return " + ".join([*parts, rf"O({name}^{{{self.order + 1}}})"])

    def _repr_latex_(self) -> str:
        return f"${self.latex()}$"


def taylor_coefficients(function: ClassFunction, coupling: Symbol, order: int) -> tuple[ClassFunction, ...]:
    """Taylor coefficients f_0 … f_order of a class function in a parameter of its coefficients, about 0.

    Raises
    ------
    ConvergenceError
        When a coefficient is singular at coupling 0.
    """
    if not isinstance(coupling, Symbol):
        raise ParameterError(f"coupling {coupling!r} given; it must be a SymPy symbol, such as Symbol('g').")
    highest = validated_power(order)
    graded: list[dict[Labels, Expr]] = [{} for _ in range(highest + 1)]
    for labels, value in function.by_labels().items():
        found = _powers(value, coupling, highest) or _derivatives(value, coupling, highest)
        for terms, coefficient in zip(graded, found, strict=True):
            terms[labels] = coefficient
    return tuple(ClassFunction.from_terms(function.group, terms) for terms in graded)


def _powers(value: Expr, coupling: Symbol, order: int) -> list[Expr] | None:
    """Coefficients of a polynomial in normal form, read off term by term; None for anything else."""
    found: list[list[Expr]] = [[] for _ in range(order + 1)]
    for term in Add.make_args(value):
        coefficient, power = term.as_coeff_exponent(coupling)
        if coefficient.has(coupling) or not (power.is_Integer and power >= 0):
            return None
        if power <= order:
            found[int(power)].append(coefficient)
    return [Add(*parts) for parts in found]


def _derivatives(value: Expr, coupling: Symbol, order: int) -> list[Expr]:
    found = []
    for n in range(order + 1):
        at_zero = value.subs(coupling, 0)
        if at_zero.has(S.ComplexInfinity, S.NaN, S.Infinity, S.NegativeInfinity):
            raise ConvergenceError(
                f"{value} is singular at {coupling} = 0, so it has no Taylor series there."
            )
        found.append(normal_form(at_zero / factorial(n)))
        value = value.diff(coupling)
    return found


def exponential_series(function: ClassFunction, coupling: Symbol, order: int) -> TaylorSeries:
    """Taylor series of exp(f) in a coupling.

    Examples
    --------
    >>> from haarloom.algebra.group import SU
    >>> g = Symbol("g")
    >>> L = SU(3).loop
    >>> exponential_series(g * (L + L.conjugate()), g, 4).haar()
    (1, 0, 1, 1/3, 1/2)

    Raises
    ------
    ConvergenceError
        When f at coupling 0 is more than a constant: exp of it is no finite combination of characters.
    """
    terms = taylor_coefficients(function, coupling, order)
    found = [_constant(function, exp(_constant_part(terms[0], coupling, "exp")))]
    for n in range(1, len(terms)):
        parts = (Integer(k) * terms[k] * found[n - k] for k in range(1, n + 1))
        found.append(sum(parts, _constant(function, S.Zero)) / n)
    return TaylorSeries(coupling, tuple(found))


def logarithm_series(function: ClassFunction, coupling: Symbol, order: int) -> TaylorSeries:
    """Taylor series of log(f) in a coupling.

    Raises
    ------
    ConvergenceError
        When f at coupling 0 is not a constant, or vanishes there.
    """
    terms = taylor_coefficients(function, coupling, order)
    start = _constant_part(terms[0], coupling, "log")
    if start == 0:
        raise ConvergenceError(
            f"the function vanishes at {coupling} = 0, where its logarithm has no Taylor series."
        )
    found = [_constant(function, log(start))]
    for n in range(1, len(terms)):
        parts = (Integer(k) * found[k] * terms[n - k] for k in range(1, n))
        found.append((terms[n] - sum(parts, _constant(function, S.Zero)) / n) / start)
    return TaylorSeries(coupling, tuple(found))


def _constant(function: ClassFunction, value: Expr) -> ClassFunction:
    return ClassFunction(function.group, {function.group.trivial: value})


def _constant_part(start: ClassFunction, coupling: Symbol, name: str) -> Expr:
    if any(any(irrep.labels) for irrep in start):
        raise ConvergenceError(
            f"at {coupling} = 0 the function is more than a constant, so the Taylor series of its {name} in "
            f"{coupling} has no finite coefficients: take out that part, or expand in a coupling that "
            "multiplies it."
        )
    return start.haar()
