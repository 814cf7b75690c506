"""The little that xlwings has no word for, asked of Excel itself: COM names on Windows, scripting names on macOS."""

from __future__ import annotations

import sys
from contextlib import suppress
from typing import Any


def on_mac() -> bool:
    """Whether this is macOS, where xlwings speaks to Excel by scripting, and Excel has no functions in Python."""
    return sys.platform == "darwin"


def ask(thing: Any, windows: str, mac: str) -> Any:
    """A property of Excel's own object behind an xlwings one; None where Excel does not answer.

    Whatever is asked here is worth knowing, but nothing that a check could not do without.
    """
    with suppress(Exception):
        return getattr(thing.api, mac).get() if on_mac() else getattr(thing.api, windows)
    return None


def tell(thing: Any, windows: str, mac: str, value: Any) -> None:
    """Set such a property, where Excel lets us."""
    with suppress(Exception):
        if on_mac():
            getattr(thing.api, mac).set(value)
        else:
            setattr(thing.api, windows, value)
