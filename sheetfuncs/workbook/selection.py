"""What the user typed, as an area of the workbook: an address, a table, a defined name, or nothing at all."""

from __future__ import annotations

import re
from dataclasses import replace

from sheetfuncs.cells.address import MAX_COLUMNS, MAX_ROWS, Area, cell_name, format_area, is_address, parse_area
from sheetfuncs.cells.columns import suggestion
from sheetfuncs.cells.stored_text import shown
from sheetfuncs.errors import AddressError
from sheetfuncs.workbook.read import Book, BookName, Table
from sheetfuncs.workbook.regions import block_around, first_block
from sheetfuncs.workbook.selection_columns import Selection, read_selection

__all__ = ["Selection", "find_selection", "read_selection", "resolve", "resolve_reference"]

_TABLE_COLUMNS = re.compile(r"(?P<table>[^\[\]]+)\[(?P<inside>.*)\]", re.DOTALL)
_SPECIAL = re.compile(r"\[?#(?P<word>[^\[\]]+)\]?\s*(?:,\s*(?P<columns>.+))?", re.DOTALL)
_QUOTED = re.compile("'(?:[^']|'')*'")
_ONE_COLUMN = r"(?:[^\[\]#']|'.)+"
_COLUMN_RANGE = re.compile(rf"\[({_ONE_COLUMN})\]\s*:\s*\[({_ONE_COLUMN})\]|\[?({_ONE_COLUMN})\]?", re.DOTALL)


def resolve(book: Book, text: str | None = None) -> Area:
    """The area meant by what the user typed (see find_selection)."""
    return find_selection(book, text).area


def find_selection(book: Book, text: str | None = None) -> Selection:
    """Find the data that the user means by an address, a table's or a defined name, or by nothing.

    An address without a sheet is on the active sheet; a single cell means the block around it; nothing means the
    block around the first filled cell of the active sheet, titles skipped. A table comes with its header row, without
    its totals row. Raises AddressError or SheetNameError, with the closest name there is.
    """
    if text is None or not text.strip():
        return _first(book)
    if is_address(text):
        return _from_address(book, parse_area(text))
    return _from_names(book, text, table_headers=True)


def resolve_reference(book: Book, text: str) -> Area:
    """The area that a reference in a formula means: a cell is that cell, a table its data rows without headers.

    Raises as find_selection.
    """
    if not is_address(text):
        return _from_names(book, text, table_headers=False).area
    area = parse_area(text)
    return replace(area, sheet=book.sheet(book.active_sheet if area.sheet is None else area.sheet).name)


def _from_names(book: Book, text: str, *, table_headers: bool) -> Selection:
    text = text.strip()
    wanted = text.removeprefix("=").strip()
    table = _table_called(book, wanted)
    if table is not None:
        return Selection(_table_area(table, table_headers))
    match = _TABLE_COLUMNS.fullmatch(wanted)
    if match is not None:
        return Selection(_table_part(book, match["table"].strip(), match["inside"].strip(), table_headers))
    return _from_name(book, wanted)


def _first(book: Book) -> Selection:
    sheet = book.active_sheet
    found = first_block(book.read_sheet(sheet).block)
    if found is None:
        others = [other.name for other in book.sheets if other.name != sheet]
        hint = f", such as “{others[0]}!B3:F64”" if others else ""
        raise AddressError(
            f"Sheet “{sheet}”, which {book.label} opens with, has no block of cells with numbers; say where the data "
            f"are{hint}."
        )
    area, remarks = found
    area = replace(area, sheet=sheet)
    table = next((table for table in book.tables if table.sheet == sheet and _overlap(table.area, area)), None)
    if table is not None:
        area, remarks = table.data_and_header, []
        remarks.append(f"No range was given: the table {table.name} on sheet “{sheet}” ({_cells(area)}) is used.")
    else:
        remarks.insert(0, f"No range was given: the block {_cells(area)} on sheet “{sheet}” is used.")
    return Selection(area, tuple(remarks))


def _cells(area: Area) -> str:
    return format_area(replace(area, sheet=None))


def _overlap(one: Area, other: Area) -> bool:
    rows = one.first_row <= (other.last_row or MAX_ROWS) and other.first_row <= (one.last_row or MAX_ROWS)
    columns = (one.first_column, other.last_column or MAX_COLUMNS), (other.first_column, one.last_column or MAX_COLUMNS)
    return rows and all(first <= last for first, last in columns)


def _from_address(book: Book, area: Area) -> Selection:
    sheet = book.sheet(book.active_sheet if area.sheet is None else area.sheet)
    area = replace(area, sheet=sheet.name)
    if not area.is_cell:
        return Selection(area)
    table = next((table for table in book.tables if table.sheet == sheet.name and _overlap(table.area, area)), None)
    if table is not None:
        return Selection(table.data_and_header, (f"{area} lies in the table {table.name}, which is used.",))
    around = block_around(book.read_sheet(sheet.name).block, area.first_row, area.first_column)
    if around is None:
        raise AddressError(
            f"{cell_name(area.first_row, area.first_column, sheet.name)} is empty and stands alone; give a cell inside "
            "the data, or the whole rectangle, such as Jobs!B3:F64."
        )
    around = replace(around, sheet=sheet.name)
    return Selection(around, (f"{area} is one cell: the block around it, {_cells(around)}, is used.",))


def _table_called(book: Book, name: str) -> Table | None:
    return next((table for table in book.tables if table.name.casefold() == name.casefold()), None)


def _table_area(table: Table, headers: bool) -> Area:
    area = table.data_and_header
    area = area if headers else replace(area, first_row=area.first_row + table.header_rows)
    if area.last_row is None or area.last_row < area.first_row:
        raise AddressError(f"The table {table.name} has no rows of data.")
    return area


def _table_part(book: Book, name: str, inside: str, headers: bool) -> Area:
    """ "Jobs[Cost]", "Jobs[[Weight]:[Holes]]", "Jobs[#All]", "Jobs[[#Data],[Cost]]"."""
    table = _table_called(book, name)
    if table is None:
        raise _no_such_name(book, name)
    special = _SPECIAL.fullmatch(inside)
    columns: str | None = inside
    if special is not None:
        word, columns = special["word"].strip().casefold(), special["columns"]
        if word not in ("all", "data"):
            raise AddressError(
                f"{shown(f'{name}[{inside}]')} asks for a part of the table that holds no rows of data; give {name}, "
                f"or {name}[{table.columns[0] if table.columns else 'column'}]."
            )
        headers = headers if word == "all" else False
    area = _table_area(table, headers)
    if not columns:
        return area
    match = _COLUMN_RANGE.fullmatch(columns.strip())
    if match is None:
        raise AddressError(
            f"{shown(f'{name}[{inside}]')} is not understood; give {name}[[first column]:[last column]]."
        )
    first, last = (match[1], match[2]) if match[3] is None else (match[3], match[3])
    places = sorted(_column_place(table, re.sub("'(.)", r"\1", column).strip()) for column in (first, last))
    return replace(area, first_column=area.first_column + places[0], last_column=area.first_column + places[1])


def _column_place(table: Table, name: str) -> int:
    for place, column in enumerate(table.columns):
        if column.casefold() == name.casefold():
            return place
    raise AddressError(
        f"The table {table.name} has no column {shown(name)}{suggestion(name, table.columns)}; it has "
        f"{', '.join(map(shown, table.columns))}."
    )


def _from_name(book: Book, text: str) -> Selection:
    name = next((name for name in _names_by_scope(book) if name.name.casefold() == text.casefold()), None)
    if name is None:
        raise _no_such_name(book, text)
    formula = name.formula.strip()
    bare = _QUOTED.sub("", formula)
    if not is_address(formula) or "(" in bare or "#REF!" in bare:
        what = "is an error" if "#REF!" in bare else f"is the formula {shown(formula)}"
        raise AddressError(
            f"The name {name.name} {what}, not a plain range; give the range that it stands for, such as Jobs!B3:F64."
        )
    try:
        area = parse_area(formula)
    except AddressError as error:
        raise AddressError(f"The name {name.name} cannot be used: {error}") from None
    if area.sheet is None:
        area = replace(area, sheet=name.sheet)
    return Selection(replace(area, sheet=book.sheet(area.sheet or book.active_sheet).name))


def _names_by_scope(book: Book) -> list[BookName]:
    """The names people made: those of the active sheet first, then the workbook's, then other sheets'."""
    rank = {book.active_sheet: 0, None: 1}
    names = [name for name in book.defined_names if not name.name.startswith("_xlnm.") and not name.hidden]
    return sorted(names, key=lambda name: rank.get(name.sheet, 2))


def _no_such_name(book: Book, text: str) -> AddressError:
    tables, names = [table.name for table in book.tables], [name.name for name in _names_by_scope(book)]
    sheets = [sheet.name for sheet in book.sheets]
    there = list(dict.fromkeys([*tables, *names]))
    if text.casefold() in (sheet.casefold() for sheet in sheets):
        return AddressError(
            f"{shown(text)} is a sheet of {book.label}; add the cells, such as “{text}!B3:F64”, or “{text}!B3” for the "
            "block around a cell."
        )
    listed = f"it has {', '.join(there[:8])}{', ...' if len(there) > 8 else ''}" if there else "it has none"
    return AddressError(
        f"{book.label} has no table or defined name {shown(text)}{suggestion(text, there)}; {listed}. An address is "
        "written like Jobs!B3:F64."
    )
