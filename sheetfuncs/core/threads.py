"""One BLAS thread for small factorizations: waking a second one costs many times the work it takes over."""

from __future__ import annotations

import threading
from collections.abc import Iterator
from contextlib import contextmanager
from functools import cache

from threadpoolctl import LibController, ThreadpoolController

# Measured on two cores: up to this many matrix elements one thread is never slower.
ONE_THREAD_BELOW = 20_000_000

_active = threading.local()


@cache
def blas_libraries() -> list[LibController]:
    """The BLAS libraries that are loaded: numpy and scipy bring one each."""
    return ThreadpoolController().select(user_api="blas").lib_controllers


@contextmanager
def few_threads(elements: int) -> Iterator[None]:
    """A context with one BLAS thread where the matrix has fewer than ONE_THREAD_BELOW elements.

    Inside such a context a further one does nothing.
    """
    if elements >= ONE_THREAD_BELOW or getattr(_active, "limited", False):
        yield
        return
    # threadpoolctl's own context describes every library each time, which takes longer than a small factorization.
    counts = [(library, library.num_threads or 1) for library in blas_libraries()]
    _active.limited = True
    try:
        for library, _ in counts:
            library.set_num_threads(1)
        yield
    finally:
        _active.limited = False
        for library, count in counts:
            library.set_num_threads(count)
