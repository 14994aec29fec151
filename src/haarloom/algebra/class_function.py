"""Class functions: finite combinations of characters Σ_r a_r χ_r(P) with exact coefficients."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from sympy import Add, Expr, ImmutableDenseMatrix, S, Symbol, conjugate, latex

from haarloom.algebra.coefficient_ring import power_of_terms, product_of_terms
from haarloom.algebra.coefficients import as_coefficient, negated, normal_form, total
from haarloom.algebra.eigenphases import in_eigenphases
from haarloom.algebra.eigenvalues import characters_in_contents_with, characters_in_eigenvalues
from haarloom.algebra.group import SU, same_group
from haarloom.algebra.invariants import nality as _nality
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import Labels, order_key
from haarloom.algebra.loops import characters_in_loops
from haarloom.algebra.power_sums import characters_in_power_sums
from haarloom.algebra.powers import validated_power
from haarloom.algebra.products import fusion_tensor, multiply
from haarloom.algebra.words import character_word
from haarloom.exceptions import ClassFunctionError, GroupError, ParameterError

if TYPE_CHECKING:
    from numpy import ndarray

    from haarloom.algebra.taylor import TaylorSeries

__all__ = ["ClassFunction"]

_MOST_SHOWN = 40


class ClassFunction:
    """A finite combination of characters of SU(N), frozen and hashable.

    Coefficients are exact SymPy expressions in expanded form, zero ones dropped, so that equality is
    equality of functions for polynomial coefficients. Numbers and SymPy expressions count as multiples of
    the trivial character.

    Parameters
    ----------
    group : SU
    coefficients : mapping from Irrep (or Dynkin labels) to number, SymPy expression or symbol name

    Examples
    --------
    >>> G = SU(3)
    >>> (G.loop * G.loop.conjugate()).coefficients
    {SU(3).irrep(0, 0): 1, SU(3).irrep(1, 1): 1}
    >>> (G.loop * G.loop.conjugate()).haar()
    1
    """

    __slots__ = ("_terms", "group")
    group: SU
    _terms: dict[Labels, Expr]

    def __init__(self, group: SU, coefficients: Mapping[Any, Any]) -> None:
        terms: dict[Labels, list[Expr]] = {}
        for key, value in coefficients.items():
            terms.setdefault(group.irrep(key).labels, []).append(normal_form(as_coefficient(value)))
        self._fill(group, {labels: total(parts) for labels, parts in terms.items()})

    def _fill(self, group: SU, terms: Mapping[Labels, Expr]) -> ClassFunction:
        ordered = sorted((labels for labels, value in terms.items() if value != 0), key=order_key)
        object.__setattr__(self, "group", group)
        object.__setattr__(self, "_terms", {labels: terms[labels] for labels in ordered})
        return self

    @classmethod
    def from_terms(cls, group: SU, terms: Mapping[Labels, Expr]) -> ClassFunction:
        """Build from checked labels and coefficients already in normal form; the fast door for kernels."""
        return object.__new__(cls)._fill(group, terms)

    def __setattr__(self, name: str, value: object) -> None:
        raise AttributeError("a ClassFunction is a frozen value; build a new one by arithmetic.")

    def __reduce__(self) -> tuple[Any, ...]:
        return ClassFunction.from_terms, (self.group, self._terms)

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, ClassFunction):
            return NotImplemented
        return self.group is other.group and self._terms == other._terms

    def __hash__(self) -> int:
        return hash((self.group.n, tuple(self._terms.items())))

    def __bool__(self) -> bool:
        return bool(self._terms)

    def __repr__(self) -> str:
        shown = ", ".join(f"{labels}: {_brief(value)}" for labels, value in list(self._terms.items())[:4])
        return f"ClassFunction({self.group}, {{{shown}{', …' if len(self._terms) > 4 else ''}}})"

    # --- content

    @property
    def coefficients(self) -> dict[Irrep, Expr]:
        """Coefficients a_r that do not vanish, in basis order."""
        return {Irrep(self.group, labels): value for labels, value in self._terms.items()}

    def by_labels(self) -> dict[Labels, Expr]:
        """The same coefficients on plain label tuples."""
        return dict(self._terms)

    def __getitem__(self, irrep: Irrep | str | Labels) -> Expr:
        """Coefficient of one irrep, 0 where absent."""
        return self._terms.get(self.group.irrep(irrep).labels, S.Zero)

    def __iter__(self) -> Iterator[Irrep]:
        return (Irrep(self.group, labels) for labels in self._terms)

    def __len__(self) -> int:
        return len(self._terms)

    @property
    def free_symbols(self) -> set[Symbol]:
        """Symbols in the coefficients."""
        return {symbol for value in self._terms.values() for symbol in value.free_symbols}

    @property
    def parameters(self) -> tuple[Symbol, ...]:
        """Symbols in the coefficients, sorted by name."""
        return tuple(sorted(self.free_symbols, key=lambda symbol: symbol.name))

    def haar(self) -> Expr:
        """∫ dP of the function with the normalised Haar measure: the coefficient of the trivial character."""
        return self._terms.get((0,) * self.group.rank, S.Zero)

    def inner(self, other: ClassFunction, real: bool = False) -> Expr:
        """Inner product ∫ dP self* other = Σ_r conj(a_r) b_r; ``real`` takes every symbol for real."""
        right = self._coerced(other)
        if right is None:
            raise ClassFunctionError(
                f"{type(other).__name__} given; an inner product needs a class function."
            )
        common = [labels for labels in self._terms if labels in right._terms]
        return normal_form(
            Add(*(_conjugated(self._terms[labels], real) * right._terms[labels] for labels in common))
        )

    def matrix(self, basis: Sequence[Irrep]) -> ImmutableDenseMatrix:
        """Matrix ⟨r|f|s⟩ = Σ_c a_c N_{cs}^r of multiplication by the function, on characters as the basis."""
        order = [same_group(self.group, irrep).labels for irrep in basis]
        entries: dict[tuple[int, int], list[Expr]] = {}
        for factor, value in self._terms.items():
            for row, column, count in fusion_tensor(order, factor):
                entries.setdefault((row, column), []).append(count * value if count > 1 else value)
        filled = {place: normal_form(total(parts)) for place, parts in entries.items()}
        return ImmutableDenseMatrix(len(order), len(order), lambda i, j: filled.get((i, j), S.Zero))

    def sector(self, nality: int) -> ClassFunction:
        """The part that transforms with charge ``nality`` under the centre."""
        kept = {
            labels: value for labels, value in self._terms.items() if _nality(labels) == nality % self.group.n
        }
        return ClassFunction.from_terms(self.group, kept)

    # --- ring

    def _coerced(self, other: Any) -> ClassFunction | None:
        """The other operand as a class function of the same group, or None for foreign types."""
        if isinstance(other, ClassFunction):
            if other.group is not self.group:
                raise GroupError(
                    f"class functions of {self.group} and {other.group} given: they do not combine."
                )
            return other
        if isinstance(other, (str, Irrep)):
            return None
        try:
            return ClassFunction(self.group, {self.group.trivial: other})
        except ClassFunctionError:
            return None

    def __add__(self, other: Any) -> ClassFunction:
        right = self._coerced(other)
        if right is None:
            return NotImplemented
        terms = dict(self._terms)
        for labels, value in right._terms.items():
            terms[labels] = total([terms[labels], value]) if labels in terms else value
        return ClassFunction.from_terms(self.group, terms)

    __radd__ = __add__

    def __neg__(self) -> ClassFunction:
        return self._mapped(negated)

    def __sub__(self, other: Any) -> ClassFunction:
        right = self._coerced(other)
        return NotImplemented if right is None else self + (-right)

    def __rsub__(self, other: Any) -> ClassFunction:
        return -self + other

    def __mul__(self, other: Any) -> ClassFunction:
        right = self._coerced(other)
        if right is None:
            return NotImplemented
        return ClassFunction.from_terms(self.group, product_of_terms(self._terms, right._terms, multiply))

    __rmul__ = __mul__

    def __truediv__(self, other: Any) -> ClassFunction:
        """Division by a number or a coefficient; a class function has no inverse here."""
        if isinstance(other, ClassFunction):
            return NotImplemented
        divisor = normal_form(as_coefficient(other))
        if divisor == 0:
            raise ParameterError("division of a class function by 0; the divisor must not vanish.")
        return self * (1 / divisor)

    def __pow__(self, n: int) -> ClassFunction:
        """n-th power, n an integer ≥ 0, by repeated squaring."""
        unit = (0,) * self.group.rank
        return ClassFunction.from_terms(
            self.group, power_of_terms(self._terms, validated_power(n), unit, multiply)
        )

    def conjugate(self, real: bool = False) -> ClassFunction:
        """Complex conjugate of the function.

        Parameters
        ----------
        real : bool
            Take every symbol for real: then only numbers are conjugated. Otherwise a plain symbol z becomes
            ``conjugate(z)``.
        """
        terms = {labels[::-1]: _conjugated(value, real) for labels, value in self._terms.items()}
        return ClassFunction.from_terms(self.group, terms)

    def subs(self, *arguments: Any, **keywords: Any) -> ClassFunction:
        """Substitute in every coefficient; arguments as for :meth:`sympy.Basic.subs`."""
        return self._mapped(lambda value: normal_form(value.subs(*arguments, **keywords)))

    def diff(self, parameter: Symbol, times: int = 1) -> ClassFunction:
        """Derivative with respect to a parameter in the coefficients."""
        return self._mapped(lambda value: normal_form(value.diff(parameter, times)))

    def exp(self, coupling: Symbol, order: int) -> TaylorSeries:
        """Taylor expansion of exp(f) in a parameter of f, exact, each order a class function."""
        from haarloom.algebra.taylor import exponential_series

        return exponential_series(self, coupling, order)

    def log(self, coupling: Symbol, order: int) -> TaylorSeries:
        """Taylor expansion of log(f) in a parameter of f, exact, each order a class function."""
        from haarloom.algebra.taylor import logarithm_series

        return logarithm_series(self, coupling, order)

    def _mapped(self, change: Callable[[Expr], Expr]) -> ClassFunction:
        return ClassFunction.from_terms(
            self.group, {labels: change(value) for labels, value in self._terms.items()}
        )

    # --- the other bases

    def in_characters(self) -> Expr:
        """The function as a SymPy expression Σ a_r χ(labels), with χ the undefined function ``chi``."""
        return Add(*(value * character_word(labels) for labels, value in self._terms.items()))

    def in_loops(self) -> Expr:
        """The function as a polynomial in the fundamental loops: L and L* for SU(3), L for SU(2).

        >>> (SU(3).adjoint.character()).in_loops()
        L*L^* - 1
        """
        return characters_in_loops(self.group.n, self._terms.items())

    def in_eigenvalues(self) -> Expr:
        """The function as a symmetric Laurent polynomial in the eigenvalues x_1 … x_N of P."""
        return characters_in_eigenvalues(self.group.n, self._terms.items())

    def in_power_sums(self) -> Expr:
        """The function as a polynomial in tr(P, 1) … tr(P, N − 1).

        >>> SU(3).antifundamental.character().in_power_sums()
        tr(P, 1)**2/2 - tr(P, 2)/2
        """
        return characters_in_power_sums(self.group.n, self._terms.items())

    def in_eigenphases(self) -> Expr:
        """The function in theta_1 … theta_{N−1}, with cosines and sines where opposite phases pair up."""
        return in_eigenphases(self.group.n, characters_in_contents_with(self._terms.items()))

    def at(self, angles: Any, **values: Any) -> ndarray:
        """Numerical values on the maximal torus.

        Parameters
        ----------
        angles : array of shape (..., N − 1) or (..., N)
            Eigenphases θ_j of P in radians; with N of them they must add up to 0 mod 2π.
        **values
            A number or array for every parameter, by name; arrays broadcast against the shape ``...`` of
            the angles.

        Returns
        -------
        complex ndarray of shape ``...`` (broadcast)

        Raises
        ------
        MissingValueError
            When a parameter has no value.
        """
        from haarloom.torus.evaluation import evaluate

        return evaluate(self, angles, values)

    # --- faces

    def latex(self) -> str:
        r"""The combination of characters in LaTeX, ``\chi_{\mathbf{8}}`` for a character."""
        return _latex_sum(self, self._terms)

    def _repr_latex_(self) -> str:
        """What a notebook shows: long sums and long coefficients cut short."""
        shown = {labels: _shortened(value) for labels, value in list(self._terms.items())[:_MOST_SHOWN]}
        rest = r" + \cdots" if len(self) > _MOST_SHOWN else ""
        return f"${_latex_sum(self, shown)}{rest}$"


def _latex_sum(function: ClassFunction, terms: Mapping[Labels, Expr]) -> str:
    parts = [_latex_term(Irrep(function.group, labels), value) for labels, value in terms.items()]
    return " + ".join(parts).replace("+ -", "- ") or "0"


def _shortened(value: Expr) -> Expr:
    """A coefficient with its first terms and an ellipsis when it has very many."""
    if not value.is_Add or len(value.args) <= _MOST_SHOWN:
        return value
    return Add(*value.args[:_MOST_SHOWN], Symbol(r"\ldots"), evaluate=False)


def _brief(value: Expr) -> str:
    """A coefficient in full when it is short, its number of terms otherwise."""
    return str(value) if len(value.args) <= 6 else f"<{len(value.args)} terms>"


def _conjugated(value: Expr, real: bool) -> Expr:
    result = conjugate(value)
    if real:
        result = result.subs({conjugate(symbol): symbol for symbol in value.free_symbols})
    return normal_form(result)


def _latex_term(irrep: Irrep, value: Expr) -> str:
    if not any(irrep.labels):
        return latex(value)
    character = rf"\chi_{{{irrep.latex()}}}"
    if value == 1:
        return character
    if value == -1:
        return f"-{character}"
    body = latex(value)
    return rf"\left({body}\right) {character}" if value.is_Add else f"{body} {character}"
