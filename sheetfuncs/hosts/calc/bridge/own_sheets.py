"""Our diagnostics sheets in a document: found by their sheet-scoped names, never by their title."""

from __future__ import annotations

import json
import re

from com.sun.star.table.CellContentType import EMPTY, FORMULA, VALUE
from com.sun.star.uno import Exception as UnoException

PREFIX = "_sheetfuncs_"
_SETTINGS = re.compile(r"_sheetfuncs_settings_(\d{1,6})")
_CELL = re.compile(r"_sheetfuncs_(?:decision|entry)_\d{1,6}")
_STRING_RESULT = 2  # com.sun.star.sheet.FormulaResult


class OwnSheet:
    """One of our sheets. names: its names and what they hold; cells: what stands in the cells to be filled in, by
    the name that points there; settings: what was recorded, {} where that was damaged."""

    def __init__(self, sheet):
        self.title = sheet.getName()
        own = sheet.getPropertyValue("NamedRanges")
        self.names = {
            name: own.getByName(name).getContent() for name in own.getElementNames() if name.startswith(PREFIX)
        }
        self.cells = {name: _content(own.getByName(name)) for name in self.names if _CELL.fullmatch(name)}
        self.settings = _settings(self.names)

    def to_head(self) -> dict:
        """As the worker gets it."""
        return {"title": self.title, "names": self.names, "cells": self.cells}


def own_sheet(sheet):
    """The sheet as one of ours, or None."""
    names = sheet.getPropertyValue("NamedRanges").getElementNames()
    return OwnSheet(sheet) if any(_SETTINGS.fullmatch(name) for name in names) else None


def own_sheets(document) -> list:
    """All our sheets of a document, in the order of its tabs."""
    sheets = document.getSheets()
    found = [own_sheet(sheets.getByIndex(place)) for place in range(sheets.getCount())]
    return [one for one in found if one is not None]


def _settings(names: dict) -> dict:
    pieces = {}
    for name, content in names.items():
        match = _SETTINGS.fullmatch(name)
        text = content[1:] if content.startswith("=") else content
        if match and len(text) >= 2 and text[0] == text[-1] == '"':
            pieces[int(match.group(1))] = text[1:-1].replace('""', '"')
    try:
        settings = json.loads("".join(pieces[place] for place in sorted(pieces)))
    except (ValueError, RecursionError):
        return {}
    return settings if isinstance(settings, dict) else {}


def _content(named):
    """The number or text in the first cell that a name points at; None where it is empty or points nowhere."""
    try:
        cells = named.getReferredCells()
    except UnoException:
        return None
    if cells is None:
        return None
    cell = cells.getCellByPosition(0, 0)
    kind = cell.getType()
    if kind == EMPTY:
        return None
    if kind == VALUE or (kind == FORMULA and cell.FormulaResultType2 != _STRING_RESULT and not cell.getError()):
        return cell.getValue()
    return cell.getString() or None
