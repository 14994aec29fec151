"""Class functions from ordinary SymPy expressions.

Four spellings are read, alone or together: the fundamental loops (``L``, ``L^*`` or ``Lstar``, ``E_k``),
traces of powers ``tr(P, n)``, characters ``chi(…)``, and the eigenvalues ``x_j`` or eigenphases ``theta_j``
in symmetric combinations. ``conjugate``, ``re``, ``im`` and even powers of ``Abs`` of them are understood.
Every other symbol is a parameter and goes into the coefficients.
"""

from __future__ import annotations

from sympy import Abs, Add, Expr, Integer, Mul, Pow, S, Symbol, exp, expand, log
from sympy.core.function import AppliedUndef

from haarloom.algebra.class_function import ClassFunction
from haarloom.algebra.coefficient_ring import polynomial_of_terms
from haarloom.algebra.conjugates import without_conjugates
from haarloom.algebra.eigenphases import phases_to_eigenvalues
from haarloom.algebra.eigenvalues import eigenvalue_symbols, terms_from_eigenvalues
from haarloom.algebra.group import SU
from haarloom.algebra.labels import Labels
from haarloom.algebra.loops import loop_symbols
from haarloom.algebra.powers import adams
from haarloom.algebra.products import multiply
from haarloom.algebra.words import is_word, words_in
from haarloom.exceptions import ClassFunctionError, ConvergenceError, LabelError

__all__ = ["class_function_from", "haar_integral"]


def class_function_from(expression: Expr | int, group: SU) -> ClassFunction:
    """Read a SymPy expression as a class function of SU(N).

    Parameters
    ----------
    expression : sympy.Expr
        A polynomial in the words of the module docstring, with parameters in the coefficients.
    group : SU

    Raises
    ------
    ClassFunctionError
        When the expression is no class function: a bare ``P``, eigenvalues in no symmetric combination, a
        function that is not polynomial in the loops.
    ConvergenceError
        When it is one, but no finite combination of characters: ``exp(L)``, ``1/L``, ``L**n`` with a symbol
        n.

    Examples
    --------
    >>> from haarloom.algebra.words import P, tr
    >>> L, z = Symbol("L"), Symbol("z")
    >>> class_function_from((1 + z * L) ** 2, SU(3)).coefficients[SU(3).irrep(2, 0)]
    z**2
    >>> class_function_from((L**2 - tr(P, 2)) / 2, SU(3)) == SU(3).antifundamental.character()
    True
    """
    if isinstance(expression, int) and not isinstance(expression, bool):
        expression = Integer(expression)
    if not isinstance(expression, Expr):
        raise ClassFunctionError(
            f"{type(expression).__name__} given; a SymPy expression in L, L^*, tr(P, n), chi(…) or x_j "
            "is needed "
            "(text is parsed by haarloom.documents.class_expressions)."
        )
    plain = phases_to_eigenvalues(without_conjugates(expression, group.n), group.n)
    if plain.free_symbols & set(eigenvalue_symbols(group.n)):
        return _from_eigenvalues(plain, group)
    return _from_words(expand(plain), group)


def haar_integral(expression: Expr, group: SU) -> Expr:
    """∫ dP of an expression, exactly.

    >>> L = Symbol("L")
    >>> haar_integral(L**9, SU(3))
    42

    Raises
    ------
    ConvergenceError
        When infinitely many characters contribute, so that the exact integral does not terminate.
    """
    return class_function_from(expression, group).haar()


def _from_words(expanded: Expr, group: SU) -> ClassFunction:
    """Sort a sum into monomials of words, then let the words become characters."""
    words = words_in(expanded, group.n)
    place = {word: position for position, word in enumerate(words)}
    monomials: dict[tuple[int, ...], Expr] = {}
    for term in Add.make_args(expanded):
        exponents, coefficient = [0] * len(words), S.One
        for factor in Mul.make_args(term):
            base, power = factor.as_base_exp()
            if base in place and power.is_Integer and power > 0:
                exponents[place[base]] += int(power)
            else:
                _check_coefficient(factor, group)
                coefficient *= factor
        key = tuple(exponents)
        monomials[key] = monomials.get(key, S.Zero) + coefficient
    values = [_word_in_characters(word, group) for word in words]
    terms = polynomial_of_terms(monomials, values, (0,) * group.rank, multiply)
    return ClassFunction.from_terms(group, terms)


def _from_eigenvalues(plain: Expr, group: SU) -> ClassFunction:
    spelled = {
        word: ClassFunction(group, _word_in_characters(word, group)).in_eigenvalues()
        for word in words_in(plain, group.n)
    }
    expanded = expand(plain.xreplace(spelled))
    for term in Add.make_args(expanded):
        for factor in Mul.make_args(term):
            base, power = factor.as_base_exp()
            if not (base in eigenvalue_symbols(group.n) and power.is_Integer):
                _check_coefficient(factor, group)
    return ClassFunction.from_terms(group, terms_from_eigenvalues(expanded, group.n))


def _word_in_characters(word: Expr, group: SU) -> dict[Labels, int]:
    if isinstance(word, AppliedUndef):
        return _trace(word, group) if word.func.__name__ == "tr" else {_character_labels(word, group): 1}
    symbols = loop_symbols(group.n)
    place = symbols.index(word) if word in symbols else group.rank - 1
    return {tuple(int(i == place) for i in range(group.rank)): 1}


def _trace(word: Expr, group: SU) -> dict[Labels, int]:
    power = word.args[1] if len(word.args) == 2 else S.One
    if str(word.args[0]) != "P" or len(word.args) > 2:
        raise ClassFunctionError(f"{word} given; write tr(P) or tr(P, n) with the group element P.")
    if not power.is_Integer:
        raise ConvergenceError(
            f"{word} given; only whole-number powers are finite sums of characters: tr(P, 2)."
        )
    if power == 0:
        return {group.trivial.labels: group.n}
    start = group.fundamental if power > 0 else group.antifundamental
    return adams(start.labels, abs(int(power)))


def _character_labels(word: Expr, group: SU) -> Labels:
    if not all(label.is_Integer for label in word.args):
        raise LabelError(f"{word} given; the labels of a character must be whole numbers here: chi(1, 0).")
    return group.irrep(*(int(label) for label in word.args)).labels


def _check_coefficient(factor: Expr, group: SU) -> None:
    """A factor of the coefficient must not speak of P in any way; say in which way it does."""
    atoms = factor.atoms(Symbol, AppliedUndef)
    if "P" in map(str, atoms) and not any(isinstance(atom, AppliedUndef) for atom in atoms):
        raise ClassFunctionError(
            f"{factor} given; P is a matrix, no class function: write tr(P) or tr(P, n)."
        )
    spoken = [atom for atom in atoms if is_word(atom, group.n) or atom in eigenvalue_symbols(group.n)]
    if not spoken:
        return
    if isinstance(factor, (exp, log)) or (isinstance(factor, Pow) and not isinstance(factor.base, Abs)):
        raise ConvergenceError(
            f"{factor} given; it is no finite combination of characters, so its expansion, and with it an "
            "exact Haar integral, does not terminate: expand it to an order in a coupling first "
            "(ClassFunction.exp, .log), or make the power a number ≥ 0."
        )
    raise ClassFunctionError(
        f"{factor} given; it is not polynomial in {spoken[0]}: only sums, products and whole powers of L, "
        "L^*, tr(P, n) and chi(…) are finite combinations of characters."
    )
