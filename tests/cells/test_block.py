"""Blocks from rows of cells, as hosts hand them over."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sheetfuncs.cells.block import ERROR_TEXTS, Block, Kind
from sheetfuncs.errors import CellKindError

cells = (
    st.none() | st.floats() | st.integers() | st.integers(-(10**400), 10**400) | st.booleans() | st.text(max_size=3)
    | st.sampled_from(["", " ", *sorted(ERROR_TEXTS)])
)  # fmt: skip
one_kind = st.sampled_from(
    [st.floats(allow_nan=False), st.text(max_size=2), st.just(""), st.none(), cells, st.integers()]
)


@st.composite
def rows(draw) -> list[list[object]]:
    height = draw(st.integers(0, 8))
    columns = [draw(st.lists(draw(one_kind), min_size=height, max_size=height)) for _ in range(draw(st.integers(0, 4)))]
    return [list(row) for row in zip(*columns, strict=True)]


def expected(cell: object) -> tuple[Kind, object]:
    """What one cell is, said plainly."""
    if cell is None or cell == "":
        return Kind.BLANK, None
    if isinstance(cell, bool):
        return Kind.BOOLEAN, cell
    if isinstance(cell, str):
        return (Kind.ERROR if cell in ERROR_TEXTS else Kind.TEXT), cell
    try:
        number = float(cell)
    except OverflowError:
        number = math.inf
    return (Kind.NUMBER, number) if math.isfinite(number) else (Kind.ERROR, "#NUM!")


@given(rows())
def test_every_cell_keeps_kind_and_value(given_rows):
    block = Block.from_rows(given_rows)
    assert (block.numbers.dtype, block.kinds.dtype) == (np.float64, np.uint8)
    assert block.row_count == len(given_rows)
    for r, row in enumerate(given_rows):
        for c, cell in enumerate(row):
            kind, value = expected(cell)
            assert (block.kinds[r, c], block.value(r, c)) == (kind, value)
            assert (block.text(r, c) is not None) == (kind in (Kind.TEXT, Kind.ERROR))
            assert math.isnan(block.numbers[r, c]) == (kind not in (Kind.NUMBER, Kind.BOOLEAN))
    for column, texts in block.texts.items():
        assert np.isin(block.kinds[:, column], [Kind.TEXT, Kind.ERROR]).any()
        assert len(texts) == block.row_count


def test_shorter_rows_end_in_blanks():
    assert Block.from_rows([[1.0, 2.0], [3], []]).kinds.tolist() == [[1, 1], [1, 0], [0, 0]]


@pytest.mark.parametrize("cell", [object(), [1.0], {}, b"1", 1j])
def test_another_object_is_refused(cell):
    with pytest.raises(CellKindError, match=type(cell).__name__):
        Block.from_rows([[1.0], [cell]])


def test_numbers_of_numpy_are_numbers():
    block = Block.from_rows([[np.float64(1.5), np.int64(2)], [np.bool_(True), np.float32(0.5)]])
    assert block.kinds.tolist() == [[1, 1], [2, 1]]
    assert block.numbers.tolist() == [[1.5, 2.0], [1.0, 0.5]]


def test_columns_know_where_they_stand():
    block = Block.from_rows([[1.0, "a", 3.0], [4.0, "b", 6.0]], sheet="Jobs", first_row=3, first_column=2)
    picked = block.columns([2, 1])
    assert (picked.value(1, 0), picked.value(1, 1)) == (6.0, "b")
    assert [picked.worksheet_column(index) for index in (0, 1)] == [4, 3]
    assert block.columns([1, 2]).worksheet_columns is None
    assert block.columns([1, 2]).first_column == 3
    assert [block.columns([0, 2]).columns([1]).worksheet_column(0)] == [4]


def test_rows_know_where_they_stand():
    block = Block.from_rows([["a"], [2.0], [3.0]], first_row=3, hidden=np.array([False, True, False]), date1904=True)
    below = block.rows(1, 3)
    assert (below.first_row, below.row_count, below.hidden.tolist(), below.date1904) == (4, 2, [True, False], True)
