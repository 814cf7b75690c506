"""A1 references: parsing what people and formulas write, and writing it back."""

from __future__ import annotations

import re
from dataclasses import dataclass, replace

from sheetfuncs.errors import AddressError

MAX_ROWS = 1_048_576
MAX_COLUMNS = 16_384

_CELL = re.compile(r"\$?([A-Za-z]{1,3})\$?([0-9]{1,7})")
_COLUMN = re.compile(r"\$?([A-Za-z]{1,3})")
_ROW = re.compile(r"\$?([0-9]{1,7})")
_BARE_SHEET = re.compile(r"[^\W\d][\w.]*")
_LOOKS_LIKE_CELL = re.compile(
    r"[A-Za-z]{1,3}[0-9]+|[Rr]-?[0-9]*([Cc]-?[0-9]*)?|[Cc]-?[0-9]*|[Tt][Rr][Uu][Ee]|"
    r"[Ff][Aa][Ll][Ss][Ee]"
)


@dataclass(frozen=True)
class Area:
    """A rectangle of cells, 1-based and inclusive; an open end is None (whole columns: `last_row` None).

    `sheet` is None where the reference does not name one.
    """

    sheet: str | None
    first_row: int
    first_column: int
    last_row: int | None
    last_column: int | None

    def __str__(self) -> str:
        return format_area(self)

    def without_sheet(self) -> Area:
        return replace(self, sheet=None)

    @property
    def is_cell(self) -> bool:
        return self.first_row == self.last_row and self.first_column == self.last_column


def column_letters(number: int) -> str:
    """1 -> "A", 28 -> "AB"."""
    if not 1 <= number <= MAX_COLUMNS:
        raise AddressError(f"Column number {number} does not exist: a sheet has columns 1 to {MAX_COLUMNS} (XFD).")
    letters = ""
    while number:
        number, place = divmod(number - 1, 26)
        letters = chr(65 + place) + letters
    return letters


def column_number(letters: str) -> int:
    """ "A" -> 1, "ab" -> 28. Raises AddressError beyond XFD or for anything but letters."""
    number = 0
    if re.fullmatch("[A-Za-z]{1,3}", letters):
        for letter in letters.upper():
            number = 26 * number + ord(letter) - 64
    if not 1 <= number <= MAX_COLUMNS:
        raise AddressError(f"There is no column {shown(letters)}: columns run from A to XFD.")
    return number


def quote_sheet(name: str) -> str:
    """The sheet's name as a formula writes it: in quotes unless it is plain."""
    if _BARE_SHEET.fullmatch(name) and not _LOOKS_LIKE_CELL.fullmatch(name):
        return name
    return "'" + name.replace("'", "''") + "'"


def cell_name(row: int, column: int, sheet: str | None = None) -> str:
    """ "C17", or "Jobs!C17" with a sheet."""
    name = f"{column_letters(column)}{row}"
    return name if sheet is None else f"{quote_sheet(sheet)}!{name}"


def format_area(area: Area) -> str:
    """The reference as text: "Jobs!B3:F64", "Jobs!B:D", "C17"."""
    first, last = column_letters(area.first_column), column_letters(area.last_column or MAX_COLUMNS)
    if area.last_row is None:
        text = f"{first}:{last}" if area.first_row == 1 else f"{first}{area.first_row}:{last}{MAX_ROWS}"
    elif area.is_cell:
        text = f"{first}{area.first_row}"
    else:
        text = f"{first}{area.first_row}:{last}{area.last_row}"
    return text if area.sheet is None else f"{quote_sheet(area.sheet)}!{text}"


def is_address(text: str) -> bool:
    """Whether the text has the form of a reference (and not of a table's or a defined name)."""
    text = text.strip().removeprefix("=")
    if "!" in text:
        return True
    parts = re.split("[:,;]", text)
    forms = (_CELL,) if len(parts) == 1 else (_CELL, _COLUMN, _ROW)
    return all(any(form.fullmatch(part.strip()) for form in forms) for part in parts)


def parse_area(text: str) -> Area:
    """Parse one rectangle: "Jobs!B3:F64", "'Job list'!$B$3:$F$64", "Jobs!B:D", "C17".

    The sheet's name may stand without quotes (a command line takes them off). Raises AddressError for whole rows,
    several areas, other workbooks, several sheets, and what lies outside a sheet.
    """
    whole = text.strip().removeprefix("=").strip()
    sheet, cells = _split_sheet(whole, text)
    if "," in cells or ";" in cells:
        raise AddressError(
            f"{shown(text)} is more than one area; give one rectangle that holds all columns and choose among them "
            "by name or letter."
        )
    corners = [part.strip() for part in cells.split(":")]
    if len(corners) == 2 and "!" in corners[1]:  # "Jobs!B3:Jobs!F64", as some programs write it
        second, corners[1] = _split_sheet(corners[1], text)
        if sheet is None or second is None or second.casefold() != sheet.casefold():
            raise AddressError(f"{shown(text)} spans two sheets; give an area of one sheet, such as Jobs!B3:F64.")
    if len(corners) > 2:
        raise _malformed(text)
    return _area(sheet, corners[0], corners[-1], text)


def _split_sheet(whole: str, text: str) -> tuple[str | None, str]:
    if whole.startswith("'"):
        match = re.match(r"'((?:[^']|'')+)'!", whole)
        if match is None:
            raise AddressError(
                f"{shown(text)} has a sheet name in quotes that is not closed before '!'; write it as "
                "'Job list'!B3:F64, and a quote inside the name twice."
            )
        name, cells = match[1].replace("''", "'"), whole[match.end() :]
    elif "!" in whole:
        name, cells = whole.split("!", 1)
        if "!" in cells and not re.search(r":\s*'?[^:]+!", cells):  # an unquoted name that holds "!" itself
            name, cells = whole.rsplit("!", 1)
    else:
        return None, whole
    if not name.strip():
        raise AddressError(f"{shown(text)} names no sheet before '!'; write it as Jobs!B3:F64.")
    if "[" in name or "]" in name:
        raise AddressError(f"{shown(text)} points into another workbook; only the workbook that was given is read.")
    if ":" in name:
        raise AddressError(f"{shown(text)} spans several sheets; give an area of one sheet, such as Jobs!B3:F64.")
    return name if whole.startswith("'") else name.strip(), cells.strip()


def _area(sheet: str | None, first: str, last: str, text: str) -> Area:
    cells = _CELL.fullmatch(first), _CELL.fullmatch(last)
    columns = _COLUMN.fullmatch(first), _COLUMN.fullmatch(last)
    if cells[0] and cells[1]:
        rows = sorted((_row(cells[0][2], text), _row(cells[1][2], text)))
        numbers = sorted((column_number(cells[0][1]), column_number(cells[1][1])))
        return Area(sheet, rows[0], numbers[0], rows[1], numbers[1])
    if columns[0] and columns[1] and ":" in text:
        numbers = sorted((column_number(columns[0][1]), column_number(columns[1][1])))
        return Area(sheet, 1, numbers[0], None, numbers[1])
    if _ROW.fullmatch(first) and _ROW.fullmatch(last):
        raise AddressError(
            f"{shown(text)} is whole rows; observations stand in rows and variables in columns: give whole columns "
            "(B:D) or a rectangle (B3:F64)."
        )
    raise _malformed(text)


def _row(digits: str, text: str) -> int:
    row = int(digits)
    if not 1 <= row <= MAX_ROWS:
        raise AddressError(f"{shown(text)} reaches outside the sheet: rows run from 1 to {MAX_ROWS}.")
    return row


def _malformed(text: str) -> AddressError:
    return AddressError(
        f"{shown(text)} is not an address; write a rectangle with its sheet, such as Jobs!B3:F64 or "
        "'Job list'!B3:F64, or whole columns, such as Jobs!B:D."
    )


def shown(text: str) -> str:
    """What somebody typed, as sentences show it: on one line, in quotes, cut where it is long."""
    text = " ".join(text.split())
    return f"“{text if len(text) <= 80 else text[:77] + '...'}”"
