"""Pictures of a weight on the torus of eigenphases: a map for SU(3), a line for the other groups."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from haarloom.actions.parameters import Values
from haarloom.actions.pictures import heat_picture, line_picture

__all__ = ["plaquette_picture", "torus_picture"]

_SIDE = 81


def torus_picture(site: Any, values: Values) -> str:
    """Re W(P) on the torus as SVG text.

    For SU(3) over the orthonormal coordinates x = (θ₁ − θ₂)/√2, y = (θ₁ + θ₂ − 2θ₃)/√6; for other N along
    P = diag(e^{iθ}, …, e^{iθ}, e^{−i(N−1)θ}), which passes every element of the centre.
    """
    return _picture(site.group.n, lambda angles: np.asarray(site.density_at(angles, values)), "W")


def plaquette_picture(link: Any, values: Values) -> str:
    """The plaquette weight w(U) in the same way; empty if the link weight has none, or is singular there."""
    angles, _ = _line(link.group.n)
    if link.plaquette_at(angles, values) is None:
        return ""
    return _picture(link.group.n, lambda phases: np.asarray(link.plaquette_at(phases, values)), "w")


def _picture(n: int, function: Any, name: str) -> str:
    if n != 3:
        angles, theta = _line(n)
        values = function(angles)
        curves = [values.real] if np.isrealobj(values) else [values.real, values.imag]
        names = [] if len(curves) == 1 else [f"Re {name}", f"Im {name}"]
        return line_picture(theta, curves, "θ [rad]", name, names)
    reach = 2 * np.pi * np.sqrt(2 / 3) * 1.12
    axis = np.linspace(-reach, reach, _SIDE)
    x, y = np.meshgrid(axis, axis)
    angles = np.stack([y / np.sqrt(6) + x / np.sqrt(2), y / np.sqrt(6) - x / np.sqrt(2)], axis=-1)
    values = function(angles).real
    box = (-reach, reach, -reach, reach)
    return heat_picture(values, box, "(θ₁ − θ₂)/√2", f"(θ₁ + θ₂ − 2θ₃)/√6, strength: Re {name}", _alcove())


def _alcove() -> list[tuple[float, float, str]]:
    """The triangle θ₁ ≥ θ₂ ≥ θ₃ ≥ θ₁ − 2π, each conjugacy class once; its corners are the centre."""
    turn = 2 * np.pi / 3
    corners = [((0.0, 0.0, 0.0), "1"), ((turn, turn, -2 * turn), "ω"), ((2 * turn, -turn, -turn), "ω²")]
    return [((a - b) / np.sqrt(2), (a + b - 2 * c) / np.sqrt(6), name) for (a, b, c), name in corners]


def _line(n: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    theta = np.linspace(-np.pi, np.pi, 241)
    return np.repeat(theta[:, None], n - 1, axis=1), theta
