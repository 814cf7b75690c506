"""Blocks of filled cells on a sheet: the one around a cell, and the first that looks like data."""

from __future__ import annotations

import numpy as np

from sheetfuncs.cells.address import Area, cell_name
from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.cells.stored_text import shown


def block_around(block: Block, row: int, column: int) -> Area | None:
    """The filled block around a worksheet cell, bounded by blank rows and columns or the sheet's edge.

    block: all cells of the sheet, from A1 on. None where the cell and all its neighbours are blank.
    """
    filled = block.kinds != Kind.BLANK
    rows, columns = filled.shape
    top, left = row - 1, column - 1
    near = filled[max(0, top - 1) : top + 2, max(0, left - 1) : left + 2]
    if top > rows or left > columns or not near.any():
        return None
    bounds = (min(top, rows - 1), min(top, rows - 1), min(left, columns - 1), min(left, columns - 1))
    first, last, left, right = _shrink(filled, _expand(filled, bounds))
    return Area(None, first + 1, left + 1, last + 1, right + 1)


def first_block(block: Block) -> tuple[Area, list[str]] | None:
    """The first block of the sheet that looks like data, and remarks on titles and notes that were skipped.

    Data are three rows or more with numbers in two columns or more; where there are none, the first block with any
    numbers. block: all cells of the sheet, from A1 on.
    """
    filled = block.kinds != Kind.BLANK
    left_over = filled.copy()
    skipped: list[str] = []
    second_best = None
    for _ in range(_MOST_BLOCKS):
        start = _first_filled(left_over)
        if start is None:
            break
        bounds = _expand(filled, (start[0], start[0], start[1], start[1]))
        left_over[bounds[0] : bounds[1] + 1, bounds[2] : bounds[3] + 1] = False
        (first, last, left, right), titles = _without_titles(block, filled, bounds)
        kinds = block.kinds[first : last + 1, left : right + 1]
        numeric = int(np.count_nonzero(((kinds == Kind.NUMBER) | (kinds == Kind.DATE)).any(axis=0)))
        found = Area(None, first + 1, left + 1, last + 1, right + 1), [*_skipped_remarks(skipped), *titles]
        if numeric >= 2 and last - first >= 2:
            return found
        if numeric and last > first and second_best is None:
            second_best = found
        skipped.append(_name(block, start[0], start[1]))
    return second_best


_MOST_BLOCKS = 100
_MOST_NAMED = 3


def _skipped_remarks(skipped: list[str]) -> list[str]:
    if not skipped:
        return []
    more = f" and {len(skipped) - _MOST_NAMED} more" if len(skipped) > _MOST_NAMED else ""
    return [f"What stands at {', '.join(skipped[:_MOST_NAMED])}{more} was skipped, as a title or note."]


def _name(block: Block, row: int, column: int) -> str:
    text = block.text(row, column)
    cell = cell_name(row + 1, column + 1)
    return cell if text is None else f"{cell} ({shown(text)})"


def _first_filled(filled: np.ndarray) -> tuple[int, int] | None:
    """The topmost filled cell, the leftmost of its row."""
    rows = np.flatnonzero(filled.any(axis=1))
    if not len(rows):
        return None
    return int(rows[0]), int(np.argmax(filled[rows[0]]))


def _expand(filled: np.ndarray, bounds: tuple[int, int, int, int]) -> tuple[int, int, int, int]:
    """Grow (first row, last row, first column, last column) until all around is blank; corners count as touching."""
    first, last, left, right = bounds
    while True:
        by_row = np.logical_or.reduce(filled[:, max(0, left - 1) : right + 2], axis=1)
        first, last = _run(by_row, first, last)
        by_column = np.logical_or.reduce(filled[max(0, first - 1) : last + 2], axis=0)
        wider = _run(by_column, left, right)
        if wider == (left, right):
            return first, last, left, right
        left, right = wider


def _run(filled: np.ndarray, first: int, last: int) -> tuple[int, int]:
    """The stretch of filled places that goes on from first and last."""
    before, after = np.flatnonzero(~filled[:first]), np.flatnonzero(~filled[last + 1 :])
    new_first = int(before[-1]) + 1 if len(before) else 0
    new_last = last + int(after[0]) if len(after) else len(filled) - 1
    return new_first, new_last


def _shrink(filled: np.ndarray, bounds: tuple[int, int, int, int]) -> tuple[int, int, int, int]:
    """Take off blank rows and columns at the edges (the cell that was asked for may be blank itself)."""
    first, last, left, right = bounds
    inside = filled[first : last + 1, left : right + 1]
    rows, columns = np.flatnonzero(inside.any(axis=1)), np.flatnonzero(inside.any(axis=0))
    return first + int(rows[0]), first + int(rows[-1]), left + int(columns[0]), left + int(columns[-1])


def _without_titles(
    block: Block, filled: np.ndarray, bounds: tuple[int, int, int, int]
) -> tuple[tuple[int, int, int, int], list[str]]:
    """Take title lines off the top: rows with one text, above a row with more cells; then blank edge columns."""
    first, last, left, right = bounds
    remarks = []
    while first < last and right > left:
        places = np.flatnonzero(filled[first, left : right + 1])
        below = np.count_nonzero(filled[first + 1, left : right + 1])
        if len(places) != 1 or below < 1 or block.kinds[first, left + places[0]] != Kind.TEXT:
            break
        if below == 1 and not _title_goes_on(filled, first + 1, last, left, right):
            break
        remarks.append(f"{_name(block, first, left + int(places[0]))} was taken for a title above the data.")
        first += 1
    return (_shrink(filled, (first, last, left, right)) if remarks else (first, last, left, right)), remarks


def _title_goes_on(filled: np.ndarray, row: int, last: int, left: int, right: int) -> bool:
    """Whether lines of one cell lead to a row with more."""
    counts = filled[row : last + 1, left : right + 1].sum(axis=1)
    more = np.flatnonzero(counts > 1)
    return len(more) > 0 and bool((counts[: more[0]] == 1).all())


def below_titles(block: Block) -> tuple[Block, list[str]]:
    """The block, taken from whole columns, from its first block of data on; a sentence where anything stood above."""
    found = first_block(block)
    above = found[0].first_row - 1 if found else 0
    if not above:
        return block, []
    below = block.rows(above, block.row_count)
    if not (block.kinds[:above] != Kind.BLANK).any():
        return below, []
    return below, [f"What stands above row {below.first_row} was skipped, as a title or note."]
