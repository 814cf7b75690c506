"""One BLAS thread for small factorizations: waking a second one costs many times the work it takes over."""

from __future__ import annotations

from contextlib import AbstractContextManager, nullcontext
from functools import cache

from threadpoolctl import ThreadpoolController

# Measured on two cores: up to this many matrix elements one thread is never slower.
ONE_THREAD_BELOW = 20_000_000


@cache
def _controller() -> ThreadpoolController:
    return ThreadpoolController()


def few_threads(elements: int) -> AbstractContextManager:
    """A context with one BLAS thread where the matrix has fewer than ONE_THREAD_BELOW elements."""
    if elements >= ONE_THREAD_BELOW:
        return nullcontext()
    return _controller().limit(limits=1, user_api="blas")
