"""Settings that stand in cells of the sheet: what each cell shows, and the settings that a reader's change asks for.

A cell that still shows what was written means the recorded setting, exactly; an emptied one means the default.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from typing import Any

from sheetfuncs.errors import ArgumentError
from sheetfuncs.report.elements import Value

# In the order of their cells; the hidden name _sheetfuncs_entry_1 points at the first, and so on.
ENTRY_FIELDS = ("response", "predictors", "date_predictors", "base_levels", "intercept", "order", "level")
LABELS = {
    "response": "Response", "predictors": "Predictors", "date_predictors": "Dates used as predictors",
    "base_levels": "Base levels", "intercept": "Intercept", "order": "Time order", "level": "Interval level",
}
NOTES = {
    "response": "A header of the data, or a column letter. Empty: the first column.",
    "predictors": "Headers or column letters, with semicolons between them. Empty: all other columns.",
    "date_predictors": "Columns of dates to count in days, with semicolons between them.",
    "base_levels": "Category = level that its other levels are compared with. Empty: the first that appears.",
    "intercept": "yes, or no: the fit goes through zero.",
    "order": "The column that says the time order. Empty: a single column of dates, else the rows' own order.",
    "level": "Level of the intervals, between 50 % and 99.99 %.",
}
YES_OR_NO = ("yes", "no")


def shown_entries(settings: Mapping[str, Any], base_levels: Sequence[tuple[str, str]] = ()) -> dict[str, Value]:
    """What each cell shows, by field. base_levels: (category, base) of every category in the fit."""
    return {
        "response": settings["response"],
        "predictors": "; ".join(settings["predictors"]),
        "date_predictors": "; ".join(settings["date_predictors"]) or None,
        "base_levels": "; ".join(f"{name} = {base}" for name, base in base_levels) or None,
        "intercept": YES_OR_NO[0 if settings["intercept"] else 1],
        "order": settings["order"],
        "level": float(settings["level"]),
    }


def settings_from_entries(recorded: Mapping[str, Any], entries: Mapping[str, Value | bool]) -> dict[str, Any]:
    """The recorded settings, changed as the cells say.

    recorded: of our sheet, with "shown": what the cells showed when it was written. entries: what they hold now, by
    field; a field that is not there counts as unchanged. Raises ArgumentError for an entry that is not understood.
    """
    shown = recorded.get("shown") or {}
    settings = {name: value for name, value in recorded.items() if name not in ("shown", "fingerprint")}
    for name in ENTRY_FIELDS:
        if name in entries and name in shown and not _same(entries[name], shown[name]):
            settings[name] = _READERS[name](name, entries[name])
    return settings


def _same(now: Value | bool, shown: Value) -> bool:
    if isinstance(now, int | float) and isinstance(shown, int | float):
        return math.isclose(now, shown, rel_tol=1e-9)
    return _text(now) == _text(shown)


def _text(value: Value | bool) -> str:
    return "" if value is None else " ".join(str(value).split())


def _one(name: str, value: Value | bool) -> str | None:
    return _text(value) or None


def _several(name: str, value: Value | bool) -> list[str]:
    """Names between semicolons; between commas where there is no semicolon, since that is what many will type."""
    text = _text(value)
    parts = [part.strip() for part in text.split(";" if ";" in text else ",")]
    return [part for part in parts if part]


def _pairs(name: str, value: Value | bool) -> dict[str, str]:
    found = {}
    for part in _several(name, value):
        category, sign, level = part.rpartition("=")
        if not sign or not category.strip() or not level.strip():
            raise _refused(name, part, "write the category, = and the level, such as Site = north")
        found[category.strip()] = level.strip()
    return found


def _yes(name: str, value: Value | bool) -> bool:
    word = _text(value).casefold()
    if word in ("", "yes", "true", "1", "1.0"):
        return True
    if word in ("no", "false", "0", "0.0"):
        return False
    raise _refused(name, value, "write yes or no")


def _level(name: str, value: Value | bool) -> float:
    text = _text(value)
    if not text:
        return 0.95
    percent = text.endswith("%")
    try:
        level = float(text.rstrip("% ").replace(",", "."))
    except ValueError:
        level = math.nan
    level = level / 100.0 if percent or level > 1.0 else level
    if not 0.5 <= level <= 0.9999:
        raise _refused(name, value, "write a level between 50 % and 99.99 %")
    return level


def _refused(name: str, value: object, cure: str) -> ArgumentError:
    return ArgumentError(f"Under Settings, {LABELS[name]} says “{str(value)[:60]}”: {cure}.")


_READERS: Mapping[str, Callable[[str, Value | bool], Any]] = {
    "response": _one, "predictors": _several, "date_predictors": _several, "base_levels": _pairs, "intercept": _yes,
    "order": _one, "level": _level,
}


def changed_entries(recorded: Mapping[str, Any], settings: Mapping[str, Any]) -> list[str]:
    """Labels of the settings that the cells changed."""
    return [LABELS[name] for name in ENTRY_FIELDS if name in recorded and settings.get(name) != recorded[name]]
