"""Class functions that a user writes: exact expressions with numbers on the torus."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
import sympy
from numpy.typing import NDArray
from sympy import Expr, Symbol
from sympy.core.function import AppliedUndef

from haarloom.actions.parameters import Values, free_parameters, named_values
from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.eigenphases import eigenphase_symbols
from haarloom.algebra.eigenvalues import eigenvalue_symbols
from haarloom.algebra.expressions import class_function_from
from haarloom.algebra.group import SU
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.loops import loop_symbols
from haarloom.exceptions import ClassFunctionError, ConvergenceError, LabelError, MissingValueError
from haarloom.torus.angles import full_angles
from haarloom.torus.characters import character

__all__ = ["ClassExpression", "class_expression"]

_SAMPLES = 5
_TOLERANCE = 1e-9


def class_expression(group: SU, source: str | Expr | ClassFunction) -> ClassExpression:
    """Read what a user gives as a class function of P.

    Parameters
    ----------
    group : SU
    source : str, Expr or ClassFunction
        Text goes through the safe grammar, for example ``"exp(h*(L + conj(L)) - k*chi(1,1))"``. Words are
        ``L``, ``conj(L)`` (or ``L*``), ``E_k``, ``tr(P, n)``, ``chi(labels)``, eigenvalues ``x_j`` and
        eigenphases ``theta_j``; every other name is a parameter.

    Raises
    ------
    ClassFunctionError
        If it is no class function: a bare P, a function of the eigenphases that is not symmetric or not
        periodic, or something that is no expression at all.
    """
    if isinstance(source, ClassFunction):
        if source.group is not group:
            raise ClassFunctionError(
                f"The class function belongs to {source.group}, not to {group}; build both on the same group."
            )
        return ClassExpression(group, source.in_characters())
    if isinstance(source, str):
        from haarloom.documents.class_expressions import parse_class_expression

        source = parse_class_expression(source)
    if isinstance(source, int | float) and not isinstance(source, bool):
        source = sympy.sympify(source)
    if not isinstance(source, Expr):
        raise ClassFunctionError(
            f"{source!r} is no class function; give text such as '1 + h*(L + conj(L))', a SymPy expression "
            f"or a "
            "ClassFunction."
        )
    result = ClassExpression(group, _canonical(source, group))
    _check_class_function(result)
    return result


@dataclass(frozen=True)
class ClassExpression:
    """A class function as a SymPy expression in words and parameters.

    Attributes
    ----------
    group : SU
    expression : Expr
    """

    group: SU
    expression: Expr

    @property
    def words(self) -> tuple[Expr, ...]:
        """Symbols and functions that speak of P."""
        atoms = self.expression.atoms(Symbol, AppliedUndef)
        return tuple(sorted((atom for atom in atoms if _is_word(atom, self.group)), key=str))

    @property
    def parameters(self) -> tuple[Symbol, ...]:
        """Every other symbol, sorted by name."""
        # a dummy for each word: a number could cancel a parameter away
        dummies = {word: sympy.Dummy() for word in self.words}
        plain = self.expression.xreplace(dummies)
        return tuple(s for s in free_parameters([plain]) if not isinstance(s, sympy.Dummy))

    @property
    def finite(self) -> ClassFunction | None:
        """The same as a finite combination of characters, or None."""
        return _finite(self.group, self.expression)

    def at(self, angles: NDArray[Any], values: Values) -> NDArray[Any]:
        """Values of shape (...) at angles of shape (..., N − 1) or (..., N), at one point of parameter space.

        Raises
        ------
        MissingValueError
            If a parameter has no value.
        """
        numbers = self._numbers(values)
        phases = full_angles(self.group.n, angles)
        arrays = [_word_at(word, self.group, phases) for word in self.words]
        return np.broadcast_to(self.compiled()(*arrays, *numbers), phases.shape[:-1])

    def compiled(self) -> Callable[..., Any]:
        """The expression as a NumPy function of its words and parameters, in this order."""
        return _compiled(self.expression, self.words, self.parameters)

    def part(self, expression: Expr) -> ClassExpression:
        """A part of the expression as a class expression of its own."""
        return ClassExpression(self.group, expression)

    def _numbers(self, values: Values) -> list[Any]:
        given = named_values(values)
        missing = [symbol.name for symbol in self.parameters if symbol.name not in given]
        if missing:
            raise MissingValueError(
                f"No value for {', '.join(missing)}: give one by name, such as {missing[0]}=0.5."
            )
        return [given[symbol.name] for symbol in self.parameters]


def _canonical(source: Expr, group: SU) -> Expr:
    """Trade spellings of L* made one; conjugates of words opened as far as they stand alone."""
    star = loop_symbols(group.n)[-1]
    renamed = {Symbol("Lstar"): star, Symbol("L^*"): star, sympy.conjugate(Symbol("L")): star}
    return source.xreplace(renamed)


def _is_word(atom: Expr, group: SU) -> bool:
    if isinstance(atom, AppliedUndef):
        return atom.func.__name__ in ("tr", "chi")
    return atom in (*loop_symbols(group.n), *eigenvalue_symbols(group.n), *eigenphase_symbols(group.n))


def _word_at(word: Expr, group: SU, phases: NDArray[np.float64]) -> NDArray[Any]:
    """One word on the torus."""
    eigenvalues = np.exp(1j * phases)
    if isinstance(word, AppliedUndef) and word.func.__name__ == "tr":
        return np.asarray((eigenvalues ** int(word.args[1] if len(word.args) > 1 else 1)).sum(axis=-1))
    if isinstance(word, AppliedUndef):
        return character(group.irrep(*map(int, word.args)), phases)
    for symbols, values in (
        (eigenvalue_symbols(group.n), eigenvalues),
        (eigenphase_symbols(group.n), phases),
    ):
        if word in symbols:
            return np.asarray(values[..., symbols.index(word)])
    return character(_loop_irrep(word, group), phases)


def _loop_irrep(word: Expr, group: SU) -> Irrep:
    place = loop_symbols(group.n).index(word)
    return group.irrep(*(int(i == place) for i in range(group.rank)))


@lru_cache(maxsize=256)
def _compiled(
    expression: Expr, words: tuple[Expr, ...], parameters: tuple[Symbol, ...]
) -> Callable[..., Any]:
    dummies = {word: sympy.Dummy() for word in words}
    arguments = [*dummies.values(), *parameters]
    return sympy.lambdify(arguments, expression.xreplace(dummies), modules="numpy", dummify=True)


@lru_cache(maxsize=256)
def _finite(group: SU, expression: Expr) -> ClassFunction | None:
    try:
        return class_function_from(expression, group)
    except (ClassFunctionError, ConvergenceError, LabelError):
        return None


def _check_class_function(candidate: ClassExpression) -> None:
    """A bare P is refused by name; symmetry and periodicity in eigenphases are tested at random points."""
    if Symbol("P") in candidate.parameters:
        raise ClassFunctionError(
            "P is a matrix, no class function: write L for tr P, tr(P, n) or chi(labels)."
        )
    for word in candidate.words:
        if isinstance(word, AppliedUndef):
            _check_word(word, candidate.group)
    spoken = {*eigenvalue_symbols(candidate.group.n), *eigenphase_symbols(candidate.group.n)}
    if not spoken & candidate.expression.free_symbols:
        return
    rng = np.random.default_rng(7)
    values = {symbol.name: rng.uniform(0.1, 0.4) for symbol in candidate.parameters}
    phases = rng.uniform(-2.0, 2.0, (_SAMPLES, candidate.group.n))
    phases[:, -1] = -phases[:, :-1].sum(axis=1)
    reference = candidate.at(phases, values)
    permuted = phases[:, rng.permutation(np.arange(1, candidate.group.n + 1)) - 1]
    _refuse_change(
        reference, candidate.at(np.roll(phases, 1, axis=1), values), "symmetric in the eigenphases"
    )
    _refuse_change(reference, candidate.at(permuted, values), "symmetric in the eigenphases")
    turned = phases + 2 * np.pi * (np.eye(candidate.group.n)[0] - np.eye(candidate.group.n)[1])
    _refuse_change(reference, candidate.at(turned, values), "periodic in the eigenphases with period 2π")


def _check_word(word: AppliedUndef, group: SU) -> None:
    whole = [argument for argument in word.args if argument != Symbol("P")]
    if not all(argument.is_Integer for argument in whole):
        raise ClassFunctionError(
            f"{word} given; its arguments must be whole numbers: write tr(P, n) with a power n, such as "
            "tr(P, 2), or chi(…) with Dynkin labels, such as chi(1, 1)."
        )
    if word.func.__name__ == "chi":
        group.irrep(*map(int, whole))


def _refuse_change(before: NDArray[Any], after: NDArray[Any], what: str) -> None:
    scale = 1 + np.abs(before)
    if not np.all(np.abs(after - before) <= _TOLERANCE * scale):
        raise ClassFunctionError(
            f"The expression is not {what}, so it is no class function; write it in L, conj(L), tr(P, n), "
            f"chi(…), or in "
            "all x_j = exp(I*theta_j) alike."
        )
