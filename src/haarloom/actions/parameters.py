"""Parameters of weights: what may be given, which domain it lies in, and how it becomes numbers.

Every parameter is kept as an exact SymPy expression. Symbols carry no assumptions and are matched
by name, so ``"z"``, ``Symbol("z")`` and a value ``z=0.3`` given later all mean the same thing.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import Any, TypeAlias

import numpy as np
import sympy
from numpy.typing import ArrayLike, NDArray
from sympy import Expr, Symbol

from haarloom.exceptions import ExpressionError, MissingValueError, ParameterError

__all__ = [
    "DOMAINS",
    "Field",
    "Parameter",
    "Values",
    "as_parameter",
    "evaluate",
    "exact_text",
    "free_parameters",
    "named_values",
]

Parameter: TypeAlias = "int | float | complex | Fraction | Expr | str"
Values: TypeAlias = Mapping[str, ArrayLike]

_NAME = re.compile(r"[A-Za-z][A-Za-z0-9_]*\Z")
_CONSTANTS = ("I", "pi")
_NO_NUMBERS = ("inf", "infinity", "nan", "oo", "zoo")
_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?(/\d+)?\Z")


@dataclass(frozen=True)
class Domain:
    """A set of admissible values: its description in words and its test on an array."""

    words: str
    real: bool
    admits: Callable[[NDArray[Any]], NDArray[np.bool_]]


DOMAINS: dict[str, Domain] = {
    "complex": Domain("a finite number", False, np.isfinite),
    "real": Domain("a finite real number", True, np.isfinite),
    "nonnegative real": Domain("a real number ≥ 0", True, lambda v: np.isfinite(v) & (v >= 0)),
    "positive real": Domain("a real number > 0", True, lambda v: np.isfinite(v) & (v > 0)),
    "boson fugacity": Domain("a number with |z| < 1", False, lambda v: np.abs(v) < 1),
}


@dataclass(frozen=True)
class Field:
    """One field of a weight's constructor, with all that a control on screen needs.

    Attributes
    ----------
    name : str
        The keyword of the constructor.
    domain : str
        A key of `DOMAINS` for numbers and expressions, or one of ``"positive integer"``,
        ``"irrep"``, ``"irrep table"``, ``"class function"``, ``"weights"``, ``"choice: a, b"``.
    default : str
        Text that a control starts with; a constructor given this text works.
    help : str
        One line for a tooltip or a table.
    optional : bool
        True if the constructor may be called without it.
    """

    name: str
    domain: str
    default: str
    help: str
    optional: bool = False

    @property
    def numeric(self) -> bool:
        """True if the field holds a number or an expression in parameters."""
        return self.domain in DOMAINS

    def check(self, values: NDArray[Any]) -> NDArray[Any]:
        """Values inside the domain, as float64 where the domain is real.

        Raises
        ------
        ParameterError
            If any value lies outside; the first such value is named.
        """
        domain = DOMAINS[self.domain]
        values = np.asarray(values)
        if domain.real and np.iscomplexobj(values):
            self._refuse(values, values.imag != 0, domain)
            values = values.real
        self._refuse(values, ~domain.admits(values), domain)
        return values

    def _refuse(self, values: NDArray[Any], bad: NDArray[np.bool_], domain: Domain) -> None:
        if bad.any():
            first = np.asarray(values)[bad].ravel()[0]
            raise ParameterError(
                f"{self.name} = {first:.6g} is not allowed: {self.name} ({self.help}) must be "
                f"{domain.words}. Give a value in that range, or a symbol to fix it later."
            )


def as_parameter(value: Parameter, field: Field) -> Expr:
    """The exact expression that a user's value stands for, checked if it is a number.

    Parameters
    ----------
    value : int, float, complex, Fraction, Expr or str
        A float becomes the exact decimal that it prints as. A string that is a name becomes a plain symbol;
        one that is a decimal or a quotient becomes an exact rational; any other goes through the safe
        expression grammar.
    field : Field
        Name, domain and meaning, for the check and for the message.

    Raises
    ------
    ParameterError
        If the value is a number outside the field's domain, or no number at all.
    """
    expression = _expression(value, field)
    if expression.is_number:
        number = complex(expression)
        if not np.isfinite(number):
            raise ParameterError(
                f"{field.name} = {value} is beyond what a double can hold: give a finite number below 1e308."
            )
        field.check(np.asarray(number.real if number.imag == 0 else number))
    return expression


def _expression(value: Parameter, field: Field) -> Expr:
    if isinstance(value, str):
        return _from_text(value.strip(), field)
    if isinstance(value, bool) or not isinstance(value, int | float | complex | Fraction | Expr | np.number):
        raise ParameterError(
            f"{field.name} = {value!r} is a {type(value).__name__}; give a number, a SymPy expression "
            f'or a name such as "{field.name}".'
        )
    if isinstance(value, Fraction):
        return sympy.Rational(value.numerator, value.denominator)
    return _exact_number(value.item() if isinstance(value, np.number) else value, field)


def _exact_number(value: int | float | complex | Expr, field: Field) -> Expr:
    """Floats become the decimal that they print as, as everywhere in the exact stations."""
    if isinstance(value, complex):
        return _exact_number(value.real, field) + sympy.I * _exact_number(value.imag, field)
    if isinstance(value, float):
        if not math.isfinite(value):
            raise ParameterError(
                f"{field.name} = {value} is not allowed: give a finite number, or a symbol to fix it later."
            )
        return sympy.Rational(repr(value))
    return sympy.sympify(value)


def _from_text(text: str, field: Field) -> Expr:
    if text in _NO_NUMBERS:
        raise ParameterError(
            f"{field.name} = {text} is not allowed: give a finite number, or a symbol to fix it later."
        )
    if _NAME.match(text) and text not in _CONSTANTS:
        return Symbol(text)
    if _NUMBER.match(text):
        head, _, denominator = text.partition("/")
        if denominator and int(denominator) == 0:
            raise ParameterError(f"{field.name} = {text} divides by zero: give a finite number.")
        return sympy.Rational(head) / (sympy.Integer(denominator) if denominator else 1)
    # the grammar for whole expressions lives with the documents, a later station: loaded on use
    from haarloom.documents.expressions import parse_expression

    try:
        return parse_expression(text)
    except ExpressionError as problem:
        raise ExpressionError(f"{field.name} = {text!r}: {problem}") from None


def free_parameters(expressions: Iterable[Expr]) -> tuple[Symbol, ...]:
    """The free symbols of the expressions, sorted by name."""
    symbols = {symbol for expression in expressions for symbol in expression.free_symbols}
    return tuple(sorted(symbols, key=lambda symbol: symbol.name))


def exact_text(expression: Expr) -> str:
    """Text from which the expression can be rebuilt without loss."""
    return str(sympy.sstr(expression, full_prec=True))


def named_values(values: Mapping[Any, ArrayLike]) -> dict[str, NDArray[Any]]:
    """Values by name, as arrays; keys may be symbols."""
    return {str(key): np.asarray(value) for key, value in values.items()}


def evaluate(expressions: Sequence[Expr], values: Mapping[Any, ArrayLike]) -> list[NDArray[Any]]:
    """Numbers for exact expressions: the crossing from SymPy to floats inside this station.

    Parameters
    ----------
    expressions : sequence of Expr
        Shape-free expressions in plain symbols.
    values : mapping of name to number or array
        Arrays broadcast against one another; names that do not occur are ignored.

    Returns
    -------
    list of ndarray
        float64 or complex128, each of the shape that its own symbols broadcast to.

    Raises
    ------
    MissingValueError
        If a symbol has no value; every missing name is listed.
    """
    given = named_values(values)
    missing = [s.name for s in free_parameters(expressions) if s.name not in given]
    if missing:
        example = ", ".join(f"{name}=0.5" for name in missing)
        raise MissingValueError(
            f"No value for {', '.join(missing)}: every symbol needs a number or an array here, "
            f"for instance {example}."
        )
    return [_numbers(expression, given) for expression in expressions]


def _numbers(expression: Expr, given: dict[str, NDArray[Any]]) -> NDArray[Any]:
    symbols, function = _compiled(expression)
    arguments = [_float_or_complex(given[symbol.name]) for symbol in symbols]
    with np.errstate(all="ignore"):
        result = _float_or_complex(np.asarray(function(*arguments)))
    return np.broadcast_to(result, np.broadcast_shapes(*(a.shape for a in arguments)))


def _float_or_complex(array: NDArray[Any]) -> NDArray[Any]:
    return array.astype(np.complex128 if np.iscomplexobj(array) else np.float64, copy=False)


@lru_cache(maxsize=4096)
def _compiled(expression: Expr) -> tuple[tuple[Symbol, ...], Callable[..., Any]]:
    symbols = free_parameters([expression])
    if not symbols:
        number = complex(expression)
        constant = number.real if number.imag == 0 else number
        return symbols, lambda: constant
    # dummify: a symbol's name never reaches the generated code
    return symbols, sympy.lambdify(symbols, expression, modules="numpy", dummify=True)
