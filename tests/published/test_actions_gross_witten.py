"""The large-N one-plaquette model of Gross, Witten and Wadia is approached as N grows, in both phases.

D. J. Gross, E. Witten, *Phys. Rev. D* 21 (1980) 446; S. R. Wadia, *Phys. Lett. B* 93 (1980) 403. For the
weight exp[(N/λ)(tr U + tr U†)], ⟨tr U⟩/N = 1/λ for λ ≥ 2 and 1 − λ/4 for λ ≤ 2. Here (β/N) Re tr U, so λ =
2N²/β. The transition at λ = 2 is of third order.
"""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from haarloom.actions import wilson
from haarloom.algebra.group import SU


def _loop(n: int, coupling: float) -> float:
    k, error = wilson(SU(n), "beta").coefficients_at([SU(n).fundamental], {"beta": 2 * n * n / coupling})
    assert error[0] < 1e-9
    return float(k[0])


@pytest.mark.parametrize(("coupling", "limit"), [(4.0, 0.25), (3.0, 1 / 3), (1.0, 0.75), (0.5, 0.875)])
def test_both_phases_are_approached(coupling: float, limit: float) -> None:
    distances = [abs(_loop(n, coupling) - limit) for n in range(2, 9)]
    assert distances[-1] < 0.01
    assert distances[-1] < distances[0] / 4


def test_weak_coupling_corrections_fall_like_one_over_n_squared() -> None:
    # λ < 2, where the density of eigenphases has a gap: an expansion in 1/N², the determinant's constraint
    # included
    scaled = [n * n * (_loop(n, 0.5) - 0.875) for n in range(4, 9)]
    assert np.std(scaled) < 0.05 * abs(np.mean(scaled))


def test_strong_coupling_of_su_n_differs_by_the_determinant_alone() -> None:
    # for λ > 2 the U(N) value 1/λ is met up to terms that vanish exponentially with N
    distances = [abs(_loop(n, 4.0) - 0.25) for n in range(3, 9)]
    ratios = [b / a for a, b in itertools.pairwise(distances)]
    assert max(ratios[1:]) < 0.75
