"""Leading eigenvalues of a large T by Arnoldi's and Lanczos's methods (ARPACK through SciPy).

R. B. Lehoucq, D. C. Sorensen, C. Yang, *ARPACK Users' Guide* (SIAM, 1998). Each subspace that T is
known to leave invariant is solved by itself, so that a degeneracy between them cannot be missed;
inside each, a probe of what the found vectors leave over looks for missed levels.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.exceptions import ConvergenceError
from haarloom.numerics.dense import EigenSystem
from haarloom.numerics.ordering import clean_cut, spectral_order
from haarloom.numerics.sectors import sectors
from haarloom.numerics.site_action import FusionAction
from haarloom.numerics.truncation import Truncation

__all__ = ["solve_krylov"]

GUARD = 6
"""Levels beyond those asked for: they bound what is left over."""

DENSE = 60
"""A sector of at most this many irreps is solved densely."""


def solve_krylov(truncation: Truncation, levels: int) -> EigenSystem:
    """At least ``levels`` leading eigenvalues with both vectors, and what bounds the rest.

    Raises
    ------
    ConvergenceError
        If ARPACK does not converge.
    """
    wanted = levels + GUARD
    values, vectors = [], []
    for isometry in _promising(truncation, wanted):
        found, columns = _solve_sector(truncation, isometry, wanted)
        values.append(found)
        vectors.append(isometry @ columns)
    return _assembled(truncation, np.concatenate(values), np.concatenate(vectors, axis=1), levels)


def _promising(truncation: Truncation, wanted: int) -> list[Any]:
    """All sectors but those whose every eigenvalue is smaller than enough diagonal ones elsewhere.

    A single irrep is its own eigenvector; of many such only the largest matter.
    """
    parts = sectors(truncation)
    singles = [part for part in parts if part.shape[1] == 1]
    if len(singles) <= wanted:
        return parts
    rows = np.array([part.indices[0] for part in singles])
    sizes = np.abs(truncation.sparse.diagonal()[rows])
    kept = np.argsort(-sizes, kind="stable")[:wanted]
    return [part for part in parts if part.shape[1] > 1] + [singles[i] for i in kept]


def _solve_sector(truncation: Truncation, isometry: Any, wanted: int) -> tuple[NDArray[Any], NDArray[Any]]:
    size = isometry.shape[1]
    if size <= max(DENSE, 2 * wanted):
        inside = isometry.T @ truncation.apply(isometry.toarray())
        return np.linalg.eigh(inside) if truncation.hermitian else np.linalg.eig(inside)
    operator = _operator(truncation, isometry)
    start = np.random.default_rng(size).standard_normal(size)
    values, vectors = _arpack(truncation, operator, wanted, start)
    return _without_gaps(truncation, operator, values, vectors, wanted)


def _operator(truncation: Truncation, isometry: Any) -> Any:
    from scipy.sparse.linalg import LinearOperator

    dtype = float if truncation.real else complex
    if isinstance(truncation.action, FusionAction):
        whole = isometry.shape[1] == truncation.size and not truncation.self_conjugate
        return truncation.sparse if whole else (isometry.T @ truncation.sparse @ isometry).tocsr()
    back = isometry.T.tocsr()
    shape = (isometry.shape[1],) * 2
    return LinearOperator(shape, matvec=lambda x: back @ truncation.apply(isometry @ x), dtype=dtype)


def _arpack(
    truncation: Truncation, operator: Any, wanted: int, start: NDArray[np.float64], tolerance: float = 0.0
) -> tuple[NDArray[Any], NDArray[Any]]:
    from scipy.sparse.linalg import ArpackError, eigs, eigsh

    solver = eigsh if truncation.hermitian else eigs
    room = min(operator.shape[0] - 1, max(4 * wanted, 40))
    try:
        values, vectors = solver(operator, k=wanted, which="LM", v0=start, ncv=room, tol=tolerance)
    except ArpackError as problem:
        raise ConvergenceError(
            f"the Krylov solver did not converge on {operator.shape[0]:,} irreps ({problem}): "
            "ask for fewer levels, or take a smaller cutoff."
        ) from None
    return values, vectors


def _without_gaps(
    truncation: Truncation, operator: Any, values: NDArray[Any], vectors: NDArray[Any], wanted: int
) -> tuple[NDArray[Any], NDArray[Any]]:
    """Look for a level that one starting vector cannot see (an exact degeneracy), and add it."""
    from scipy.sparse.linalg import LinearOperator

    for attempt in range(3):
        basis = _orthonormal(truncation, values, vectors)
        last = np.abs(values).min()

        def left_over(x: NDArray[Any], basis: NDArray[Any] = basis) -> NDArray[Any]:
            image = operator @ (x - basis @ (basis.conj().T @ x))
            return np.asarray(image - basis @ (basis.conj().T @ image))

        dtype = float if truncation.real else complex
        probe = LinearOperator(operator.shape, matvec=left_over, dtype=dtype)
        start = np.random.default_rng(attempt + 1).standard_normal(operator.shape[0])
        size, extra = _arpack(truncation, probe, 1, start.astype(dtype), tolerance=1e-3)
        if np.abs(size[0]) <= last * (1 + 1e-2):
            return values, vectors
        start = np.real(extra[:, 0]) + np.random.default_rng(attempt).standard_normal(operator.shape[0])
        columns = _arpack(truncation, probe, wanted, start.astype(dtype))[1]
        enlarged, _ = np.linalg.qr(np.concatenate([vectors, columns], axis=1))
        small = enlarged.conj().T @ (operator @ enlarged)
        values, inner = np.linalg.eigh(small) if truncation.hermitian else np.linalg.eig(small)
        kept = np.argsort(-np.abs(values))[:wanted]
        values, vectors = values[kept], enlarged @ inner[:, kept]
    raise ConvergenceError(
        "the Krylov solver keeps finding levels it had missed: many are degenerate here. "
        "Take a smaller cutoff, for which the dense solver is used."
    )


def _orthonormal(truncation: Truncation, values: NDArray[Any], vectors: NDArray[Any]) -> NDArray[Any]:
    """Orthonormal basis of the span of the vectors; real where T is, made of real and imaginary parts."""
    if truncation.real and np.iscomplexobj(vectors):
        upper = np.imag(values) >= 0
        paired = np.imag(values) > 0
        vectors = np.concatenate([vectors[:, upper].real, vectors[:, paired].imag], axis=1)
    return np.linalg.qr(vectors)[0]


def _assembled(truncation: Truncation, values: NDArray[Any], right: NDArray[Any], levels: int) -> EigenSystem:
    order = spectral_order(values)
    count = clean_cut(values[order], levels, levels + GUARD)
    bound = float(np.abs(values[order[count - 1 : count + 1]]).min()) if count < len(order) else 0.0
    values, right = values[order[:count]], right[:, order[:count]]
    right = right / np.linalg.norm(right, axis=0)
    left = _left(truncation, right, values)
    residual = np.linalg.norm(truncation.apply(right) - right * values, axis=0)
    return EigenSystem(values, right, left, residual, bound, "Krylov")


def _left(truncation: Truncation, right: NDArray[Any], values: NDArray[Any]) -> NDArray[Any]:
    if truncation.hermitian:
        return right.conj() if not _repeated(values) else _dual_basis(right.conj(), right)
    if truncation.mirrored:
        return _dual_basis(truncation.dual(right), right)
    return _dual_basis(_transposed_vectors(truncation, values, right), right)


def _repeated(values: NDArray[Any]) -> bool:
    return bool((np.abs(np.diff(values)) <= 1e-9 * np.abs(values[:-1])).any())


def _dual_basis(left: NDArray[Any], right: NDArray[Any]) -> NDArray[Any]:
    """Combinations of the left columns with yᵢᵀ xⱼ = δᵢⱼ."""
    return np.asarray(left @ np.linalg.pinv(right.T @ left))


def _transposed_vectors(truncation: Truncation, values: NDArray[Any], right: NDArray[Any]) -> NDArray[Any]:
    """Left vectors where k_r̄ ≠ k_r: eigenvectors of Tᵀ = Φ S J W J S, solved like T itself."""
    from scipy.sparse.linalg import LinearOperator

    size = truncation.size
    root, phase, mirror = truncation.root[:size], truncation.phase[:size], truncation.conjugate[:size]

    def transposed(y: NDArray[Any]) -> NDArray[Any]:
        return np.asarray(phase * root * truncation.action.apply((root * y)[mirror])[:size][mirror])

    dtype = float if truncation.real else complex
    operator = LinearOperator((size, size), matvec=transposed, dtype=dtype)
    start = np.random.default_rng(size).standard_normal(size)
    found, vectors = _arpack(truncation, operator, right.shape[1], start)
    return vectors[:, spectral_order(found)]
