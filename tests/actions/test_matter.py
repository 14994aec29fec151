"""Static matter, loop fields and their products: closed forms on the torus against coefficients."""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

import numpy as np
import pytest
import sympy
from hypothesis import given
from hypothesis import strategies as st

from haarloom.actions import (
    Species,
    heat_kernel,
    loop_field,
    static_bosons,
    static_fermions,
    static_species,
)
from haarloom.actions.fugacity_table import (
    fundamental_monomials,
    general_linear_dimension,
    power_table,
    transposed_dimension,
)
from haarloom.algebra.group import SU
from haarloom.exceptions import ConvergenceError, GroupError, MissingValueError, ParameterError, SizeError
from haarloom.torus.characters import characters
from haarloom.torus.quadrature import haar_grid
from haarloom.torus.transform import character_coefficients

Z, Y, H = sympy.symbols("z y h")
GRID = {2: 96, 3: 72, 4: 24}


def _matter(n: int) -> list[tuple[Any, dict[str, Any]]]:
    G = SU(n)
    field = {G.fundamental: "h"} if n == 2 else {G.fundamental: "h", G.antifundamental: "g"}
    values = {"z": 0.4, "y": 0.3, "h": 0.5, "g": -0.2}
    sites = [
        static_fermions(G, "z"),
        static_fermions(G, "z", "y", 2),
        static_fermions(G, "z", "y", 8),
        static_fermions(G, "z", irrep=G.antifundamental),
        static_fermions(G, "z", "y", irrep=G.adjoint),
        static_bosons(G, "z"),
        static_bosons(G, "z", copies=n + 1),
        static_bosons(G, "z", "y"),
        loop_field(G, field),
        static_fermions(G, "z") * loop_field(G, field),
        static_fermions(G, "z") * static_fermions(G, "y", irrep=G.adjoint),
    ]
    if n < 4:
        sites += [
            static_bosons(G, "g", irrep=G.adjoint),
            loop_field(G, {G.adjoint: "g"}),
            static_fermions(G, "z") * loop_field(G, {G.adjoint: "g"}),
            static_bosons(G, "z") * loop_field(G, {G.adjoint: "g"}),
        ]
    return [(site, {s.name: values[s.name] for s in site.parameters}) for site in sites]


@pytest.mark.parametrize("n", [2, 3, 4])
@pytest.mark.parametrize("turn", [1.0, np.exp(0.7j)])
def test_coefficients_are_the_transform_of_the_closed_form(n: int, turn: complex) -> None:
    G = SU(n)
    irreps = G.irreps(2)
    for site, values in _matter(n):
        turned = {name: value * turn if turn != 1.0 else value for name, value in values.items()}
        expected, aliasing = character_coefficients(
            G, lambda angles, s=site, v=turned: s.density_at(angles, v), irreps, GRID[n]
        )
        w, error = site.coefficients_at(irreps, turned)
        size = float(np.max(site.norm_bound(turned)))
        assert np.all(np.abs(w - expected) <= error + aliasing + 1e-13 * size), site
        assert error.max() <= 1e-9 * size, site
        assert np.iscomplexobj(w) == (turn != 1.0)


@pytest.mark.parametrize("n", [2, 3, 4])
def test_exact_coefficients_evaluate_to_the_numbers(n: int) -> None:
    G = SU(n)
    irreps = G.irreps(2)
    for site, values in _matter(n):
        w, error = site.coefficients_at(irreps, values)
        exact = {sympy.Symbol(name): sympy.Rational(str(value)) for name, value in values.items()}
        for irrep, value, slack in list(zip(irreps, w, error, strict=True))[:4]:
            assert (
                abs(complex(sympy.sympify(site.coefficient(irrep)).subs(exact).evalf()) - value)
                <= 4 * slack + 1e-15
            )


@pytest.mark.parametrize("n", [2, 3, 4])
def test_bounds_hold_on_the_torus_and_beyond_the_cutoff(n: int, rng: np.random.Generator) -> None:
    G = SU(n)
    angles = np.concatenate([np.zeros((1, n - 1)), rng.uniform(-np.pi, np.pi, (200, n - 1))])
    for site, values in _matter(n):
        assert np.abs(site.density_at(angles, values)).max() <= site.norm_bound(values) * (1 + 1e-12), site
        beyond = [r for r in G.irreps(4) if sum(r.labels) > 2]
        w, error = site.coefficients_at(beyond, values)
        sizes = np.abs(w) * np.array([float(r.dimension) for r in beyond])
        assert sizes.sum() <= site.tail_bound(2, values) * (1 + 1e-9) + error.sum() * 100, site


@pytest.mark.parametrize(
    ("n", "copies", "bar"), [(2, 3, 3), (3, 1, 0), (3, 2, 1), (3, 3, 0), (4, 1, 2), (5, 1, 1)]
)
def test_closed_form_of_many_copies_equals_repeated_products(n: int, copies: int, bar: int) -> None:
    G = SU(n)
    table = power_table(G.fundamental, copies, bar)
    for irrep in G.irreps(copies + bar):
        closed = {k: v for k, v in fundamental_monomials(irrep.partition, copies, bar).items() if v}
        assert closed == {k: v for k, v in table.get(irrep.labels, {}).items() if v}


def test_twenty_four_copies_do_not_blow_up() -> None:
    G = SU(3)
    site = static_fermions(G, "z", copies=24)
    assert site.reach({}) == 24
    assert len(site.support()) == 325
    # at z = 1 the value at P = 1 is 2^{72}, and every w_c d_c adds up to it
    total = sum(site.coefficient(c).subs(Z, 1) * c.dimension for c in site.support())
    assert total == 2**72
    both = static_fermions(G, "z", "y", copies=24)
    w, error = both.coefficients_at(G.irreps(6), {"z": np.linspace(0.1, 0.9, 3), "y": 0.2})
    assert w.shape == (3, 28)
    assert np.all(error <= 1e-9 * np.abs(w))
    exact = both.coefficient(G.adjoint).subs({Z: sympy.Rational(1, 2), Y: sympy.Rational(1, 5)})
    assert w[1, 4] == pytest.approx(float(exact), rel=1e-11)
    with pytest.raises(SizeError, match="irreps"):
        static_fermions(SU(8), "z", copies=24).support()


@given(st.floats(0.05, 20.0), st.integers(1, 3), st.sampled_from(["3", "6", "8"]))
def test_particle_hole_relation(z: float, copies: int, name: str) -> None:
    # det_R(1 + zP)^n = z^{nd} det_R(1 + P†/z)^n because det_R P = 1
    G = SU(3)
    irrep = G.irrep(name)
    site = static_fermions(G, "z", copies=copies, irrep=irrep)
    irreps = G.irreps(2)
    w, error = site.coefficients_at(irreps, {"z": z})
    mirror, slack = site.coefficients_at([r.conjugate for r in irreps], {"z": 1 / z})
    power = z ** (copies * irrep.dimension)
    assert np.all(np.abs(w - power * mirror) <= error + power * slack)


def test_fermion_class_function_in_loops() -> None:
    G = SU(3)
    L, star = sympy.symbols("L L^*")
    assert static_fermions(G, "z").class_function().in_loops() == 1 + Z * L + Z**2 * star + Z**3


def test_boson_coefficients_are_rational_functions() -> None:
    # Cauchy's identity by hand: Σ_m z^{2m} dim GL(3)(m, m) = Σ_m z^{2m} (m + 1)(m + 2)/2
    w = static_bosons(SU(2), "z", copies=3).coefficient(SU(2).trivial)
    assert sympy.simplify(w - 1 / (1 - Z**2) ** 3) == 0
    assert sympy.simplify(static_bosons(SU(3), "z").coefficient(SU(3).irrep(4, 0)) - Z**4) == 0
    assert static_bosons(SU(3), "z").coefficient(SU(3).irrep(1, 1)) == 0


def test_many_digits_of_fields_and_bosons() -> None:
    import mpmath

    mpmath.mp.dps = 70
    found = loop_field(SU(2), {"2": "h"}).coefficient(SU(2).trivial).subs(H, sympy.Rational(1, 2)).evalf(60)
    assert abs(mpmath.mpf(str(found)) - 2 * mpmath.besseli(1, 1)) < mpmath.mpf(10) ** -58
    G = SU(4)
    assert static_bosons(G, "z", "y").coefficient(G.irrep(0, 1, 0)).subs({Z: 0.4, Y: 0.2}).evalf(40) == 0


def test_products_keep_exact_coefficients_with_one_infinite_factor() -> None:
    G = SU(3)
    site = static_fermions(G, "z") * loop_field(G, {"8": "h"}) * static_fermions(G, "y")
    assert len(site.sites) == 3
    assert not site.finite
    exact = site.coefficient(G.fundamental).subs({Z: 0.3, Y: 0.2, H: 0.1}).evalf()
    w, error = site.coefficients_at([G.fundamental], {"z": 0.3, "y": 0.2, "h": 0.1})
    assert abs(float(exact) - w[0]) <= 10 * error[0]
    with pytest.raises(TypeError):
        site * 2  # type: ignore[operator]
    with pytest.raises(TypeError):
        site * heat_kernel(G, 1)  # type: ignore[operator]
    with pytest.raises(GroupError):
        site * static_fermions(SU(2), "z")


def test_physical_inputs_become_fugacities() -> None:
    G = SU(3)
    m, mu, T = sympy.symbols("m mu T")
    quarks = static_fermions(G, mass="m", mu="mu", temperature="T", copies=2)
    assert quarks.z == sympy.exp((mu - m) / T)
    assert quarks.zbar == sympy.exp(-(mu + m) / T)
    heavy = static_fermions(G, kappa="kappa", n_t=4, mu="mu")
    assert heavy.z == 16 * sympy.Symbol("kappa") ** 4 * sympy.exp(4 * mu)
    assert static_fermions(G, kappa=0.1, n_t=4, mu="mu", temperature="T").z == sympy.exp(mu / T) / 625
    imaginary = static_fermions(G, mass=1, mu="I*theta*T", temperature="T")
    w, _ = imaginary.coefficients_at(G.irreps(1), {"theta": 0.4, "T": 0.5})
    assert np.abs(w[1] - np.conj(w[2])) < 1e-15  # W real on the torus at imaginary μ


def test_species_split_by_isospin() -> None:
    G = SU(3)
    doublet = [Species("m", "mu", isospin="1/2"), Species("m", "mu", isospin=Fraction(-1, 2))]
    site = static_species(G, doublet, "T", "mu_I")
    values = {"m": 1.0, "mu": 0.3, "T": 0.5, "mu_I": 0.4}
    up = static_fermions(G, mass=1, mu=0.5, temperature=0.5)
    down = static_fermions(G, mass=1, mu=0.1, temperature=0.5)
    w, error = site.coefficients_at(G.irreps(2), values)
    other, slack = (up * down).coefficients_at(G.irreps(2), {})
    assert np.all(np.abs(w - other) <= error + slack)
    mixed = static_species(G, [Species("m", irrep="8", statistics="bosons", copies=3)], "T")
    assert mixed.kind == "static bosons"


@pytest.mark.parametrize(
    ("make", "error", "words"),
    [
        (lambda: static_fermions(SU(3)), ParameterError, "z is missing"),
        (lambda: static_fermions(SU(3), "z", mu="mu"), ParameterError, "z and mu were given"),
        (lambda: static_fermions(SU(3), zbar="y", mass=1, temperature=1), ParameterError, "zbar"),
        (lambda: static_fermions(SU(3), mass=1), ParameterError, "temperature is missing"),
        (lambda: static_fermions(SU(3), mass=1, kappa=0.1, n_t=4), ParameterError, "not both"),
        (lambda: static_fermions(SU(3), kappa=0.1), ParameterError, "n_t is missing"),
        (
            lambda: static_fermions(SU(3), mass=1, temperature=1, n_t=4),
            ParameterError,
            "it goes with kappa: leave it out",
        ),
        (lambda: static_fermions(SU(3), mass=1, temperature=-1), ParameterError, "temperature = -1"),
        (lambda: static_fermions(SU(3), kappa=-1, n_t=2), ParameterError, "kappa = -1"),
        (lambda: static_fermions(SU(3), charge=1), ParameterError, "charge is no input"),
        (lambda: static_fermions(SU(3), "z", copies=0), ParameterError, "copies 0 given.*spin states"),
        (lambda: static_fermions(SU(3), "z", copies=1.5), ParameterError, "copies 1.5 given"),
        (lambda: static_bosons(SU(3), 1), ParameterError, r"z = 1 .*\|z\| < 1"),
        (lambda: static_bosons(SU(3), mass=1, mu=2, temperature=1), ParameterError, "z = 2.71828"),
        (lambda: static_species(SU(3), [], "T"), ParameterError, "give a list such as"),
        (lambda: static_species(SU(3), [Species(1, statistics="anyons")], "T"), ParameterError, "anyons"),  # type: ignore[arg-type]
        (lambda: loop_field(SU(3), {}), ParameterError, "table"),
        (lambda: loop_field(SU(3), {"3": "h", (1, 0): "g"}), ParameterError, "twice"),
    ],
)
def test_contradictions_and_bad_domains_are_refused(make: Any, error: type[Exception], words: str) -> None:
    with pytest.raises(error, match=words):
        make()


def test_divergence_at_evaluation_is_refused() -> None:
    G = SU(3)
    with pytest.raises(ParameterError, match=r"z = 1\.2 is not allowed"):
        static_bosons(G, "z").coefficients_at(G.irreps(1), {"z": [0.5, 1.2]})
    with pytest.raises(ParameterError, match=r"zbar = -1"):
        static_bosons(G, "z", "y").norm_bound({"z": 0.1, "y": -1.0})
    with pytest.raises(ConvergenceError, match=r"edge \|z\| = 1"):
        static_bosons(G, "z").coefficients_at(G.irreps(1), {"z": 0.99999})
    with pytest.raises(MissingValueError, match="y"):
        static_fermions(G, "z", "y").coefficients_at(G.irreps(1), {"z": 1.0})


def test_numbers_at_zero_fugacity() -> None:
    G = SU(3)
    for value in (0.0, 0j):
        w, _ = static_fermions(G, "z", "y").coefficients_at(G.irreps(1), {"z": value, "y": value})
        assert w.tolist() == [1, 0, 0]


def test_density_is_the_determinant_of_the_eigenvalues(rng: np.random.Generator) -> None:
    G = SU(4)
    angles = rng.uniform(-3, 3, (6, 3))
    full = np.concatenate([angles, -angles.sum(axis=1, keepdims=True)], axis=1)
    expected = (1 + 0.3 * np.exp(1j * full)).prod(axis=1) ** 2 * (1 + 0.2j * np.exp(-1j * full)).prod(
        axis=1
    ) ** 2
    found = static_fermions(G, "z", "y", 2).density_at(angles, {"z": 0.3, "y": 0.2j})
    assert np.allclose(found, expected, rtol=1e-13)
    loop = characters([G.fundamental], angles)[:, 0]
    assert np.allclose(loop_field(G, {"4": "h"}).density_at(angles, {"h": 0.4}), np.exp(0.4 * loop))


@pytest.mark.parametrize("make", [static_fermions, static_bosons])
def test_absurdly_many_copies_are_refused(make: Any) -> None:
    with pytest.raises(SizeError, match=r"copies 1,000,000 given; at most 100 .* take fewer"):
        make(SU(3), "z", copies=10**6)
    assert make(SU(3), "z", copies=100).copies == 100


def test_too_long_a_polynomial_is_refused_and_numbers_are_not() -> None:
    site = static_fermions(SU(3), "z", "y", copies=100)
    with pytest.raises(SizeError, match=r"30,197 terms, more than 10,000.*ask for numbers"):
        site.coefficient(SU(3).adjoint)
    w, error = site.coefficients_at([SU(3).adjoint], {"z": 0.02, "y": 0.01})
    angles, weights = haar_grid(SU(3), 60)
    density = site.density_at(angles, {"z": 0.02, "y": 0.01})
    expected = np.sum(weights * density * characters([SU(3).adjoint], angles)[:, 0].conj())
    assert abs(w[0] - expected) <= error[0] + 1e-11 * abs(expected)


@given(st.lists(st.integers(0, 6), min_size=3, max_size=3), st.integers(1, 7))
def test_dimensions_of_gl_n_by_weyls_formula(steps: list[int], n: int) -> None:
    """∏_{i<j} (λ_i − λ_j + j − i)/(j − i) over all n rows (Weyl), and the same for the transposed diagram."""
    rows = tuple(sum(steps[i:]) for i in range(3))
    transposed = tuple(sum(row > column for row in rows) for column in range(rows[0]))

    def weyl(diagram: tuple[int, ...]) -> Fraction:
        if any(diagram[n:]):
            return Fraction(0)
        full = [*diagram[:n], *[0] * (n - len(diagram))]
        pairs = [(i, j) for i in range(n) for j in range(i + 1, n)]
        return math.prod((Fraction(full[i] - full[j] + j - i, j - i) for i, j in pairs), start=Fraction(1))

    assert general_linear_dimension(rows, n) == weyl(rows)
    assert transposed_dimension(rows, n) == weyl(transposed)
