"""The positive square root of a link coefficient, taken inside its formula."""

from __future__ import annotations

import sympy

__all__ = ["positive_root"]


def positive_root(coefficient: sympy.Expr) -> sympy.Expr:
    """Square root of a coefficient that is positive for every allowed parameter value.

    SymPy leaves ``sqrt(exp(-t))`` alone because ``t`` might be complex. Link coefficients are
    positive where their parameters are allowed, so that exponents may be halved factor by factor.

    Parameters
    ----------
    coefficient
        k_r, a product of powers and exponentials. A negative number gets its imaginary root:
        T keeps its eigenvalues, which depend on K W alone.

    Examples
    --------
    >>> import sympy
    >>> positive_root(sympy.exp(-sympy.Rational(4, 3) * sympy.Symbol("t")))
    exp(-2*t/3)
    """
    if isinstance(coefficient, sympy.exp):
        return sympy.exp(coefficient.args[0] / 2)
    if isinstance(coefficient, sympy.Mul):
        return sympy.Mul(*(positive_root(factor) for factor in coefficient.args))
    if isinstance(coefficient, sympy.Pow):
        base, exponent = coefficient.as_base_exp()
        return base ** (exponent / 2)
    return sympy.sqrt(coefficient)
