"""What may be said about λ_0: the premises of Perron and Frobenius, checked, not assumed."""

from __future__ import annotations

import numpy as np

from haarloom.numerics.sectors import component_labels
from haarloom.numerics.truncation import Truncation

__all__ = ["perron_frobenius"]


def perron_frobenius(truncation: Truncation) -> tuple[bool, str]:
    """Whether λ_0 must be real, positive and simple, and a sentence that says why.

    All elements ≥ 0 make the spectral radius an eigenvalue; a connected pattern makes it simple
    (O. Perron, *Math. Ann.* 64 (1907) 248; G. Frobenius, 1912).
    """
    if not truncation.nonnegative:
        return False, (
            "Some elements of T are negative or complex, so that λ_0, the largest |λ|, need not be "
            "real, positive or simple (Perron and Frobenius do not apply)."
        )
    labels = component_labels(truncation)[1]
    parts = len(np.unique(labels[truncation.root[: truncation.size] > 0]))
    if parts > 1:
        return False, (
            f"All elements of T are ≥ 0 but its pattern falls into {parts} parts: λ_0 is real and "
            "positive, though not simple by Perron and Frobenius alone."
        )
    return (
        True,
        "λ_0 is real, positive and simple: all elements of T are ≥ 0 and connected (Perron, Frobenius).",
    )
