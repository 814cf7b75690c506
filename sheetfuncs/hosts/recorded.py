"""What an earlier check left in a workbook: which sheet to replace, and the decision record to keep."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from sheetfuncs.cells.address import parse_area
from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.checking import Settings
from sheetfuncs.report.elements import Value
from sheetfuncs.report.entries import ENTRY_FIELDS, changed_entries, settings_from_entries
from sheetfuncs.report.names import DECISION, ENTRY
from sheetfuncs.report.record import DECISION_FIELDS

if TYPE_CHECKING:
    from sheetfuncs.workbook.settings import OurSheet


@dataclass(frozen=True)
class Earlier:
    """title: of the new sheet. replace: the sheet that it replaces, or None. decision: what to write back."""

    title: str
    replace: str | None
    decision: Mapping[str, Value]


def earlier_sheet(book: Path, target: Path, settings: Settings) -> Earlier:
    """Look for our sheet of the same data in the workbook, and for its record there and in the file to be replaced."""
    from sheetfuncs.workbook import sheet_title
    from sheetfuncs.workbook.read import open_book

    replace = _sheet_of(book, settings)
    decision = dict(_decision(book, replace)) if replace else {}
    if target != book and target.exists():
        there = _sheet_of(target, settings)
        decision.update({k: v for k, v in (_decision(target, there) if there else {}).items() if v is not None})
    if replace:
        return Earlier(replace, replace, decision)
    with open_book(book) as opened:
        taken = [sheet.name for sheet in opened.sheets]
    return Earlier(sheet_title(f"Check of {settings.sheet}", taken=taken), None, decision)


def sheets_of_other_ranges(target: Path, book: Path, settings: Settings) -> list[str]:
    """Titles of our sheets in the file to be replaced that neither this check nor the workbook would bring back."""
    from sheetfuncs.workbook import find_our_sheets

    kept = [(settings.sheet, settings.area)] + [_place(sheet) for sheet in find_our_sheets(book)]
    return [sheet.name for sheet in find_our_sheets(target) if _place(sheet) not in kept]


def _place(sheet: OurSheet) -> tuple[object, object]:
    found = sheet.settings or {}
    return found.get("sheet"), found.get("area")


@dataclass(frozen=True)
class Recorded:
    """title: of our sheet. settings: what it was made with, changed as its cells say. changed: labels of those."""

    title: str
    settings: Mapping[str, Any]
    changed: tuple[str, ...]


def recorded_settings(book: Path) -> Recorded | None:
    """What our sheet says, where the workbook opens on one; None elsewhere, and where its settings were damaged.

    Raises ArgumentError for a cell of the settings that is not understood.
    """
    from sheetfuncs.workbook import find_our_sheets
    from sheetfuncs.workbook.read import open_book

    with open_book(book) as opened:
        active = opened.active_sheet
    for sheet in find_our_sheets(book):
        if sheet.name == active and sheet.settings and sheet.settings.get("sheet") and sheet.settings.get("area"):
            settings = settings_from_entries(sheet.settings, _cells(book, sheet.name, ENTRY, ENTRY_FIELDS))
            return Recorded(sheet.name, settings, tuple(changed_entries(sheet.settings, settings)))
    return None


def _sheet_of(book: Path, settings: Settings) -> str | None:
    """The title of our sheet for the same range; another range gets a sheet of its own."""
    from sheetfuncs.workbook import find_our_sheets

    for sheet in find_our_sheets(book):
        if _place(sheet) == (settings.sheet, settings.area):
            return sheet.name
    return None


def _decision(book: Path, sheet: str) -> dict[str, Value]:
    """The filled cells of the sheet's decision record, by field."""
    found = _cells(book, sheet, DECISION, DECISION_FIELDS)
    return {field: value for field, value in found.items() if value is not None}


def _cells(book: Path, sheet: str, prefix: str, fields: Sequence[str]) -> dict[str, Value]:
    """What stands in the cells that the sheet's hidden names point at, by field; without those whose name is gone."""
    from sheetfuncs.workbook.read import open_book

    found: dict[str, Value] = {}
    with open_book(book) as opened:
        for place, field in enumerate(fields, 1):
            formula = opened.local_name(sheet, f"{prefix}{place}")
            if formula is not None:
                found[field] = _first_value(opened.read(parse_area(formula)))
    return found


def _first_value(block: Block) -> Value:
    if not block.row_count or not block.column_count or block.kinds[0, 0] == Kind.BLANK:
        return None
    return block.text(0, 0) if block.kinds[0, 0] in (Kind.TEXT, Kind.ERROR) else float(block.numbers[0, 0])
