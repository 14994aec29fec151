"""A least-recently-used cache whose bound is the number of terms it holds, not the number of calls.

A product of two irreps may have one term or ten thousand, so a bound on calls alone would not bound the
memory.
"""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Callable, Hashable, Sized
from functools import wraps
from threading import Lock
from typing import Generic, ParamSpec, TypeVar

__all__ = ["cached_terms"]

Arguments = ParamSpec("Arguments")
Result = TypeVar("Result", bound=Sized)


def cached_terms(limit: int) -> Callable[[Callable[Arguments, Result]], Callable[Arguments, Result]]:
    """Decorate a function of positional arguments that returns a read-only mapping or a tuple.

    At most ``limit`` terms stay in memory, over all results; a result larger than a quarter of the limit is
    returned but not kept. A term of integers costs 100 to 250 bytes (a tuple of labels, its count, its slot),
    so a limit of 100,000 is 10 to 25 MB. The decorated function carries ``held()``, the number of terms now
    in memory, ``limit`` and ``clear()``.
    """

    def decorate(function: Callable[Arguments, Result]) -> Callable[Arguments, Result]:
        kept: _TermCache[Result] = _TermCache(limit)

        @wraps(function)
        def cached(*arguments: Arguments.args, **_: Arguments.kwargs) -> Result:
            found = kept.get(arguments)
            if found is None:
                found = function(*arguments)  # type: ignore[call-arg]
                kept.put(arguments, found)
            return found

        cached.__dict__.update(held=kept.held, clear=kept.clear, limit=limit)
        return cached

    return decorate


class _TermCache(Generic[Result]):
    """Results by arguments, the least recently used dropped first, safe under threads."""

    def __init__(self, limit: int) -> None:
        self.limit = limit
        self.terms = 0
        self.results: OrderedDict[Hashable, Result] = OrderedDict()
        self.lock = Lock()

    def get(self, key: Hashable) -> Result | None:
        with self.lock:
            found = self.results.get(key)
            if found is not None:
                self.results.move_to_end(key)
            return found

    def put(self, key: Hashable, result: Result) -> None:
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


def _cost(result: Sized) -> int:
    """Terms that a result counts for: at least one, so that empty results are bounded as well."""
    return max(1, len(result))
