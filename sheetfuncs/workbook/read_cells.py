"""Cells of a worksheet part, one by one: whatever the standard allows (ISO/IEC 29500-1, 18.3.1.4), in one pass."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from xml.parsers import expat

import numpy as np

from sheetfuncs.cells.address import cell_name
from sheetfuncs.cells.block import Kind
from sheetfuncs.cells.serial_dates import serial_of_text
from sheetfuncs.errors import WorkbookFormatError
from sheetfuncs.workbook.read_gather import Gathering
from sheetfuncs.workbook.read_strings import feed, unescape
from sheetfuncs.workbook.xml import MAIN

_REFERENCE = re.compile(r"([A-Za-z]{1,3})([0-9]{1,7})")
_TRUE = frozenset({"1", "true", "on"})
_TAGS = ("sheetData", "row", "c", "v", "f", "is", "t", "rPh", "sheetFormatPr")
_SHEET_DATA, _ROW, _CELL, _VALUE, _FORMULA, _INLINE, _TEXT, _PHONETIC, _FORMAT = (f"{MAIN} {tag}" for tag in _TAGS)


class CellReader:
    """Puts cells into a gathering with an XML parser, which knows every form that a cell may take."""

    def __init__(self, gathering: Gathering, date_formats: np.ndarray, date1904: bool):
        self.gathering, self.date1904 = gathering, date1904
        self.date_formats: list[bool] = date_formats.tolist()
        self.columns: dict[str, int] = {}
        self.row = self.column = 0
        self.in_data = self.in_cell = self.in_inline = self.has_formula = self.has_value = False
        self.phonetic = 0
        self.kind, self.style = "n", "0"
        self.collecting = False
        self.pieces: list[str] = []

    def read_part(self, chunks: Iterable[bytes]) -> None:
        """Read a worksheet part, or a piece of one in a root of its own; rows count on from the piece before."""
        parser = expat.ParserCreate(namespace_separator=" ")
        parser.StartElementHandler, parser.EndElementHandler = self._start, self._end
        parser.CharacterDataHandler = self._characters
        feed(parser, chunks, self.gathering.where)

    def _start(self, name: str, attributes: dict[str, str]) -> None:
        if name == _CELL and self.in_data:
            self._start_cell(attributes)
        elif self.in_cell and not self.phonetic and (name == _VALUE or (name == _TEXT and self.in_inline)):
            self.collecting = True
            self.has_value = self.has_value or name == _VALUE
        elif name == _FORMULA and self.in_cell:
            self.has_formula = True
        elif name == _INLINE and self.in_cell:
            self.in_inline = True
        elif name == _PHONETIC and self.in_cell:
            self.phonetic += 1
        elif name == _ROW and self.in_data:
            self._start_row(attributes)
        elif name == _SHEET_DATA:
            self.in_data = True
        elif name == _FORMAT and attributes.get("zeroHeight") in _TRUE:
            self.gathering.hide_by_default()

    def _end(self, name: str) -> None:
        if name in (_VALUE, _TEXT):
            self.collecting = False
        elif name == _CELL and self.in_cell:
            self._end_cell()
        elif name == _INLINE:
            self.in_inline = False
        elif name == _PHONETIC and self.phonetic:
            self.phonetic -= 1
        elif name == _SHEET_DATA:
            self.in_data = False

    def _characters(self, text: str) -> None:
        if self.collecting:
            self.pieces.append(text)

    def _start_row(self, attributes: dict[str, str]) -> None:
        number = attributes.get("r")
        self.row = self.row + 1 if number is None else self._whole(number, "a row number")
        self.column = 0
        hidden = attributes.get("hidden") in _TRUE
        if hidden or self.gathering.hides_by_default:
            self.gathering.hide(self.row, hidden)

    def _start_cell(self, attributes: dict[str, str]) -> None:
        reference = attributes.get("r")
        if reference is None:
            self.column += 1
        else:
            match = _REFERENCE.fullmatch(reference)
            if match is None:
                raise self._damaged(f"{reference[:20]!r} is no cell")
            letters, digits = match.groups()
            if letters not in self.columns:
                self.columns[letters] = _column(letters)
            self.column, self.row = self.columns[letters], int(digits)
        self.kind, self.style = attributes.get("t", "n"), attributes.get("s", "0")
        self.in_cell, self.has_formula, self.has_value = True, False, False
        self.pieces.clear()

    def _end_cell(self) -> None:
        self.in_cell = self.collecting = False
        gathering, row, column = self.gathering, self.row, self.column
        text = "".join(self.pieces)
        if text or self.has_formula:
            gathering.touch(row, column)
        covered = gathering.covers(row, column)
        if covered and self.has_formula:
            stored = bool(text) or (self.kind == "str" and self.has_value)
            gathering.mark_formula(row, column, stored=stored)
        if covered and text:
            self._put(text)

    def _put(self, text: str) -> None:
        row, column, put = self.row, self.column, self.gathering.put
        if self.kind == "n":
            number = self._number(text)
            if math.isfinite(number):
                put(row, column, Kind.DATE if self._shows_date() else Kind.NUMBER, number, None)
            else:
                put(row, column, Kind.ERROR, math.nan, "#NUM!")
        elif self.kind == "s":
            self.gathering.put_shared(row, column, self._whole(text, "the place of a shared text"))
        elif self.kind in ("str", "inlineStr"):
            put(row, column, Kind.TEXT, math.nan, unescape(text))
        elif self.kind == "b":
            put(row, column, Kind.BOOLEAN, float(text.strip() in _TRUE), None)
        elif self.kind == "e":
            put(row, column, Kind.ERROR, math.nan, text.strip())
        elif self.kind == "d":
            serial = serial_of_text(text, self.date1904)
            if serial is None:
                raise self._damaged(f"{cell_name(row, column)} should hold a date, but has {text[:40]!r}")
            put(row, column, Kind.DATE, serial, None)
        else:
            raise self._damaged(f"{cell_name(row, column)} is of the unknown kind {self.kind[:20]!r}")

    def _shows_date(self) -> bool:
        style = self._whole(self.style, "a format")
        return 0 <= style < len(self.date_formats) and self.date_formats[style]

    def _number(self, text: str) -> float:
        try:
            if "_" not in text:  # which Python allows between digits
                return float(text)
        except ValueError:
            pass
        raise self._damaged(f"{cell_name(self.row, self.column)} should hold a number, but has {text[:40]!r}")

    def _whole(self, text: str, what: str) -> int:
        text = text.strip()
        if not (text.isascii() and text.isdigit() and len(text) <= 9):
            raise self._damaged(f"{text[:20]!r} is {what}")
        return int(text)

    def _damaged(self, what: str) -> WorkbookFormatError:
        return WorkbookFormatError(
            f"{self.gathering.where} is damaged: {what}. Open it in the spreadsheet program, let it repair the file, "
            "and save it again."
        )


def _column(letters: str) -> int:
    number = 0
    for letter in letters.upper():
        number = 26 * number + ord(letter) - 64
    return number
