"""Class functions in the eigenphases θ_j of P, x_j = exp(iθ_j), and from there back to eigenvalues."""

from __future__ import annotations

from collections.abc import Mapping
from functools import lru_cache

from sympy import Add, Expr, I, Integer, Mul, Pow, S, Symbol, cos, exp, expand, sin

from haarloom.algebra.coefficients import total
from haarloom.algebra.eigenvalues import eigenvalue_symbols
from haarloom.algebra.labels import Rows
from haarloom.exceptions import ClassFunctionError

__all__ = ["eigenphase_symbols", "in_eigenphases", "phases_to_eigenvalues"]


@lru_cache(maxsize=8)
def eigenphase_symbols(n: int) -> tuple[Symbol, ...]:
    """The symbols theta_1 … theta_N; results use the first N − 1 of them, θ_N = −(θ_1 + … + θ_{N−1}).

    >>> eigenphase_symbols(3)
    (theta_1, theta_2, theta_3)
    """
    return tuple(Symbol(f"theta_{j}") for j in range(1, n + 1))


def in_eigenphases(n: int, contents: Mapping[Rows, Expr]) -> Expr:
    """Σ a_c exp(i c·θ) with cosines and sines where opposite exponents allow them."""
    reduced: dict[Rows, list[Expr]] = {}
    for content, value in contents.items():
        reduced.setdefault(tuple(c - content[-1] for c in content[:-1]), []).append(value)
    values = {exponents: total(parts) for exponents, parts in reduced.items()}
    return Add(*(_term(n, exponents, values) for exponents in values))


def _term(n: int, exponents: Rows, values: Mapping[Rows, Expr]) -> Expr:
    value, opposite = values[exponents], values.get(tuple(-c for c in exponents), S.Zero)
    angle = Add(*(c * theta for c, theta in zip(exponents, eigenphase_symbols(n), strict=False)))
    if angle == 0:
        return value
    if opposite in (value, -value):
        leads = next(c for c in exponents if c) > 0
        wave = cos(angle) if opposite == value else I * sin(angle)
        return 2 * value * wave if leads else S.Zero
    return value * exp(I * angle)


def phases_to_eigenvalues(expression: Expr, n: int) -> Expr:
    """Replace exp, cos and sin of eigenphases by powers of the eigenvalues x_j.

    >>> theta = eigenphase_symbols(3)
    >>> phases_to_eigenvalues(2 * cos(theta[0] - theta[1]), 3)
    x_1/x_2 + x_2/x_1

    Raises
    ------
    ClassFunctionError
        When an eigenphase stands outside exp, cos and sin, or with a coefficient that is not a whole
        number: such a function is not periodic in it.
    """
    thetas = eigenphase_symbols(n)
    if not expression.free_symbols & set(thetas):
        return expression
    waves = expression.replace(
        lambda part: isinstance(part, (cos, sin)) and bool(part.free_symbols & set(thetas)),
        lambda part: part.rewrite(exp),
    )
    result = expand(waves.replace(lambda part: isinstance(part, exp), lambda part: _monomial(part, n)))
    if left := result.free_symbols & set(thetas):
        raise ClassFunctionError(
            f"{min(map(str, left))} stands outside exp, cos and sin, so the function is not periodic "
            "in it; use "
            f"exp(I*{min(map(str, left))})."
        )
    return result


def _monomial(wave: Expr, n: int) -> Expr:
    angle, factors = expand(wave.args[0]), []
    for theta, eigenvalue in zip(eigenphase_symbols(n), eigenvalue_symbols(n), strict=True):
        power = angle.coeff(theta) / I
        if not power.is_Integer:
            raise ClassFunctionError(
                f"{wave} given; eigenphases enter exp, cos and sin with whole-number coefficients only."
            )
        angle -= I * power * theta
        factors.append(Pow(eigenvalue, Integer(power)))
    return Mul(exp(expand(angle)), *factors)
