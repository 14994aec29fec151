"""One BLAS thread for many small matrices.

The matrices of a truncated T are small: handing each to several threads costs more than it saves,
and stalls where other processes hold the cores.
"""

from __future__ import annotations

from collections.abc import Callable
from contextlib import AbstractContextManager, nullcontext
from functools import lru_cache, wraps
from typing import Any, ParamSpec, TypeVar

__all__ = ["single_threaded"]

P = ParamSpec("P")
R = TypeVar("R")


def single_threaded(function: Callable[P, R]) -> Callable[P, R]:
    """Run a function with BLAS on one thread, if threadpoolctl is installed."""

    @wraps(function)
    def wrapped(*arguments: P.args, **keywords: P.kwargs) -> R:
        with _limit():
            return function(*arguments, **keywords)

    return wrapped


def _limit() -> AbstractContextManager[Any]:
    controller = _controller()
    if controller is None:
        return nullcontext()
    limit: AbstractContextManager[Any] = controller.limit(limits=1, user_api="blas")
    return limit


@lru_cache(maxsize=1)
def _controller() -> Any:
    try:
        from threadpoolctl import ThreadpoolController
    except ImportError:
        return None
    # the controller sees only what is loaded: SciPy brings a BLAS of its own
    import scipy.linalg  # noqa: F401

    return ThreadpoolController()
