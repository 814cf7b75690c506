"""How our sheets are recognised: by a hidden name of the sheet that holds its settings, not by its title.

The name's value is one text constant, or several under numbered names, because a text constant inside a formula may
have at most 255 characters. The settings are JSON in ASCII, so that nothing in them depends on an encoding.
"""

from __future__ import annotations

import json
import re
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from sheetfuncs.report.names import SETTINGS
from sheetfuncs.workbook.book import WorkbookXml
from sheetfuncs.workbook.formats import Book, open_package

SETTINGS_NAME = SETTINGS.rstrip("_")
_NUMBERED = re.compile(re.escape(SETTINGS_NAME) + r"(?:_(\d{1,6}))?", re.IGNORECASE)


@dataclass(frozen=True)
class OurSheet:
    """One of our sheets in a workbook: its present title, and its settings as the JSON text that was put in."""

    name: str
    settings_json: str

    @property
    def settings(self) -> dict[str, Any] | None:
        """The settings; None where the text was damaged."""
        return _parsed(self.settings_json)


def settings_from_names(names: Iterable[tuple[str, str]]) -> dict[str, Any] | None:
    """The settings that some names of one sheet hold; None if there are none or they are damaged."""
    text = _settings_text(names)
    return None if text is None else _parsed(text)


def find_our_sheets(book: Book) -> list[OurSheet]:
    """Our sheets in a workbook, in the order of its tabs."""
    with open_package(book) as package:
        workbook = WorkbookXml(package)
        found = []
        for index, title in enumerate(workbook.names):
            own = [(name.name, name.formula) for name in workbook.defined_names() if name.sheet == index]
            text = _settings_text(own)
            if text is not None:
                found.append(OurSheet(title, text))
        return found


def _settings_text(names: Iterable[tuple[str, str]]) -> str | None:
    pieces: dict[int, str] = {}
    for name, formula in names:
        match = _NUMBERED.fullmatch(name)
        constant = formula.removeprefix("=").strip()
        if match and len(constant) >= 2 and constant[0] == constant[-1] == '"':
            pieces[int(match[1] or 0)] = constant[1:-1].replace('""', '"')
    return "".join(pieces[number] for number in sorted(pieces)) if pieces else None


def _parsed(text: str) -> dict[str, Any] | None:
    try:
        value = json.loads(text)
    except (ValueError, RecursionError):
        return None
    return value if isinstance(value, dict) else None
