"""One BLAS thread for small factorizations: waking a second one costs many times the work it takes over."""

from __future__ import annotations

import threading
from contextlib import AbstractContextManager, nullcontext
from functools import cache

from threadpoolctl import LibController, ThreadpoolController

# Measured on two cores: up to this many matrix elements one thread is never slower.
ONE_THREAD_BELOW = 20_000_000

_active = threading.local()


@cache
def blas_libraries() -> list[LibController]:
    """The BLAS libraries that are loaded: numpy and scipy bring one each."""
    return ThreadpoolController().select(user_api="blas").lib_controllers


class _OneThread:
    """Holds every BLAS library to one thread; threadpoolctl's own context describes every library each time, which
    takes longer than a small factorization."""

    def __enter__(self) -> None:
        self.counts = [(library, library.num_threads or 1) for library in blas_libraries()]
        _active.limited = True
        for library, _ in self.counts:
            library.set_num_threads(1)

    def __exit__(self, *_: object) -> None:
        _active.limited = False
        for library, count in self.counts:
            library.set_num_threads(count)


_AS_IT_IS: AbstractContextManager[None] = nullcontext()


def few_threads(elements: int) -> AbstractContextManager[None]:
    """A context with one BLAS thread where the matrix has fewer than ONE_THREAD_BELOW elements.

    Inside such a context a further one does nothing.
    """
    if elements >= ONE_THREAD_BELOW or getattr(_active, "limited", False):
        return _AS_IT_IS
    return _OneThread()
