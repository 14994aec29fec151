"""The transfer matrix as a NumPy function of its parameters: built once, evaluated on whole arrays."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from haarloom.algebra.labels import count_up_to, validated_cutoff
from haarloom.exceptions import SizeError
from haarloom.numerics.parameters import broadcast_shape, checked_values
from haarloom.numerics.site_components import SiteComponents, site_components

if TYPE_CHECKING:
    from haarloom.algebra.irrep import Irrep
    from haarloom.ring.model import RingModel

__all__ = ["CompiledTransfer", "check_memory", "compile_transfer"]

MEMORY_LIMIT = 4_000_000_000
"""Most bytes that one result may take."""


@dataclass(frozen=True, eq=False)
class CompiledTransfer:
    """T_rs = √k_r ⟨r|W|s⟩ √k_s as a function of the model's parameters.

    Attributes
    ----------
    model, cutoff
        What was compiled: irreps with Σ a_i ≤ cutoff.
    basis
        Irreps of rows and columns, in order; n of them.
    components
        The fusion of W on this basis.

    Examples
    --------
    >>> import haarloom as hl
    >>> from haarloom.numerics.compile import compile_transfer
    >>> G = hl.SU(3)
    >>> model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    >>> compile_transfer(model, 2)(t=1.0, z=[0.1, 0.2, 0.3]).shape
    (3, 6, 6)
    """

    model: RingModel
    cutoff: int
    basis: tuple[Irrep, ...]
    components: SiteComponents

    def __call__(self, **values: Any) -> NDArray[Any]:
        """T at the given values, arrays broadcast against each other; K W for a link that mixes irreps.

        Returns
        -------
        ndarray, shape broadcast(values) + (n, n)
            float64 where the values and all √k_r are real, else complex128.

        Raises
        ------
        MissingValueError, ParameterError
            For a symbol without a value, an unknown name, or a number outside its domain.
        SizeError
            If the result would take more than 4 GB.
        """
        if not self.model.link.diagonal:
            return self.unsymmetric(**values)
        checked = checked_values(self.model, values)
        shape = broadcast_shape(checked)
        size = len(self.basis)
        check_memory(int(np.prod(shape)) * size * size, f"{shape or 'one'} points × {size} × {size} elements")
        root = _root(self.link(checked))
        result = root[..., :, None] * self.site(checked)
        result *= root[..., None, :]
        return np.asarray(result)

    def unsymmetric(self, **values: Any) -> NDArray[Any]:
        """K W at the given values, shape broadcast(values) + (n, n): similar to T, free of matrix roots."""
        checked = checked_values(self.model, values)
        kernel = self.link(checked)
        site = self.site(checked)
        return np.asarray(kernel[..., :, None] * site if self.model.link.diagonal else kernel @ site)

    def link(self, values: Mapping[str, Any]) -> NDArray[Any]:
        """k_r, shape broadcast(link values) + (n,); for a link that mixes irreps the kernel, (n, n) last."""
        link = self.model.link
        if link.diagonal:
            return np.asarray(link.coefficients_at(self.basis, values)[0])
        return np.asarray(link.kernel_at(self.basis, values)[0])

    def site(self, values: Mapping[str, Any]) -> NDArray[Any]:
        """⟨r|W|s⟩, shape broadcast(site values) + (n, n)."""
        coefficients, _ = self.components.coefficients(values)
        elements = self.components.elements(np.asarray(coefficients))
        pattern = self.components.pattern
        size = pattern.size
        matrix = np.zeros((*elements.shape[:-1], size * size), dtype=elements.dtype)
        matrix[..., pattern.rows * size + pattern.columns] = elements
        return matrix.reshape(*elements.shape[:-1], size, size)


@lru_cache(maxsize=32)
def compile_transfer(model: RingModel, cutoff: int) -> CompiledTransfer:
    """Compile T on the irreps with Σ a_i ≤ cutoff.

    Parameters
    ----------
    model
        A :class:`~haarloom.ring.model.RingModel`; its symbols are matched by name.
    cutoff
        K ≥ 0.

    Raises
    ------
    ParameterError
        If the cutoff is not a whole number ≥ 0.
    SizeError
        If a single matrix would take more than 4 GB.
    """
    level = validated_cutoff(cutoff)
    size = count_up_to(model.group.rank, level)
    check_memory(size * size, f"{size:,} × {size:,} elements (cutoff {level} on {model.group})")
    return CompiledTransfer(
        model, level, tuple(model.group.irreps(level)), site_components(model.site, level, level)
    )


def check_memory(numbers: int, what: str) -> None:
    """Refuse a result that is too large, before anything is built.

    Raises
    ------
    SizeError
        If ``numbers`` float64 values take more than 4 GB; the message says the size first.
    """
    needed = 8 * numbers
    if needed > MEMORY_LIMIT:
        raise SizeError(
            f"{needed / 1e9:,.1f} GB for {what} is more than the {MEMORY_LIMIT / 1e9:.0f} GB allowed: "
            "take a smaller cutoff or fewer points; model.spectrum(...) works without the dense matrix."
        )


def _root(values: NDArray[Any]) -> NDArray[Any]:
    if np.iscomplexobj(values):
        return np.asarray(np.sqrt(values))
    if (values < 0).any():
        return np.asarray(np.sqrt(values.astype(complex)))
    return np.asarray(np.sqrt(values))
