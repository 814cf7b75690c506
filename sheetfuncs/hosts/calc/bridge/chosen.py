"""What is to be checked: the selection, the block around a cell, whole columns, or what our sheet was made from."""

from __future__ import annotations

from com.sun.star.uno import Exception as UnoException
from sheetfuncs_bridge.own_sheets import own_sheet, own_sheets

NO_SELECTION = (
    "Select the data first: the response in the first column, the predictors beside it, headers on top. One cell "
    "inside the data is enough."
)
SEVERAL = (
    "Ranges on different rows or sheets are selected. Select one range that holds the response and the predictors, or "
    "columns over the same rows of one sheet: the leftmost is the response."
)
NOTHING_TO_REPEAT = (
    "There is no check on this sheet, or of it, that could be made again. Select the data and choose “Check the "
    "selection”."
)


class Refusal(Exception):
    """Nothing can be checked; str(refusal) is the sentence to show."""


class Chosen:
    """cells: the range to read. area: what to record where that is not the range. titled: whether titles may stand
    above the data. parts: the areas of a selection of several, which the range covers. again: the OwnSheet whose
    settings are used again, or None. remarks: sentences for the sheet."""

    def __init__(self, cells, area=None, titled=False, parts=(), again=None, remarks=()):
        self.cells, self.area, self.titled, self.parts = cells, area, titled, list(parts)
        self.again, self.remarks = again, list(remarks)


def from_selection(document, controller) -> Chosen:
    """What the selection means. Raises Refusal."""
    again = own_sheet(controller.getActiveSheet())
    if again is not None:
        return from_own_sheet(document, again)
    selection = controller.getSelection()
    if hasattr(selection, "getRangeAddresses"):
        return _over_parts(document, selection.getRangeAddresses())
    if not hasattr(selection, "getRangeAddress"):
        raise Refusal(f"A chart or a drawing is selected. {NO_SELECTION}")
    address = selection.getRangeAddress()
    sheet = selection.getSpreadsheet()
    if _is_one_cell(address) or _is_one_merged_cell(sheet, address):
        return _around(sheet, selection)
    return _within_used(sheet, address)


def from_own_sheets(document, controller) -> Chosen:
    """What to check again: what our sheet in front was made from, or the only check of the sheet in front."""
    front = controller.getActiveSheet()
    again = own_sheet(front)
    if again is None:
        title = front.getName()
        of_it = [one for one in own_sheets(document) if one.settings.get("sheet") == title]
        if len(of_it) > 1:
            titles = ", ".join(f"“{one.title}”" for one in of_it)
            raise Refusal(f"This sheet has {len(of_it)} checks: {titles}. Go to the one that you mean and try there.")
        if not of_it:
            raise Refusal(NOTHING_TO_REPEAT)
        again = of_it[0]
    return from_own_sheet(document, again)


def from_own_sheet(document, again) -> Chosen:
    """What a sheet of ours was made from."""
    title, area = again.settings.get("sheet"), again.settings.get("area")
    if not isinstance(title, str) or not isinstance(area, str):
        raise Refusal(f"The settings of “{again.title}” cannot be read any more. {NO_SELECTION}")
    if not document.getSheets().hasByName(title):
        raise Refusal(
            f"“{again.title}” was made from the sheet “{title}”, which is not in this document any more or has another "
            "name now. Select the data and choose “Check the selection”."
        )
    sheet = document.getSheets().getByName(title)
    try:
        cells = sheet.getCellRangeByName(area)
    except UnoException:
        raise Refusal(f"“{again.title}” was made from {area}, which is no range here. {NO_SELECTION}") from None
    address = cells.getRangeAddress()
    if address.EndRow >= sheet.getRangeAddress().EndRow:
        chosen = _within_used(sheet, address)
        chosen.again = again
        return chosen
    return Chosen(cells, again=again, remarks=_row_below(sheet, address))


def _around(sheet, cell) -> Chosen:
    """The filled block around one cell."""
    cursor = sheet.createCursorByRange(cell)
    cursor.collapseToCurrentRegion()
    address, own = cursor.getRangeAddress(), cell.getRangeAddress()
    inside = (
        address.StartRow <= own.EndRow and own.StartRow <= address.EndRow
        and address.StartColumn <= own.EndColumn and own.StartColumn <= address.EndColumn
    )
    name = f"{column_letters(own.StartColumn)}{own.StartRow + 1}"
    if not inside or (_is_one_cell(address) and not cursor.getCellByPosition(0, 0).getFormula()):
        raise Refusal(f"The cell {name} is empty, and nothing stands beside it. {NO_SELECTION}")
    if _is_one_cell(address):
        raise Refusal(f"Nothing stands beside the cell {name}. {NO_SELECTION}")
    return Chosen(_range(sheet, address), titled=True)


def _within_used(sheet, address) -> Chosen:
    """A range; whole columns and whole rows are cut to the used part of the sheet."""
    everything = sheet.getRangeAddress()
    cursor = sheet.createCursor()
    cursor.gotoEndOfUsedArea(False)
    used = cursor.getRangeAddress()
    to_last_row, to_last_column = address.EndRow >= everything.EndRow, address.EndColumn >= everything.EndColumn
    whole_columns = to_last_row and address.StartRow == 0 and not to_last_column
    area = None
    if whole_columns:
        area = f"{column_letters(address.StartColumn)}:{column_letters(address.EndColumn)}"
    if to_last_row:
        address.EndRow = max(address.StartRow, used.EndRow)
    if to_last_column:
        address.EndColumn = max(address.StartColumn, used.EndColumn)
    return Chosen(_range(sheet, address), area=area, titled=to_last_row)


def _over_parts(document, areas) -> Chosen:
    """Several columns, or groups of columns, over the same rows."""
    first = areas[0]
    if any((one.Sheet, one.StartRow, one.EndRow) != (first.Sheet, first.StartRow, first.EndRow) for one in areas):
        raise Refusal(SEVERAL)
    areas = sorted(areas, key=lambda one: one.StartColumn)
    last_row = "" if first.EndRow >= _last_row_of(document, first) and first.StartRow == 0 else first.EndRow + 1
    first_row = "" if last_row == "" else first.StartRow + 1
    parts = [
        f"{column_letters(one.StartColumn)}{first_row}:{column_letters(one.EndColumn)}{last_row}" for one in areas
    ]
    first.StartColumn, first.EndColumn = areas[0].StartColumn, max(one.EndColumn for one in areas)
    chosen = _within_used(document.getSheets().getByIndex(first.Sheet), first)
    chosen.parts = parts
    return chosen


def _last_row_of(document, area) -> int:
    return document.getSheets().getByIndex(area.Sheet).getRangeAddress().EndRow


def _row_below(sheet, address) -> list:
    """A remark where the row below the range goes on with data: rows were added since."""
    row = address.EndRow + 1
    below = sheet.getCellRangeByPosition(address.StartColumn, row, address.EndColumn, row).getDataArray()[0]
    if any(value in ("", None) for value in below):
        return []
    return [
        f"Row {row + 1}, right below the range, is filled too and was not used: to use it, select the data and choose "
        "“Check the selection”."
    ]


def _range(sheet, address):
    return sheet.getCellRangeByPosition(address.StartColumn, address.StartRow, address.EndColumn, address.EndRow)


def _is_one_cell(address) -> bool:
    return address.StartRow == address.EndRow and address.StartColumn == address.EndColumn


def _is_one_merged_cell(sheet, address) -> bool:
    cursor = sheet.createCursorByRange(sheet.getCellByPosition(address.StartColumn, address.StartRow))
    cursor.collapseToMergedArea()
    merged = cursor.getRangeAddress()
    return (merged.EndRow, merged.EndColumn) == (address.EndRow, address.EndColumn)


def column_letters(column: int) -> str:
    """0 -> A, 26 -> AA."""
    letters = ""
    column += 1
    while column:
        column, rest = divmod(column - 1, 26)
        letters = chr(65 + rest) + letters
    return letters
