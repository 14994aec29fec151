"""One BLAS thread for many small matrices.

The matrices of a truncated T are small: handing each to several threads costs more than it saves,
and stalls where other processes hold the cores.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache, wraps
from typing import Any, ParamSpec, TypeVar

__all__ = ["single_threaded"]

P = ParamSpec("P")
R = TypeVar("R")


def single_threaded(function: Callable[P, R]) -> Callable[P, R]:
    """Run a function with BLAS on one thread."""

    @wraps(function)
    def wrapped(*arguments: P.args, **keywords: P.kwargs) -> R:
        with _controller().limit(limits=1, user_api="blas"):
            return function(*arguments, **keywords)

    return wrapped


@lru_cache(maxsize=1)
def _controller() -> Any:
    # the controller sees only what is loaded: SciPy brings a BLAS of its own
    import scipy.linalg  # noqa: F401
    from threadpoolctl import ThreadpoolController

    return ThreadpoolController()
