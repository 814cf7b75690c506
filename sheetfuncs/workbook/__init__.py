"""The file itself: read a range, insert or replace a sheet, leave every other part as it was."""

from __future__ import annotations

import importlib
from typing import Any

_HOME = {
    "Insertion": "insert",
    "insert_sheet": "insert",
    "insert_in_place": "in_place",
    "keep_for_undo": "in_place",
    "undo": "in_place",
    "Undone": "in_place",
    "opened_by": "locks",
    "OurSheet": "settings",
    "find_our_sheets": "settings",
    "settings_from_names": "settings",
    "sheet_title": "titles",
}


def __getattr__(name: str) -> Any:
    """Load a public name's module at its first use, so that importing the package costs nothing."""
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(importlib.import_module(f"{__name__}.{_HOME[name]}"), name)


def __dir__() -> list[str]:
    return sorted([*globals(), *_HOME])
