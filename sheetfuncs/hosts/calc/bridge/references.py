"""Formulas and names that read from a sheet which is replaced: written again, so that they read from the new one."""

from __future__ import annotations

from contextlib import contextmanager, suppress

from com.sun.star.uno import Exception as UnoException
from sheetfuncs_bridge.recording import keep_unrecorded

_ANY_RESULT = 1 | 2 | 4  # com.sun.star.sheet.FormulaResult: a number, a text, an error


@contextmanager
def kept_references(document, title: str):
    """Formulas of other sheets, and names, that mention the sheet of this title are the same afterwards."""
    there = document.getSheets().hasByName(title)
    formulas = list(_formulas(document, title)) if there else []
    names = list(_names(document, title)) if there else []
    try:
        yield
    finally:
        if document.getSheets().hasByName(title):
            for write, text in [*names, *formulas]:
                keep_unrecorded(document)
                _again(write, text)


def _again(write, text: str) -> None:
    with suppress(UnoException):  # a protected sheet: the reference stays broken, as after any removal of a sheet
        write(text)


def _formulas(document, title: str):
    """(how to write it, formula) of every formula outside the sheet that mentions it."""
    mention = title.replace("'", "''")
    sheets = document.getSheets()
    for sheet in (sheets.getByName(name) for name in sheets.getElementNames() if name != title):
        found = sheet.queryFormulaCells(_ANY_RESULT)
        arrays = set()
        for block in (found.getByIndex(place) for place in range(found.getCount())):
            for row, formulas in enumerate(block.getFormulaArray()):
                for column, formula in enumerate(formulas):
                    if mention not in formula:
                        continue
                    cell = block.getCellByPosition(column, row)
                    array = _array_around(sheet, cell)
                    if array is None:
                        yield cell.setFormula, formula
                    elif array.AbsoluteName not in arrays:
                        arrays.add(array.AbsoluteName)
                        yield array.setArrayFormula, array.getArrayFormula()[1:-1]  # without its braces


def _array_around(sheet, cell):
    """The range of the array formula that the cell is part of, or None."""
    if not cell.getArrayFormula():
        return None
    cursor = sheet.createCursorByRange(cell)
    cursor.collapseToCurrentArray()
    address = cursor.getRangeAddress()
    return sheet.getCellRangeByPosition(address.StartColumn, address.StartRow, address.EndColumn, address.EndRow)


def _names(document, title: str):
    """(how to write it, content) of every name outside the sheet that mentions it."""
    mention = title.replace("'", "''")
    sheets = document.getSheets()
    holders = [document, *(sheets.getByName(name) for name in sheets.getElementNames() if name != title)]
    for holder in holders:
        own = holder.getPropertyValue("NamedRanges")
        for name in own.getElementNames():
            named = own.getByName(name)
            if mention in named.getContent():
                yield named.setContent, named.getContent()
