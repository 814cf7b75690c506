"""Ranges of a running Excel: how far they are used, and what their cells hold."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import suppress
from dataclasses import dataclass
from datetime import datetime
from typing import TYPE_CHECKING, Any, cast

import numpy as np

from sheetfuncs.cells.block import ERROR_TEXTS, Block, Kind
from sheetfuncs.hosts.excel.native import ask, on_mac
from sheetfuncs.hosts.excel.values import PLAIN, as_cell, exact, kinds_of, needs_exact, two_dimensional

if TYPE_CHECKING:
    import xlwings as xw

# One reading holds at most so many cells: macOS' scripting gives up on much larger answers.
CELLS_A_READING = 200_000
OTHER_ERROR = "#UNKNOWN!"
MOST_QUESTIONS = 2_000  # about hidden rows, each of which takes some milliseconds


def within_used(cells: xw.Range) -> xw.Range:
    """Whole columns and whole rows, cut behind the last used row and column; any other range as it is."""
    height, width = cells.sheet.cells.shape
    whole_columns = cells.row + cells.shape[0] - 1 >= height
    whole_rows = cells.column + cells.shape[1] - 1 >= width
    if not whole_columns and not whole_rows:
        return cells
    used = cells.sheet.used_range
    rows, columns = cells.shape
    if whole_columns:
        rows = max(1, used.row + used.shape[0] - cells.row)
    if whole_rows:
        columns = max(1, used.column + used.shape[1] - cells.column)
    return cells[:rows, :columns]


def read_block(cells: xw.Range) -> Block:
    """A range as a Block: exact numbers, dates as DATE cells, hidden rows, and where it stands."""
    date1904 = counts_from_1904(cells.sheet.book)
    rows: list[Sequence[Any]] = []
    for part in _parts(cells):
        rows += _read_on_mac(part) if on_mac() else _read(part)
    block = Block.from_rows(
        _converted(rows, date1904), sheet=cells.sheet.name, first_row=cells.row, first_column=cells.column,
        hidden=hidden_rows(cells), date1904=date1904,
    )
    if _Date in kinds_of(rows):
        _mark_dates(block, rows)
    return block


def _mark_dates(block: Block, rows: Sequence[Sequence[Any]]) -> None:
    for i, row in enumerate(rows):
        for j, value in enumerate(row):
            if isinstance(value, _Date) and block.kinds[i, j] == Kind.NUMBER:
                block.kinds[i, j] = Kind.DATE


def _converted(rows: Sequence[Sequence[Any]], date1904: bool) -> Sequence[Sequence[object]]:
    if kinds_of(rows) <= PLAIN:
        return rows
    return [
        [as_cell(value.held if isinstance(value, _Date) else value, date1904=date1904) for value in row] for row in rows
    ]


def counts_from_1904(book: xw.Book) -> bool:
    """Whether the workbook counts its dates from 1904."""
    return bool(ask(book, "Date1904", "date_1904"))


@dataclass(frozen=True)
class _Date:
    """A cell with a date format, and what it holds: its number, or the moment where Excel tells no more."""

    held: object


def _parts(cells: xw.Range) -> Iterator[xw.Range]:
    height, width = cells.shape
    step = max(1, CELLS_A_READING // width)
    for start in range(0, height, step):
        yield cells[start : start + step, :]


def _read(cells: xw.Range) -> Sequence[Sequence[Any]]:
    seen = cells.options(ndim=2, err_to_str=True).value
    if not needs_exact(seen):
        return seen
    held = exact(seen, cells.api.Value2)
    return [
        [_Date(number) if isinstance(value, datetime) else number for value, number in zip(left, right, strict=True)]
        for left, right in zip(seen, held, strict=True)
    ]


def _read_on_mac(cells: xw.Range) -> list[list[Any]]:
    """The same there, where error values are told apart by what the cells show.

    xlwings' own err_to_str fails there on ranges of several rows (seen in the source of 0.37.8).
    """
    seen = cells.options(ndim=2).value
    texts = two_dimensional(cells.api.string_value.get())
    return [
        [_told_apart(value, str(text)) for value, text in zip(left, right, strict=True)]
        for left, right in zip(seen, texts, strict=True)
    ]


def _told_apart(value: Any, text: str) -> Any:
    """A value on macOS. text: what the cell shows; an error value shows a word of Excel's language and has no value."""
    if text in ERROR_TEXTS:
        return text
    if value is None and text.startswith("#"):
        return OTHER_ERROR
    return _Date(value) if isinstance(value, datetime) else value


def hidden_rows(cells: xw.Range) -> np.ndarray | None:
    """Which rows are hidden or filtered out, bool (rows,); None where Excel does not say."""
    try:
        areas = cast("list[xw.Range]", cells.get_special_cells("visible"))
    except Exception:  # on a protected sheet, or in an older xlwings
        return _hidden_by_halves(cells)
    if not areas:  # all columns are hidden, so that this tells nothing of the rows
        return _hidden_by_halves(cells)
    hidden = np.ones(cells.shape[0], bool)
    for area in areas:
        first = area.row - cells.row
        hidden[first : first + area.shape[0]] = False
    return hidden


def _hidden_by_halves(cells: xw.Range) -> np.ndarray | None:
    """The same, asked of all rows at once, then of halves wherever some are hidden and others are not."""
    hidden = np.zeros(cells.shape[0], bool)
    open_parts = [(0, cells.shape[0])]
    for _ in range(MOST_QUESTIONS):
        if not open_parts:
            return hidden
        start, stop = open_parts.pop()
        answer = _all_hidden(cells[start:stop, :1])
        if answer is None and stop - start == 1:
            return None
        if answer is None:
            middle = (start + stop) // 2
            open_parts += [(start, middle), (middle, stop)]
        else:
            hidden[start:stop] = answer
    return None


def _all_hidden(cells: xw.Range) -> bool | None:
    """True where all rows are hidden, False where none is, None for some of them or without an answer."""
    with suppress(Exception):
        answer = cells.api.entire_row.hidden.get() if on_mac() else cells.api.EntireRow.Hidden
        return answer if isinstance(answer, bool) else None
    return None
