"""A workbook opened for reading: its sheets, names and tables, and ranges of cells as blocks."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import ExitStack
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from sheetfuncs.cells.address import Area, parse_area
from sheetfuncs.cells.block import Block
from sheetfuncs.cells.columns import suggestion
from sheetfuncs.cells.stored_text import shown
from sheetfuncs.errors import AddressError, SheetNameError, WorkbookFormatError
from sheetfuncs.workbook.book import WorkbookXml
from sheetfuncs.workbook.formats import Book as BookFile
from sheetfuncs.workbook.formats import open_package
from sheetfuncs.workbook.package import Package
from sheetfuncs.workbook.read_cells import CellReader
from sheetfuncs.workbook.read_formats import date_formats
from sheetfuncs.workbook.read_gather import Gathering, SheetCells, cut_cells
from sheetfuncs.workbook.read_scan import scan_cells
from sheetfuncs.workbook.read_strings import shared_strings
from sheetfuncs.workbook.xml import child, children, integer, main


@dataclass(frozen=True)
class Sheet:
    """A worksheet. state: "visible", "hidden" or "veryHidden". part: its entry in the package."""

    name: str
    state: str
    part: str


@dataclass(frozen=True)
class BookName:
    """A defined name with the formula behind it; `sheet` is the one it belongs to, None for the whole workbook."""

    name: str
    formula: str
    sheet: str | None
    hidden: bool = False


@dataclass(frozen=True)
class Table:
    """A table; `area` includes its header rows (0 or 1) and its totals rows (0 or 1)."""

    name: str
    area: Area
    header_rows: int
    totals_rows: int
    columns: tuple[str, ...]

    @property
    def sheet(self) -> str:
        assert self.area.sheet is not None
        return self.area.sheet

    @property
    def data_and_header(self) -> Area:
        """The area without the totals row, which is no observation."""
        assert self.area.last_row is not None
        return replace(self.area, last_row=self.area.last_row - self.totals_rows)


class Book:
    """A workbook open for reading. Everything is read on demand; `close` it, or use it in a with statement."""

    def __init__(self, package: Package, stack: ExitStack):
        self._package, self._stack = package, stack
        self._xml = WorkbookXml(package)
        self._whole: tuple[str, SheetCells] | None = None
        kinds = {relationship.id: relationship.kind for relationship in package.relationships(self._xml.part)}
        self._places = [
            index
            for index in range(len(self._xml.sheets))
            if kinds.get(self._xml.relationship_id(index)) == "worksheet"
        ]
        if not self._places:
            raise WorkbookFormatError(
                f"{self.label} has no worksheet, only charts or macros. Give the workbook with the data."
            )
        self.sheets = tuple(
            Sheet(self._xml.names[index], self._xml.sheets[index].get("state", "visible"), self._xml.sheet_part(index))
            for index in self._places
        )

    def __enter__(self) -> Book:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        self._stack.close()

    @property
    def label(self) -> str:
        """How sentences name the workbook."""
        return self._package.label

    @cached_property
    def active_sheet(self) -> str:
        """The worksheet that opens in front; where that is a chart sheet, the first visible worksheet."""
        active = self._xml.active()
        for index, sheet in zip(self._places, self.sheets, strict=True):
            if index in active and sheet.state == "visible":
                return sheet.name
        return next((sheet.name for sheet in self.sheets if sheet.state == "visible"), self.sheets[0].name)

    @cached_property
    def date1904(self) -> bool:
        """Whether serial dates count from 1904."""
        settings = child(self._xml.root, "workbookPr")
        return settings is not None and settings.get("date1904") in ("1", "true")

    @cached_property
    def calculates_on_load(self) -> bool:
        """Whether the workbook asks to be calculated when opened: its stored formula values may be place holders."""
        settings = child(self._xml.root, "calcPr")
        return settings is not None and settings.get("fullCalcOnLoad") in ("1", "true")

    @cached_property
    def defined_names(self) -> tuple[BookName, ...]:
        names = self._xml.names
        found = []
        for name in self._xml.defined_names():
            if name.sheet is None or 0 <= name.sheet < len(names):
                sheet = None if name.sheet is None else names[name.sheet]
                hidden = name.attributes.get("hidden") in ("1", "true")
                found.append(BookName(name.name, name.formula, sheet, hidden))
        return tuple(found)

    def local_name(self, sheet: str, name: str) -> str | None:
        """The formula behind a name that belongs to a sheet, without a leading "="; None where there is none."""
        for found in self.defined_names:
            if found.sheet is not None and (found.sheet.casefold(), found.name.casefold()) == (
                sheet.casefold(),
                name.casefold(),
            ):
                return found.formula
        return None

    @cached_property
    def tables(self) -> tuple[Table, ...]:
        return tuple(table for sheet in self.sheets for table in self._tables_of(sheet))

    def _tables_of(self, sheet: Sheet) -> Iterator[Table]:
        for relationship in self._package.relationships(sheet.part):
            part = self._package.find(relationship.part) if relationship.kind == "table" else None
            if part is None or relationship.external:
                continue
            root = self._package.document(part).root
            try:
                area = replace(parse_area(root.get("ref", "")), sheet=sheet.name)
            except AddressError:
                continue  # a damaged table is no place to look for data; its cells can still be given by address
            if root.tag == main("table") and area.last_row is not None:
                yield Table(
                    root.get("displayName", root.get("name", "")),
                    area,
                    integer(root, "headerRowCount", 1),
                    integer(root, "totalsRowCount", 0),
                    tuple(column.get("name", "") for column in children(child(root, "tableColumns"), "tableColumn")),
                )

    def sheet(self, name: str) -> Sheet:
        """The worksheet of that name, upper and lower case alike. Raises SheetNameError with what is there."""
        for sheet in self.sheets:
            if sheet.name.casefold() == name.casefold():
                return sheet
        there = [sheet.name for sheet in self.sheets]
        listed = ", ".join(shown(other) for other in there[:8]) + (", ..." if len(there) > 8 else "")
        raise SheetNameError(f"{self.label} has no worksheet {shown(name)}{suggestion(name, there)}; it has {listed}.")

    def read(self, area: Area) -> Block:
        """The cells of an area (its sheet: the active one where it names none), with formulas as stored values.

        An open end is cut to the last filled row of the sheet, so that whole columns of one sheet are equally high.
        """
        return self.read_cells(area).block

    def read_cells(self, area: Area) -> SheetCells:
        """As read, with counts of formulas and of those without a stored value."""
        sheet = self.sheet(self.active_sheet if area.sheet is None else area.sheet)
        area = replace(area, sheet=sheet.name)
        if self._whole is not None and self._whole[0] == sheet.name:
            kept = cut_cells(self._whole[1], area)
            if kept is not None:
                return kept
        return self._read_part(sheet, area)

    def _read_part(self, sheet: Sheet, area: Area) -> SheetCells:
        gathering = Gathering(area, f"Sheet “{sheet.name}” of {self.label}")
        reader = CellReader(gathering, self._date_formats, self.date1904)
        scan_cells(self._package.archive.chunks(sheet.part), reader)
        return gathering.finish(self._strings if gathering.has_shared else [], sheet.name, self.date1904)

    def read_sheet(self, name: str) -> SheetCells:
        """All filled cells of a sheet, from A1 on; kept, so that reading a range of it then costs nothing."""
        sheet = self.sheet(name)
        if self._whole is None or self._whole[0] != sheet.name:
            self._whole = sheet.name, self._read_part(sheet, Area(sheet.name, 1, 1, None, None))
        return self._whole[1]

    def used_area(self, name: str) -> Area | None:
        """From A1 to the last filled row and column of a sheet; None for an empty sheet."""
        cells = self.read_sheet(name)
        if not cells.last_row:
            return None
        return Area(self.sheet(name).name, 1, 1, cells.last_row, cells.last_column)

    @cached_property
    def _date_formats(self) -> np.ndarray:
        return date_formats(self._package, self._xml.part)

    @cached_property
    def _strings(self) -> list[str]:
        return shared_strings(self._package, self._xml.part)


def open_book(book: BookFile) -> Book:
    """Open a workbook (a path, or a binary file that can seek and stays the caller's) for reading.

    Raises WorkbookFormatError for another format, an encrypted or a damaged file, WorkbookUnsafeError for one that is
    not safe to open, WorkbookError for one that cannot be read.
    """
    with ExitStack() as stack:
        package = stack.enter_context(open_package(book))
        return Book(package, stack.pop_all())
