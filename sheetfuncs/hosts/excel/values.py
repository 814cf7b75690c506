"""What Excel sends, as what `sheetfuncs.evaluate` takes: serial numbers for dates, texts for error values."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from datetime import datetime
from decimal import Decimal
from itertools import chain
from typing import Any

from sheetfuncs.cells.block import ERROR_TEXTS

# An error value arrives as the number of its SCODE, 0x800A0000 plus 2000 to 2299 (Excel's own XlCVError constants;
# those from 2043 on from memory), read as a signed 32-bit number.
_ERROR_BASE = 0x800A0000 - (1 << 32)
ERROR_OF_CODE = {
    2000: "#NULL!", 2007: "#DIV/0!", 2015: "#VALUE!", 2023: "#REF!", 2029: "#NAME?", 2036: "#NUM!", 2042: "#N/A",
    2043: "#GETTING_DATA", 2045: "#SPILL!", 2046: "#CONNECT!", 2047: "#BLOCKED!", 2048: "#UNKNOWN!", 2049: "#FIELD!",
    2050: "#CALC!", 2051: "#BUSY!",
}
_ERROR_CODES = range(2000, 2300)
# Excel hands dates over as OLE automation dates, whose day 0 is this one ([MS-OAUT] 2.2.25). Serial numbers of the
# 1900 system below 61 arrive as the day before the one that the cell shows, so that the difference is always right.
_START_1900 = datetime(1899, 12, 30)
_START_1904 = datetime(1904, 1, 1)

Cell = float | bool | str | None
PLAIN = {float, bool, str, type(None)}
"""Types of cells that need no conversion."""


def as_rows(given: object, *, date1904: bool = False) -> object:
    """A range as a list of rows; a bare error value as its text; None, an omitted argument, as it is.

    given: nested tuples or lists, one row as a flat one, one cell as itself. date1904: the system that dates are
    counted in. A call from a cell does not know its workbook's system, so it counts from 1900: the functions get
    serial numbers as the cells hold them wherever these can be read (see `exact`), and dates differ by a constant else.
    """
    if given is None:
        return None
    if not isinstance(given, list | tuple):
        cell = as_cell(given, date1904=date1904)
        return cell if isinstance(cell, str) and cell in ERROR_TEXTS else [[cell]]
    rows = two_dimensional(given)
    if kinds_of(rows) <= PLAIN:  # the usual case, many times faster than cell by cell
        return [list(row) for row in rows]
    return [[as_cell(cell, date1904=date1904) for cell in row] for row in rows]


def two_dimensional(given: object) -> Sequence[Sequence[Any]]:
    """Rows of cells, from what Excel gives for a rectangle, for one row (a flat one) and for one cell (itself)."""
    if not isinstance(given, list | tuple):
        return [[given]]
    return given if not given or isinstance(given[0], list | tuple) else [given]


def as_option(given: object) -> object:
    """The value of an option: one cell's value; several cells stay several, which `evaluate` refuses."""
    if isinstance(given, list | tuple):
        return as_rows(given)
    return as_cell(given)


def as_cell(value: object, *, date1904: bool = False) -> Cell:
    """One value: None for a blank, a serial number for a date, a float for currency, the text of an error value."""
    if value is None or isinstance(value, bool | str):
        return value if value != "" else None
    if isinstance(value, datetime):
        return serial_of(value, date1904)
    if isinstance(value, int):
        return error_text(value) or float(value)
    if isinstance(value, float | Decimal):
        return float(value)
    return None  # what has no value in a cell, such as the mark for "nothing" of macOS' scripting


def error_text(number: int) -> str | None:
    """ "#N/A" for the number that stands for it, None for a number that is no error value."""
    code = number - _ERROR_BASE
    return ERROR_OF_CODE.get(code, "#UNKNOWN!") if code in _ERROR_CODES else None


def serial_of(moment: datetime, date1904: bool = False) -> float:
    """The serial number of a date in the workbook's system; a time zone, which cells do not have, is cut off."""
    since = moment.replace(tzinfo=None) - (_START_1904 if date1904 else _START_1900)
    return since.days + since.seconds / 86_400 + since.microseconds / 86_400e6


def exact(seen: Sequence[Sequence[Any]], held: object) -> list[list[Any]]:
    """The cells as seen, with dates and currency replaced by the numbers that the cells hold.

    Excel rounds currency to four decimals and dates to milliseconds in what it shows to programs (`Range.Value`), not
    in what the cells hold (`Range.Value2`).
    """
    return [
        [b if isinstance(a, datetime | Decimal) else a for a, b in zip(left, right, strict=True)]
        for left, right in zip(seen, two_dimensional(held), strict=True)
    ]


def needs_exact(seen: Iterable[Iterable[Any]]) -> bool:
    """Whether any cell is a date or currency."""
    return any(issubclass(kind, datetime | Decimal) for kind in kinds_of(seen))


def kinds_of(rows: Iterable[Iterable[object]]) -> set[type]:
    """The types of all cells."""
    return set(map(type, chain.from_iterable(rows)))


def for_excel(result: object) -> object:
    """A result in the shape that Excel takes: plain floats, bools and texts; "" where a cell holds nothing.

    A number that no cell can hold becomes "#NUM!". Error texts stay texts; the VBA around the call makes them true
    error values.
    """
    if isinstance(result, list):
        return [[_plain(cell) for cell in row] for row in result]
    return _plain(result)


def _plain(cell: object) -> float | bool | str:
    if cell is None:
        return ""
    if isinstance(cell, bool | str):
        return cell
    number = float(cell)  # type: ignore[arg-type]
    return number if math.isfinite(number) else "#NUM!"
