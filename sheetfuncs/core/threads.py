"""One BLAS thread for small factorizations: waking a second one costs many times the work it takes over."""

from __future__ import annotations

import threading
from collections.abc import Iterator
from contextlib import contextmanager
from functools import cache

from threadpoolctl import ThreadpoolController

# Measured on two cores: up to this many matrix elements one thread is never slower.
ONE_THREAD_BELOW = 20_000_000

_active = threading.local()


@cache
def _controller() -> ThreadpoolController:
    return ThreadpoolController()


@contextmanager
def few_threads(elements: int) -> Iterator[None]:
    """A context with one BLAS thread where the matrix has fewer than ONE_THREAD_BELOW elements.

    Setting the limit costs 0.1 ms, so that inside such a context a further one does nothing.
    """
    if elements >= ONE_THREAD_BELOW or getattr(_active, "limited", False):
        yield
        return
    _active.limited = True
    try:
        with _controller().limit(limits=1, user_api="blas"):
            yield
    finally:
        _active.limited = False
