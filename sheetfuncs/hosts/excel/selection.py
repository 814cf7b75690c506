"""Which data a selection in a running Excel means."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from sheetfuncs.cells.address import cell_name, column_letters, format_area, parse_area
from sheetfuncs.errors import AddressError
from sheetfuncs.hosts.excel.ranges import within_used
from sheetfuncs.hosts.live import area_of_parts

if TYPE_CHECKING:
    import xlwings as xw


@dataclass(frozen=True)
class Place:
    """The cells that are meant, and one sentence for each thing that was decided on the way.

    settings: the columns that a selection of several parts takes. area: what to record where that is not the cells
    themselves ("B:D"). titled: whether titles may stand above the data.
    """

    cells: xw.Range
    remarks: tuple[str, ...] = ()
    settings: Mapping[str, Any] | None = None
    area: str | None = None
    titled: bool = False


def selected_cells(book: xw.Book) -> xw.Range | None:
    """The selected cells; None where something else is selected.

    Not xlwings' own Book.selection, which counts the cells, and of those of a whole sheet there are too many for Excel.
    Raises AddressError where another workbook has come to the front since the button was pressed, as it may on macOS.
    """
    import xlwings as xw

    found = book.app.impl.selection
    if found is None:
        return None
    cells = xw.Range(impl=found)
    in_front = cells.sheet.book.name
    if in_front != book.name:
        raise AddressError(f"{in_front} came to the front meanwhile: go to {book.name}, and press the button again.")
    return cells


def place_of_selection(selection: xw.Range | None) -> Place:
    """The data meant by a selection: itself; for a single cell its table, or the filled block around it.

    Several parts mean their columns, the first one being the response. Raises AddressError for a selected chart or
    picture and for a cell that stands alone, ArgumentError for parts that do not stand on the same rows.
    """
    if selection is None:
        raise AddressError(
            "No cells are selected (a chart or a picture is, or this is no worksheet): select the columns of the data, "
            "or one cell inside them, and press the button again."
        )
    parts = selection.address.split(",")
    if len(parts) > 1:
        cover, settings = area_of_parts([parse_area(part) for part in parts])
        return _whole_or_part(selection.sheet.range(format_area(cover)), settings)
    return _around(selection) if selection.size == 1 else _whole_or_part(selection, None)


def place_of_record(sheet: xw.Sheet, area: str) -> Place:
    """The cells that an earlier check recorded ("B3:D33", "B:D"). Raises AddressError where that is no address."""
    return _whole_or_part(sheet.range(format_area(parse_area(area).without_sheet())), None)


def _whole_or_part(cells: xw.Range, settings: Mapping[str, Any] | None) -> Place:
    """Whole columns are read as far as they are used, and recorded as whole ones: more rows are no new range."""
    used = within_used(cells)
    whole = used.shape[0] < cells.shape[0] and used.shape[1] == cells.shape[1]
    if not whole:
        return Place(used, settings=settings)
    first, last = cells.column, cells.column + cells.shape[1] - 1
    return Place(used, settings=settings, area=f"{column_letters(first)}:{column_letters(last)}", titled=True)


def _around(cell: xw.Range) -> Place:
    where = cell_name(cell.row, cell.column)
    table = cell.table
    if table is not None and table.data_body_range is not None:
        header, body = table.header_row_range, table.data_body_range
        cells = body if header is None else cell.sheet.range(header, body)
        return Place(cells, (f"{where} lies in the table {table.name}, which is used.",))
    region = cell.current_region
    if region.size == 1:
        raise AddressError(
            f"{cell_name(cell.row, cell.column, cell.sheet.name)} stands alone: select the columns of the data, or one "
            "cell inside them, and press the button again."
        )
    address = region.address.replace("$", "")
    return Place(region, (f"{where} is one cell: the block around it, {address}, is used.",), titled=True)
