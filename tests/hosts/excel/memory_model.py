"""A spreadsheet program in memory: as much of Excel's behaviour as the macros rely on, and its awkward sides.

Written from Excel's documentation and from experience with its object model; it proves our side of the bargain, not
Excel's. A sheet that is opened comes from a real package, read with openpyxl.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from pathlib import Path

import openpyxl
from openpyxl.worksheet.formula import ArrayFormula

MAX_ROWS, MAX_COLUMNS = 1_048_576, 16_384
ERRORS = ("#NULL!", "#DIV/0!", "#VALUE!", "#REF!", "#NAME?", "#NUM!", "#N/A")


class ExcelError(Exception):
    """What Excel throws: a number and few words."""


@dataclass
class Cell:
    """value: number, bool, text, error text or None, as the cell holds it. shape: "" or "array" or "spill"."""

    value: object = None
    formula: str | None = None
    number_format: str = "General"
    shape: str = ""


@dataclass
class Name:
    name: str
    refers_to: str
    visible: bool = True


@dataclass
class Table:
    """A table with a header row; totals: rows of totals below its data."""

    name: str
    first: tuple[int, int]
    last: tuple[int, int]
    totals: int = 0


@dataclass(eq=False)
class Sheet:
    book: Book
    name: str
    cells: dict[tuple[int, int], Cell] = field(default_factory=dict)
    names: list[Name] = field(default_factory=list)
    tables: list[Table] = field(default_factory=list)
    hidden_rows: set[int] = field(default_factory=set)
    hidden_columns: set[int] = field(default_factory=set)
    links: list[str] = field(default_factory=list)
    charts: int = 0
    protected: bool = False
    is_chart: bool = False
    selected: str | None = "A1"

    def put(self, row: int, column: int, rows: list[list[object]], number_format: str = "General") -> None:
        for i, values in enumerate(rows):
            for j, value in enumerate(values):
                formula = value if isinstance(value, str) and value.startswith("=") else None
                self.cells[row + i, column + j] = Cell(None if formula else value, formula, number_format)

    def cell(self, row: int, column: int) -> Cell:
        return self.cells.get((row, column), Cell())

    def filled(self, row: int, column: int) -> bool:
        cell = self.cell(row, column)
        return cell.value is not None or cell.formula is not None

    @property
    def used(self) -> tuple[int, int, int, int]:
        """First row, first column, last row, last column."""
        filled = [place for place in self.cells if self.filled(*place)] or [(1, 1)]
        rows, columns = [row for row, _ in filled], [column for _, column in filled]
        return min(rows), min(columns), max(rows), max(columns)

    def state(self) -> object:
        """All that the sheet holds, to be compared."""
        return (
            self.name, {place: replace(cell) for place, cell in self.cells.items() if self.filled(*place)},
            [replace(name) for name in self.names], [replace(table) for table in self.tables], set(self.hidden_rows),
            set(self.hidden_columns), list(self.links), self.charts, self.protected, self.selected,
        )


@dataclass(eq=False)
class Book:
    app: App
    name: str
    sheets: list[Sheet] = field(default_factory=list)
    names: list[Name] = field(default_factory=list)
    active: Sheet | None = None
    structure_protected: bool = False
    read_only: bool = False
    date1904: bool = False

    def add(self, name: str, **kind: object) -> Sheet:
        sheet = Sheet(self, name, **kind)
        self.sheets.append(sheet)
        self.active = self.active or sheet
        return sheet

    def sheet(self, name: str) -> Sheet:
        for sheet in self.sheets:
            if sheet.name.casefold() == name.casefold():
                return sheet
        raise ExcelError(f"Subscript out of range: {name}")

    def state(self) -> object:
        return ([sheet.state() for sheet in self.sheets], [replace(name) for name in self.names],
                self.active and self.active.name, self.app.active is self)


@dataclass(eq=False)
class App:
    """fail: for the name of an action, what Excel throws there, once. carries_names: whether a copied sheet
    keeps its hidden names. mac: values as macOS' scripting gives them. error_words: what errors are called
    here. seen: what a user would have noticed."""

    books: list[Book] = field(default_factory=list)
    active: Book | None = None
    selection_is_cells: bool = True
    status_bar: object = False
    screen_updating: bool = True
    display_alerts: bool = True
    enable_events: bool = True
    alerts: list[tuple[str, str]] = field(default_factory=list)
    steps: list[str] = field(default_factory=list)
    seen: list[str] = field(default_factory=list)
    fail: dict[str, Exception] = field(default_factory=dict)
    carries_names: bool = True
    has_formula2: bool = True
    tells_hidden_rows: bool = True
    error_words: dict[object, str] = field(default_factory=dict)
    mac: bool = False
    opened: list[Path] = field(default_factory=list)

    def add(self, name: str) -> Book:
        book = Book(self, name)
        self.books.append(book)
        self.active = book
        return book

    def may(self, action: str) -> None:
        if action in self.fail:
            raise self.fail.pop(action)

    def notice(self, what: str) -> None:
        if self.screen_updating:
            self.seen.append(f"flicker: {what}")
        if self.enable_events:
            self.seen.append(f"event: {what}")

    def open(self, path: Path) -> Book:
        self.may("open")
        self.opened.append(path)
        book = self.add(path.name)
        _load(book, path)
        self.notice("open")
        return book

    def close(self, book: Book) -> None:
        self.may("close")
        self.notice("close")
        self.books.remove(book)
        self.active = self.books[-1] if self.books else None


def copy_sheet(sheet: Sheet, after: Sheet) -> None:
    """As Excel copies: under a free name, in front, its own names and formulas pointing at itself."""
    app, target = sheet.book.app, after.book
    app.may("copy")
    if target.structure_protected:
        raise ExcelError("Copy method of Worksheet class failed")
    title, number = sheet.name, 1
    while any(title.casefold() == other.name.casefold() for other in target.sheets):
        number += 1
        title = f"{sheet.name} ({number})"
    made = Sheet(target, title, {place: replace(cell) for place, cell in sheet.cells.items()})
    made.links, made.charts, made.hidden_rows = list(sheet.links), sheet.charts, set(sheet.hidden_rows)
    made.names = [replace(name) for name in sheet.names if app.carries_names or name.visible]
    _repoint(made, sheet.name, title)
    target.sheets.insert(target.sheets.index(after) + 1, made)
    target.active, app.active = made, target
    app.notice("copy")


def rename(sheet: Sheet, title: str) -> None:
    sheet.book.app.may("rename")
    if any(other is not sheet and other.name.casefold() == title.casefold() for other in sheet.book.sheets):
        raise ExcelError("That name is already taken. Try a different one.")
    for other in sheet.book.sheets:
        _repoint(other, sheet.name, title)
    sheet.name = title


def delete(sheet: Sheet) -> None:
    """What points at the sheet from elsewhere breaks."""
    app, book = sheet.book.app, sheet.book
    app.may("delete")
    if book.structure_protected:
        raise ExcelError("Delete method of Worksheet class failed")
    if app.display_alerts:
        app.seen.append("question: delete the sheet?")
    book.sheets.remove(sheet)
    for other in book.sheets:
        for cell in other.cells.values():
            cell.formula = cell.formula and _pointed(cell.formula, sheet.name, "#REF!")
    for name in book.names:
        name.refers_to = _pointed(name.refers_to, sheet.name, "#REF!")
    if book.active is sheet:
        book.active = book.sheets[0]
    app.notice("delete")


def _repoint(sheet: Sheet, old: str, new: str) -> None:
    for cell in sheet.cells.values():
        cell.formula = cell.formula and _pointed(cell.formula, old, _quoted(new) + "!")
    for name in sheet.names:
        if not name.refers_to.startswith('="'):
            name.refers_to = _pointed(name.refers_to, old, _quoted(new) + "!")


def _pointed(formula: str, title: str, new: str) -> str:
    return re.sub(rf"(?:{re.escape(_quoted(title))}|\b{re.escape(title)})!", lambda _: new, formula)


def _quoted(title: str) -> str:
    return "'" + title.replace("'", "''") + "'"


def region(sheet: Sheet, row: int, column: int) -> tuple[int, int, int, int]:
    """The block of filled cells around a cell, corners touching."""
    top, left, bottom, right = row, column, row, column
    while True:
        rows, columns = range(max(1, top - 1), bottom + 2), range(max(1, left - 1), right + 2)
        near = [(r, c) for r in rows for c in columns if sheet.filled(r, c)]
        grown = (min([top, *(r for r, _ in near)]), min([left, *(c for _, c in near)]),
                 max([bottom, *(r for r, _ in near)]), max([right, *(c for _, c in near)]))
        if grown == (top, left, bottom, right):
            return grown
        top, left, bottom, right = grown


def runs(numbers: Iterator[int]) -> list[tuple[int, int]]:
    """Stretches of consecutive numbers."""
    found: list[list[int]] = []
    for number in numbers:
        if found and found[-1][1] == number - 1:
            found[-1][1] = number
        else:
            found.append([number, number])
    return [(first, last) for first, last in found]


def _load(book: Book, path: Path) -> None:
    """The sheets of a package; formulas without the values stored beside them."""
    opened = openpyxl.load_workbook(path)
    for sheet in opened.worksheets:
        made = book.add(sheet.title)
        for row in sheet.iter_rows():
            for cell in row:
                if cell.hyperlink:
                    made.links.append(cell.hyperlink.location)
                if cell.value is not None:
                    made.cells[cell.row, cell.column] = _loaded(cell)
        made.charts = len(sheet._charts)
        made.names = [
            Name(name.name, f"={name.attr_text}", not name.hidden) for name in sheet.defined_names.values()
        ]
    opened.close()


def _loaded(cell: openpyxl.cell.Cell) -> Cell:
    if isinstance(cell.value, ArrayFormula):
        return Cell(None, cell.value.text, cell.number_format, "array")
    formula = cell.value if cell.data_type == "f" else None
    return Cell(None if formula else cell.value, formula, cell.number_format)
