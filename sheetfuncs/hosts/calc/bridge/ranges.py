"""From a range of a spreadsheet to a packed block: one call for the values, the rest only for cells that are odd."""

from __future__ import annotations

import gc
from array import array
from itertools import chain
from math import nan

from sheetfuncs_bridge import protocol

ERROR_CODES = {  # com.sun.star.table.XCell.getError
    503: "#NUM!", 519: "#VALUE!", 521: "#NULL!", 524: "#REF!", 525: "#NAME?", 532: "#DIV/0!", 32767: "#N/A",
}
LEAST_LAST_ROW = 65_535  # the last row (from 0) of a sheet is here or further down, depending on the version
OTHER_ERROR = "#VALUE!"
SLAB = 2_048
MOST_ERRORS = 5_000  # asked for one by one; beyond that a cell is an error without saying which
ANY_RESULT = 1 | 2 | 4  # com.sun.star.sheet.FormulaResult
DATE_OR_TIME, LOGICAL = 2 | 4, 1024  # com.sun.star.util.NumberFormat


def common_last_row(ranges, addresses):
    """The row (from 0) at which the whole columns among the ranges of one call end: the lowest used one of their
    sheets, so that they stay equally high. None where no range is open-ended."""
    open_ended = (cells for cells, address in zip(ranges, addresses) if is_open_ended(cells, address))  # noqa: B905
    return max((last_used_row(cells.getSpreadsheet()) for cells in open_ended), default=None)


def last_used_row(sheet) -> int:
    """The last row (from 0) of the sheet that holds anything."""
    cursor = sheet.createCursor()
    cursor.gotoEndOfUsedArea(False)
    return cursor.getRangeAddress().EndRow


def is_open_ended(cells, address) -> bool:
    """Whether the range, which stands at this address, reaches the last row of its sheet, as whole columns do."""
    if address.EndRow < LEAST_LAST_ROW:  # which saves asking each time
        return False
    return address.EndRow >= cells.getSpreadsheet().getRangeAddress().EndRow


def cut_to_row(cells, last_row: int):
    """The part of the range down to last_row (from 0); at least its first row."""
    address = cells.getRangeAddress()
    end = max(address.StartRow, min(address.EndRow, last_row))
    return cells.getCellRangeByPosition(0, 0, address.EndColumn - address.StartColumn, end - address.StartRow)


def has_formulas(cells) -> bool:
    """Whether any cell of the range is calculated."""
    return cells.queryFormulaCells(ANY_RESULT).getCount() > 0


def read_block(cells, document=None) -> protocol.Block:
    """The cells as a block with their place.

    Without a document dates and TRUE/FALSE are plain numbers, as functions see them. With the document that the range
    is in, number formats decide on DATE and BOOLEAN cells, and rows that are hidden or filtered out are marked.
    """
    address = cells.getRangeAddress()
    rows, columns = address.EndRow - address.StartRow + 1, address.EndColumn - address.StartColumn + 1
    values = _values(cells)
    try:
        numbers, kinds, texts = array("d", values), None, ()
    except TypeError:
        numbers, kinds, texts = _with_odd_cells(values, columns, cells)
    block = protocol.Block(
        rows, columns, numbers, kinds, texts, first_row=address.StartRow + 1, first_column=address.StartColumn + 1,
        sheet=cells.getSpreadsheet().getName(),
    )
    if document is not None:
        _mark_formats(block, cells, document)
        _mark_hidden_rows(block, cells)
    return block


def _values(cells) -> list:
    """All values, row after row; meanwhile Python does not search its many new tuples for circles."""
    was_enabled = gc.isenabled()
    gc.disable()
    try:
        return list(chain.from_iterable(cells.getDataArray()))
    finally:
        if was_enabled:
            gc.enable()


def _with_odd_cells(values: list, columns: int, cells):
    """(numbers, kinds, texts) where blanks ('', None after errors) and texts are among the values.

    Most often they are few, a header row say: only the slabs that hold some are looked through cell by cell.
    """
    numbers, kinds, texts = array("d"), bytearray([protocol.NUMBER]) * len(values), []
    errors = 0
    for start in range(0, len(values), SLAB):
        slab = values[start:start + SLAB]
        try:
            numbers.fromlist(slab)
            continue
        except TypeError:
            pass  # nothing of it was taken
        for place, value in enumerate(slab):
            if type(value) is float:
                continue
            slab[place] = nan
            if value is None:
                kinds[start + place] = protocol.ERROR
                errors += 1
                texts.append(_error_text(cells, start + place, columns) if errors <= MOST_ERRORS else OTHER_ERROR)
            elif value == "":
                kinds[start + place] = protocol.BLANK
            else:
                kinds[start + place] = protocol.TEXT
                texts.append(value)
        numbers.fromlist(slab)
    return numbers, bytes(kinds), texts


def _error_text(cells, place: int, columns: int) -> str:
    row, column = divmod(place, columns)
    return ERROR_CODES.get(cells.getCellByPosition(column, row).getError(), OTHER_ERROR)


def _mark_formats(block: protocol.Block, cells, document) -> None:
    """Turn numbers with a date, time or logical format into DATE and BOOLEAN cells."""
    formats = document.getNumberFormats()
    kinds = None
    groups = cells.getUniqueCellFormatRanges()
    for group in (groups.getByIndex(index) for index in range(groups.getCount())):
        code = formats.getByKey(group.getPropertyValue("NumberFormat")).getPropertyValue("Type")
        kind = protocol.DATE if code & DATE_OR_TIME else protocol.BOOLEAN if code & LOGICAL else None
        if kind is None:
            continue
        if kinds is None:
            kinds = bytearray(block.kinds or bytes([protocol.NUMBER]) * len(block.numbers))
        for area in group.getRangeAddresses():
            _mark_area(block, kinds, area, kind)
    if kinds is not None:
        block.kinds = bytes(kinds)
        null = document.getPropertyValue("NullDate")
        block.date1904 = null.Year == 1904


def _mark_area(block: protocol.Block, kinds: bytearray, area, kind: int) -> None:
    swap = bytes.maketrans(bytes([protocol.NUMBER]), bytes([kind]))
    width = area.EndColumn - area.StartColumn + 1
    for row in range(area.StartRow, area.EndRow + 1):
        start = (row + 1 - block.first_row) * block.columns + area.StartColumn + 1 - block.first_column
        kinds[start:start + width] = kinds[start:start + width].translate(swap)


def _mark_hidden_rows(block: protocol.Block, cells) -> None:
    hidden = bytearray([1]) * block.rows
    for area in cells.queryVisibleCells().getRangeAddresses():
        start = area.StartRow + 1 - block.first_row
        hidden[start:start + area.EndRow - area.StartRow + 1] = bytes(area.EndRow - area.StartRow + 1)
    block.hidden = bytes(hidden)
