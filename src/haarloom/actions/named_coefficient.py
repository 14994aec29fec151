"""A coefficient without elementary closed form, as an exact SymPy expression that can be evaluated.

The expression holds the weight that defines it, the irrep, and the values of the weight's parameters
as arguments, so that substitution and differentiation in SymPy act where they should.
"""

from __future__ import annotations

from typing import Any, Protocol

import mpmath
import sympy
from sympy import Expr

from haarloom.actions.parameters import Values
from haarloom.algebra.irrep import Irrep

__all__ = ["NamedCoefficient"]

_FLOAT_BITS = 66  # SymPy adds guard bits when it asks for 15 digits


class _Defining(Protocol):
    """What a weight must offer to stand behind a named coefficient."""

    @property
    def letter(self) -> str: ...
    @property
    def parameters(self) -> tuple[sympy.Symbol, ...]: ...
    @property
    def group(self) -> Any: ...
    def coefficients_at(self, irreps: list[Irrep], values: Values) -> tuple[Any, Any]: ...


class _Holder(sympy.Atom):
    """A weight inside a SymPy expression; equal weights make equal expressions."""

    weight: Any

    def __new__(cls, weight: Any) -> _Holder:
        holder = sympy.Atom.__new__(cls)
        holder.weight = weight
        return holder

    def _hashable_content(self) -> tuple[str]:
        # a text, because SymPy sorts by this content and weights have no order
        return (repr(self.weight),)

    def __getnewargs__(self) -> tuple[Any]:
        return (self.weight,)

    def __reduce_ex__(self, protocol: Any) -> tuple[Any, ...]:
        return _Holder, (self.weight,)


class NamedCoefficient(sympy.Expr):
    """Coefficient of one irrep in a weight, or element of a pair in a kernel, as a function of the weight's
    parameters.

    Build it with `NamedCoefficient.of(weight, irrep)`. ``evalf`` gives up to 15 digits from the weight's
    numbers, and any number where the weight has a method ``digits_of(irrep, values, digits)``.
    """

    is_commutative = True

    def __new__(cls, holder: _Holder, labels: Any, *arguments: Any) -> NamedCoefficient:
        table = sympy.Tuple(*(sympy.Tuple(*one) for one in labels))
        return sympy.Expr.__new__(cls, holder, table, *map(sympy.sympify, arguments))

    @classmethod
    def of(cls, weight: _Defining, *irreps: Irrep) -> NamedCoefficient:
        """The coefficient of the irrep (the element of the pair), at the weight's own parameters."""
        return cls(_Holder(weight), [irrep.labels for irrep in irreps], *weight.parameters)

    @property
    def weight(self) -> Any:
        """The defining weight."""
        return self.args[0].weight

    @property
    def irreps(self) -> tuple[Irrep, ...]:
        """The irrep, or the pair."""
        return tuple(self.weight.group.irrep(*map(int, labels)) for labels in self.args[1])

    def _eval_evalf(self, prec: int) -> Expr | None:
        digits = mpmath.libmp.prec_to_dps(prec)
        arguments = [argument.evalf(digits + 5) for argument in self.args[2:]]
        if not all(argument.is_number for argument in arguments):
            return None
        names = [symbol.name for symbol in self.weight.parameters]
        if prec > _FLOAT_BITS and hasattr(self.weight, "digits_of"):
            exact = self.weight.digits_of(self.irreps[0], dict(zip(names, arguments, strict=True)), digits)
            if exact is not None:
                return exact
        numbers = {name: _plain(value) for name, value in zip(names, arguments, strict=True)}
        if len(self.irreps) == 2:
            value = self.weight.kernel_at(self.irreps, numbers)[0][0, 1]
        else:
            [value] = self.weight.coefficients_at(list(self.irreps), numbers)[0]
        return sympy.sympify(complex(value) if value.imag else float(value.real))._eval_evalf(53)

    def _latex(self, printer: Any, exp: str | None = None) -> str:
        power = "" if exp is None else f"^{{{exp}}}"
        index = ",".join(irrep.latex() for irrep in self.irreps)
        arguments = ",".join(printer._print(argument) for argument in self.args[2:])
        tail = rf"\left({arguments}\right)" if arguments else ""
        return rf"{self.weight.letter}_{{{index}}}{power}{tail}"

    def _sympystr(self, printer: Any) -> str:
        labels = "; ".join(", ".join(map(str, labels)) for labels in self.args[1])
        arguments = ", ".join(printer._print(argument) for argument in self.args[2:])
        return f"{self.weight.letter}[{labels}]({arguments})"


def _plain(value: Expr) -> float | complex:
    number = complex(value)
    return number.real if number.imag == 0 else number
