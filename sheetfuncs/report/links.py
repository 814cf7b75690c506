"""Jumps from the sheet to the data."""

from __future__ import annotations

import re

from sheetfuncs.report.elements import quoted

_CORNER = re.compile(r"([A-Za-z]{0,3})(\d*)")


def to_area(sheet: str, area: str) -> str:
    """The top left cell of the data: "'Jobs'!B3" for "B3:F64", "$B$3:$F$64", "B:F" (its first row) or "3:64"."""
    letters, row = _corner(area)
    return f"{quoted(sheet)}!{letters}{row}"


def to_row(sheet: str, area: str, row: int) -> str:
    """The first cell of a data row."""
    return f"{quoted(sheet)}!{_corner(area)[0]}{row}"


def _corner(area: str) -> tuple[str, str]:
    found = _CORNER.match(area.replace("$", "").strip())
    letters, row = found.groups() if found else ("", "")
    return letters.upper() or "A", row or "1"
