"""Speed of the exact layer, as ratios to general-purpose polynomial arithmetic in the same run.

Run ``python tests/benchmarks/bench_algebra.py``. The general-purpose route writes both characters as
polynomials in the eigenvalues, multiplies them, and peels off highest weights: the leading monomial of what
is left names an irrep, whose character is subtracted that many times. It is given all characters for
nothing (their construction is not timed), so the ratios favour it. Our own times are those of the kernels
with empty caches, except where a line says otherwise. Best of several rounds.
"""

from __future__ import annotations

import sys
import time
import tracemalloc
from collections.abc import Callable
from itertools import product
from pathlib import Path
from typing import Any

import sympy
from flint import Ordering, fmpz_mpoly_ctx
from sympy.polys.orderings import lex
from sympy.polys.rings import ring

sys.path.insert(0, str(Path(__file__).parents[2] / "src"))

from haarloom.algebra import powers, products, weights
from haarloom.algebra.group import SU
from haarloom.algebra.invariants import dimension
from haarloom.algebra.labels import labels_from_rows, labels_up_to, rows_from_labels
from haarloom.algebra.loops import polynomial

Labels = tuple[int, ...]


def best(action: Callable[[], Any], rounds: int = 5, before: Callable[[], None] = lambda: None) -> float:
    """Shortest time of one call in seconds; ``before`` runs untimed ahead of each."""
    times = []
    for _ in range(rounds):
        before()
        start = time.perf_counter()
        action()
        times.append(time.perf_counter() - start)
    return min(times)


def clear() -> None:
    """Empty every cache a product or a character can use."""
    products._multiply.clear()
    weights.contents.clear()
    powers._newton.clear()
    polynomial.clear()
    dimension.cache_clear()


class Peeling:
    """A product by polynomial multiplication and peeling, for any ring with the dict interface below."""

    def __init__(self, left: Labels, right: Labels, make: Callable[[dict[Labels, int]], Any]) -> None:
        self.make = make
        self.boxes = sum(rows_from_labels(left)) + sum(rows_from_labels(right))
        self.n = len(left) + 1
        self.factors = [make(dict(weights.contents(rows_from_labels(labels)))) for labels in (left, right)]
        self.characters = {labels: self.character(labels) for labels in products.multiply(left, right)}

    def character(self, labels: Labels) -> Any:
        """Character with as many boxes as the product has: whole columns are powers of x_1 ⋯ x_N."""
        rows = rows_from_labels(labels)
        columns = (self.boxes - sum(rows)) // self.n
        return self.make(dict(weights.contents(tuple(row + columns for row in rows))))

    def run(self) -> dict[Labels, int]:
        rest = self.factors[0] * self.factors[1]
        found: dict[Labels, int] = {}
        while rest:
            rows, count = self.leading(rest)
            labels = labels_from_rows(rows)
            found[labels] = int(count)
            rest = rest - count * self.characters[labels]
        return found

    def leading(self, polynomial: Any) -> tuple[Labels, Any]:
        raise NotImplementedError


class SympyRing(Peeling):
    def __init__(self, left: Labels, right: Labels) -> None:
        names = [f"x{j}" for j in range(len(left) + 1)]
        self.ring = ring(names, sympy.ZZ, lex)[0]
        super().__init__(left, right, self.ring.from_dict)

    def leading(self, polynomial: Any) -> tuple[Labels, Any]:
        return polynomial.leading_expv(), polynomial.LC


class SympyPoly(Peeling):
    def __init__(self, left: Labels, right: Labels) -> None:
        self.symbols = sympy.symbols(f"x:{len(left) + 1}")
        super().__init__(left, right, lambda terms: sympy.Poly(terms, *self.symbols, domain="ZZ"))

    def leading(self, polynomial: Any) -> tuple[Labels, Any]:
        monomial, count = polynomial.LT()
        return monomial.exponents, count


class FlintPoly(Peeling):
    def __init__(self, left: Labels, right: Labels) -> None:
        names = [f"x{j}" for j in range(len(left) + 1)]
        self.context = fmpz_mpoly_ctx.get(names, Ordering.lex)
        super().__init__(left, right, self.context.from_dict)

    def leading(self, polynomial: Any) -> tuple[Labels, Any]:
        return tuple(map(int, polynomial.monomial(0))), polynomial.coefficient(0)


def compare_product(left: Labels, right: Labels, routes: list[type[Peeling]]) -> list[tuple[str, str, str]]:
    """One line for us and one for each route, all checked against each other."""
    kernel = products._multiply_su3 if len(left) == 2 else products.multiply_by_reflection
    expected = kernel(left, right)
    ours = best(lambda: kernel(left, right), 20, clear)
    title = f"SU({len(left) + 1}) {left} ⊗ {right}"
    lines = [(title + ", this package", f"{ours * 1e3:.3f} ms", "1")]
    for route in routes:
        prepared = route(left, right)
        assert prepared.run() == expected
        theirs = best(prepared.run, 3)
        lines.append(
            (f"  {route.__name__}, multiply and peel", f"{theirs * 1e3:.1f} ms", f"{theirs / ours:.0f}")
        )
    return lines


def single(title: str, action: Callable[[], Any], target: str, rounds: int = 5) -> tuple[str, str, str]:
    return title, f"{best(action, rounds, clear) * 1e3:.2f} ms", target


def main() -> None:
    """Print the table."""
    lines = compare_product((12, 7), (9, 11), [SympyPoly, SympyRing, FlintPoly])
    lines += compare_product((1, 1, 1, 1), (1, 2, 1, 0), [SympyRing, FlintPoly])
    thousand = [labels for labels in labels_up_to(4, 8) if 900 <= dimension(labels) <= 1100]
    slowest = max(
        best(lambda a=a, b=b: products.multiply(a, b), 3, clear) for a in thousand for b in thousand
    )
    lines.append(
        (
            f"SU(5), slowest of {len(thousand)}² products of dimension 900–1100",
            f"{slowest * 1e3:.2f} ms",
            "< 20 ms",
        )
    )
    basis = labels_up_to(2, 10)
    lines.append(
        single(
            "SU(3) product table, p+q ≤ 10 (66 × 66)",
            lambda: [products.multiply(a, b) for a in basis for b in basis],
            "< 1500 ms",
            3,
        )
    )
    character = SU(3).irrep(10, 10).character()
    lines.append(single("SU(3) χ of (10,10) in loops", character.in_loops, "< 50 ms"))
    lines.append(single("SU(3) χ of (10,10) in power sums", character.in_power_sums, ""))
    lines.append(
        single(
            "SU(3) 8: all antisymmetric powers",
            lambda: [powers.antisymmetric((1, 1), 1, k) for k in range(9)],
            "",
        )
    )
    width = max(len(line[0]) for line in lines)
    print(f"{'':{width}}  {'time':>12}  ratio or target")
    for title, measured, note in lines:
        print(f"{title:{width}}  {measured:>12}  {note}")
    print_caches()


def print_caches() -> None:
    """Bounds of the caches, with the memory of a term measured on the SU(3) product table."""
    basis = labels_up_to(2, 10)
    clear()
    tracemalloc.start()
    for a, b in product(basis, basis):
        products.multiply(a, b)
    a_term = tracemalloc.get_traced_memory()[0] / products._multiply.held()
    tracemalloc.stop()
    print(f"one cached term: {a_term:.0f} bytes, measured on {products._multiply.held():,} terms")
    caches = {
        "products": products._multiply,
        "weight systems": weights.contents,
        "powers": powers._newton,
        "characters in loops": polynomial,
    }
    for name, cache in caches.items():
        print(f"cache of {name}: at most {cache.limit:,} terms, about {cache.limit * a_term / 2**20:.0f} MiB")


if __name__ == "__main__":
    main()
