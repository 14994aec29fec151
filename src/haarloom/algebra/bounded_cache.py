"""A least-recently-used cache whose bound is the number of terms it holds, not the number of calls.

A product of two irreps may have one term or ten thousand, so a bound on calls alone would not bound the memory.
"""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Callable, Hashable, Mapping
from functools import wraps
from threading import Lock
from types import MappingProxyType
from typing import Any

__all__ = ["cached_terms"]


def cached_terms(limit: int) -> Callable[[Callable[..., dict[Any, int]]], Callable[..., Mapping[Any, int]]]:
    """Decorate a function that returns a dict; at most ``limit`` dict entries stay in memory, over all results.

    Results come back read-only. A result larger than a quarter of the limit is returned but not kept. An entry
    costs about 200 bytes (a tuple of small integers, its count, its slot), so a limit of 100,000 is about 20 MB.
    The decorated function carries ``held()``, the number of entries now in memory, ``limit`` and ``clear()``.
    """

    def decorate(function: Callable[..., dict[Any, int]]) -> Callable[..., Mapping[Any, int]]:
        kept = _TermCache(limit)

        @wraps(function)
        def cached(*arguments: Hashable) -> Mapping[Any, int]:
            found = kept.get(arguments)
            if found is None:
                found = MappingProxyType(function(*arguments))
                kept.put(arguments, found)
            return found

        cached.__dict__.update(held=kept.held, clear=kept.clear, limit=limit)
        return cached

    return decorate


class _TermCache:
    """Results by arguments, the least recently used dropped first, safe under threads."""

    def __init__(self, limit: int) -> None:
        self.limit = limit
        self.terms = 0
        self.results: OrderedDict[Hashable, Mapping[Any, int]] = OrderedDict()
        self.lock = Lock()

    def get(self, key: Hashable) -> Mapping[Any, int] | None:
        with self.lock:
            found = self.results.get(key)
            if found is not None:
                self.results.move_to_end(key)
            return found

    def put(self, key: Hashable, result: Mapping[Any, int]) -> None:
        with self.lock:
            if key in self.results or 4 * _cost(result) > self.limit:
                return
            self.results[key] = result
            self.terms += _cost(result)
            while self.terms > self.limit:
                self.terms -= _cost(self.results.popitem(last=False)[1])

    def held(self) -> int:
        return self.terms

    def clear(self) -> None:
        with self.lock:
            self.results.clear()
            self.terms = 0


def _cost(result: Mapping[Any, int]) -> int:
    """Entries that a result counts for: at least one, so that empty results are bounded as well."""
    return max(1, len(result))
