"""Changes that leave no steps of undo of their own, because one action stands for all of them."""

from __future__ import annotations

from contextlib import contextmanager, suppress

from com.sun.star.util import NotLockedException


@contextmanager
def unrecorded(document):
    """Changes inside are not recorded; see `keep_unrecorded`."""
    manager = document.getUndoManager()
    manager.lock()
    try:
        yield
    finally:
        manager.unlock()


def keep_unrecorded(document) -> None:
    """To be called inside before each change that would be recorded; outside it does nothing.

    Some changes (a copied sheet, a page style, a print range) switch recording on again, of which the count of locks
    knows nothing. What is recorded within an undo or redo ends the program.
    """
    manager = document.getUndoManager()
    with suppress(NotLockedException):
        manager.unlock()
        manager.lock()
