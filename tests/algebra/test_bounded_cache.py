"""The cache that is bounded by terms."""

from __future__ import annotations

from collections.abc import Mapping
from concurrent.futures import ThreadPoolExecutor

from haarloom.algebra import powers, products, weights
from haarloom.algebra.bounded_cache import cached_terms
from haarloom.algebra.labels import labels_up_to


def counting(limit: int) -> tuple[object, list[int]]:
    calls: list[int] = []

    @cached_terms(limit=limit)
    def terms(size: int) -> Mapping[int, int]:
        calls.append(size)
        return dict.fromkeys(range(size), 1)

    return terms, calls


def test_a_result_is_computed_once() -> None:
    terms, calls = counting(100)
    assert terms(5) is terms(5)
    assert calls == [5]


def test_the_least_recently_used_result_goes_first() -> None:
    terms, calls = counting(40)
    for size in (10, 9, 8, 10, 7, 6, 5, 10, 9, 8):
        terms(size)
    assert calls == [10, 9, 8, 7, 6, 5, 9, 8]


def test_terms_held_never_exceed_the_limit() -> None:
    terms, _ = counting(50)
    for size in range(13):
        terms(size)
        assert terms.held() <= 50


def test_a_result_too_large_is_returned_but_not_kept() -> None:
    terms, calls = counting(40)
    assert len(terms(11)) == len(terms(11)) == 11
    assert calls == [11, 11]


def test_empty_results_are_bounded_as_well() -> None:
    @cached_terms(limit=8)
    def nothing(_: int) -> Mapping[int, int]:
        return {}

    for argument in range(100):
        nothing(argument)
    assert nothing.held() <= 8


def test_threads_agree_and_leave_the_bound_intact() -> None:
    basis = labels_up_to(2, 5)
    products._multiply.clear()
    with ThreadPoolExecutor(8) as pool:
        results = list(
            pool.map(lambda pair: dict(products.multiply(*pair)), [(a, b) for a in basis for b in basis] * 2)
        )
    assert results[: len(basis) ** 2] == results[len(basis) ** 2 :]
    assert products._multiply.held() == sum(
        len(products.multiply(a, b)) for a in basis for b in basis if a <= b
    )


def test_every_cache_of_the_station_states_its_bound() -> None:
    for cache in (products._multiply, weights.contents, powers._newton):
        assert 0 < cache.limit <= 200_000
