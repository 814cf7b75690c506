"""Cells gathered into a block as a sheet is read: bounded, in any order, one cell or many at a time."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from sheetfuncs.cells.address import MAX_COLUMNS, MAX_ROWS, Area, format_area
from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.errors import BlockShapeError, WorkbookFormatError

MAX_CELLS = 50_000_000
"""Most cells of one block; 9 bytes each."""
_START_ROWS = 1024


_STORED, _UNSTORED = 1, 2


@dataclass(frozen=True, eq=False)
class SheetCells:
    """A block as read, and where its formulas are.

    marks: uint8 (rows, columns), 1 for a formula with a stored value and 2 for one without; None without formulas.
    last_row, last_column: of the last filled cells or formulas anywhere on the sheet; 0 for an empty one.
    """

    block: Block
    marks: np.ndarray | None
    last_row: int
    last_column: int

    @property
    def formulas(self) -> np.ndarray:
        """int64 (columns,): how many cells hold a formula."""
        return self._count(_STORED) + self.unstored

    @property
    def unstored(self) -> np.ndarray:
        """int64 (columns,): how many cells hold a formula without a stored value."""
        return self._count(_UNSTORED)

    def _count(self, mark: int) -> np.ndarray:
        if self.marks is None:
            return np.zeros(self.block.column_count, np.int64)
        return np.count_nonzero(self.marks == mark, axis=0)


class Gathering:
    """Takes cells by worksheet row and column, keeps those of the area, and notes how far the sheet is filled.

    Open ends of the area grow with the cells. `where` names the sheet and the workbook in a refusal.
    """

    def __init__(self, area: Area, where: str):
        self.area, self.where = area, where
        self.first_row, self.last_row = area.first_row, area.last_row or MAX_ROWS
        self.first_column, self.last_column = area.first_column, area.last_column or MAX_COLUMNS
        self.used_row = self.used_column = 0
        self.hides_by_default = False
        self.texts: dict[int, np.ndarray] = {}
        self.marks: np.ndarray | None = None
        self.numbers = np.empty((0, 0), order="F")
        self.kinds = np.empty((0, 0), np.uint8, order="F")
        self._hidden = np.zeros(0, bool)
        self._shared: list[tuple[np.ndarray, np.ndarray, np.ndarray]] = []
        self._single: tuple[list[int], list[int], list[int]] = ([], [], [])
        self._require_size(self._closed_height(0), self._closed_width(0))

    def _closed_height(self, used: int) -> int:
        return used if self.area.last_row is None else self.last_row - self.first_row + 1

    def _closed_width(self, used: int) -> int:
        return used if self.area.last_column is None else self.last_column - self.first_column + 1

    def reserve(self, rows: int, columns: int) -> None:
        """Make room for this many rows and columns of the area."""
        old_rows, old_columns = self.kinds.shape
        if rows > old_rows or columns > old_columns:
            most_rows, most_columns = self.last_row - self.first_row + 1, self.last_column - self.first_column + 1
            self._resize(
                old_rows if rows <= old_rows else min(max(rows, 2 * old_rows, _START_ROWS), most_rows),
                old_columns if columns <= old_columns else min(max(columns, 2 * old_columns), most_columns),
            )

    def _resize(self, rows: int, columns: int) -> None:
        self._require_size(rows, columns)
        self.numbers = _moved(self.numbers, np.full((rows, columns), np.nan, order="F"))
        self.kinds = _moved(self.kinds, np.zeros((rows, columns), np.uint8, order="F"))
        if self.marks is not None:
            self.marks = _moved(self.marks, np.zeros((rows, columns), np.uint8, order="F"))
        self.texts = {column: _resized(texts, rows, None) for column, texts in self.texts.items() if column < columns}

    def _require_size(self, rows: int, columns: int) -> None:
        if rows * columns > MAX_CELLS:
            raise BlockShapeError(
                f"{format_area(self.area)} takes {rows:,} rows and {columns:,} columns; at most {MAX_CELLS:,} cells "
                "are read: give the rectangle that holds the data, such as Jobs!B3:F64."
            )

    def touch(self, row: int, column: int) -> None:
        """Note a filled cell, in the area or not."""
        if not (1 <= row <= MAX_ROWS and 1 <= column <= MAX_COLUMNS):
            raise WorkbookFormatError(f"{self.where} is damaged: it places a cell in row {row}, column {column}.")
        self.used_row, self.used_column = max(self.used_row, row), max(self.used_column, column)

    def covers(self, row: int, column: int) -> bool:
        return self.first_row <= row <= self.last_row and self.first_column <= column <= self.last_column

    def put(self, row: int, column: int, kind: Kind, number: float, text: str | None) -> None:
        """Store one filled cell of the area; a cell given twice keeps the last value."""
        at, index = row - self.first_row, column - self.first_column
        self.reserve(at + 1, index + 1)
        self.kinds[at, index], self.numbers[at, index] = kind, number
        if text is not None or index in self.texts:
            self.column_texts(index)[at] = text

    def put_shared(self, row: int, column: int, string: int) -> None:
        """Store one cell whose text is a shared string, by its place; its text is filled in by `finish`."""
        self.put(row, column, Kind.TEXT, np.nan, None)
        rows, columns, strings = self._single
        rows.append(row - self.first_row)
        columns.append(column - self.first_column)
        strings.append(string)

    def put_many(self, rows: np.ndarray, columns: np.ndarray, kinds: np.ndarray | Kind, numbers: np.ndarray) -> None:
        """Store cells without text, for arrays of 0-based places in the area, for which there is room."""
        self.kinds[rows, columns] = kinds
        self.numbers[rows, columns] = numbers

    def put_many_shared(self, rows: np.ndarray, columns: np.ndarray, strings: np.ndarray) -> None:
        """As put_shared, for arrays of 0-based places in the area, for which there is room."""
        self.put_many(rows, columns, Kind.TEXT, np.full(len(rows), np.nan))
        self._shared.append((rows, columns, strings))

    def put_many_texts(self, rows: np.ndarray, columns: np.ndarray, kinds: np.ndarray, texts: np.ndarray) -> None:
        """Store texts and errors, for arrays of 0-based places in the area, for which there is room."""
        self.put_many(rows, columns, kinds, np.full(len(rows), np.nan))
        for column in np.unique(columns).tolist():
            here = columns == column
            self.column_texts(column)[rows[here]] = texts[here]

    @property
    def has_shared(self) -> bool:
        return bool(self._shared or self._single[0])

    def column_texts(self, index: int) -> np.ndarray:
        if index not in self.texts:
            self.texts[index] = np.full(len(self.kinds), None, object)
        return self.texts[index]

    def mark_formulas(self, rows: np.ndarray, columns: np.ndarray, stored: np.ndarray) -> None:
        """Note formulas at 0-based places in the area, for which there is room; stored: which have a value."""
        if len(rows):
            self._marks()[rows, columns] = np.where(stored, _STORED, _UNSTORED)

    def mark_formula(self, row: int, column: int, *, stored: bool) -> None:
        """Note one formula in the area."""
        at, index = row - self.first_row, column - self.first_column
        self.reserve(at + 1, index + 1)
        self._marks()[at, index] = _STORED if stored else _UNSTORED

    def _marks(self) -> np.ndarray:
        if self.marks is None:
            self.marks = np.zeros(self.kinds.shape, np.uint8, order="F")
        return self.marks

    def hide(self, row: int, hidden: bool = True) -> None:
        """Say whether a worksheet row is hidden."""
        if row > MAX_ROWS or row < 1:
            raise WorkbookFormatError(f"{self.where} is damaged: it lists a row number {row}.")
        if row > len(self._hidden):
            self._hidden = _resized(self._hidden, min(MAX_ROWS, max(row, 2 * len(self._hidden))), self.hides_by_default)
        self._hidden[row - 1] = hidden

    def hide_by_default(self) -> None:
        """Rows that the sheet does not list are hidden (sheetFormatPr, zeroHeight)."""
        self.hides_by_default = True

    def finish(self, strings: list[str], sheet: str, date1904: bool) -> SheetCells:
        """The block: as high as the area where that is closed, else down to the last filled row of the sheet."""
        self._fill_shared(strings)
        height = self._closed_height(max(0, self.used_row - self.first_row + 1))
        width = self._closed_width(max(0, self.used_column - self.first_column + 1))
        rows, columns = self.kinds.shape
        if height > rows or width > columns or 4 * height * width < 3 * rows * columns:  # else a view is as good
            self._resize(height, width)
        hidden = _resized(self._hidden, max(len(self._hidden), self.first_row - 1 + height), self.hides_by_default)
        block = Block(
            self.numbers[:height, :width],
            self.kinds[:height, :width],
            {column: texts[:height] for column, texts in sorted(self.texts.items()) if column < width},
            sheet,
            self.first_row,
            self.first_column,
            hidden[self.first_row - 1 : self.first_row - 1 + height],
            date1904=date1904,
        )
        marks = None if self.marks is None else self.marks[:height, :width]
        return SheetCells(block, marks, self.used_row, self.used_column)

    def _fill_shared(self, strings: list[str]) -> None:
        rows, columns, places = self._single
        if rows:
            self._shared.append((np.array(rows), np.array(columns), np.array(places)))
        table = np.array([*strings, None], object)[:-1]  # the None keeps numpy from looking inside the strings
        for at, index, string in self._shared:
            wrong = (string < 0) | (string >= len(table))
            if wrong.any():
                raise WorkbookFormatError(
                    f"{self.where} is damaged: it uses the shared text number {string[wrong][0]} of {len(table)}. Let "
                    "the spreadsheet program repair it."
                )
            for column in np.unique(index).tolist():
                here = index == column
                found = table[string[here]]
                self.column_texts(column)[at[here]] = found
                self.kinds[at[here][found == ""], column] = Kind.BLANK
                self.texts[column][at[here][found == ""]] = None


def _moved(old: np.ndarray, new: np.ndarray) -> np.ndarray:
    """The new rectangle with what it shares with the old one."""
    rows, columns = min(len(old), len(new)), min(old.shape[1], new.shape[1])
    new[:rows, :columns] = old[:rows, :columns]
    return new


def _resized(array: np.ndarray, length: int, fill: object) -> np.ndarray:
    """The array cut or filled up to a length."""
    made = np.full(length, fill, array.dtype)
    made[: len(array)] = array[:length]
    return made


def cut_cells(whole: SheetCells, area: Area) -> SheetCells | None:
    """The cells of an area, from all cells of its sheet (from A1 on); None where it reaches beyond them."""
    block = whole.block
    last_row, last_column = area.last_row or whole.last_row, area.last_column or whole.last_column
    if not (area.first_row <= last_row <= block.row_count and area.first_column <= last_column <= block.column_count):
        return None
    rows, columns = slice(area.first_row - 1, last_row), slice(area.first_column - 1, last_column)
    cut = block.rows(rows.start, rows.stop).columns(range(columns.start, columns.stop))
    return replace(whole, block=cut, marks=None if whole.marks is None else whole.marks[rows, columns])
