"""Whatever stands in the cells is read, or refused with a sentence; what is read is what stands there."""

from __future__ import annotations

import math

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from sheetfuncs.cells.block import ERROR_TEXTS, Block, Kind
from sheetfuncs.cells.observations import CategoryColumn, read_observations, read_predictors
from sheetfuncs.errors import SheetfuncsError

number = st.floats(allow_nan=False, allow_infinity=False)
word = st.sampled_from(["north", "south", "east"])
anything = (
    number | st.none() | st.text(max_size=3) | st.booleans() | st.sampled_from(["", " ", "12", *sorted(ERROR_TEXTS)])
)
gappy = st.one_of(number, number, number, st.none(), st.sampled_from(["#N/A", ""]))


@st.composite
def columns(draw, cells: list[st.SearchStrategy], heading: bool) -> list[list[object]]:
    height = draw(st.integers(0, 9))
    made = []
    for _ in range(draw(st.integers(1, 4))):
        column = draw(st.lists(draw(st.sampled_from(cells)), min_size=height, max_size=height))
        made.append([draw(st.text(max_size=3) | st.just("Cost")), *column] if heading else column)
    return made


@st.composite
def blocks(draw, cells: list[st.SearchStrategy]) -> tuple[Block, Block, Block | None]:
    heading = draw(st.booleans())
    made = draw(columns(cells, heading))
    rows = [list(row) for row in zip(*made, strict=True)]
    place = draw(st.sampled_from([{}, {"sheet": "Job's", "first_row": 5, "first_column": 3}]))
    hidden = np.array([draw(st.booleans()) for _ in rows], bool)
    block = Block.from_rows(rows, **place, hidden=hidden if draw(st.booleans()) else None)
    for row, column in draw(st.lists(st.tuples(st.integers(0, 9), st.integers(0, 3)), max_size=3)):
        if row < block.row_count and column < block.column_count and block.kinds[row, column] == Kind.NUMBER:
            block.kinds[row, column] = Kind.DATE
    order = block.columns([0]) if draw(st.booleans()) and block.column_count else None
    predictors = block.columns(range(1, block.column_count))
    return block.columns([0] if block.column_count else []), predictors, order


def is_sentence(text: str) -> bool:
    return text.endswith(".") and len(text) < 1500 and text.isprintable()


@given(blocks([anything, gappy, word]), st.sampled_from(["plain", "check"]), st.lists(st.text(max_size=2), max_size=2))
def test_any_cells_are_read_or_refused(three, dates, date_predictors):
    response, predictors, order = three
    for read in (
        lambda: read_observations(response, predictors, order, dates=dates, date_predictors=date_predictors),
        lambda: read_predictors(predictors),
    ):
        try:
            found = read()
        except SheetfuncsError as refusal:
            message = str(refusal)
            assert is_sentence(message), message
        else:
            assert all(map(is_sentence, found.remarks))


@given(blocks([gappy, number, word]))
def test_what_is_read_is_what_stands_there(three):
    response, predictors, order = three
    try:
        found = read_observations(response, predictors, order)
    except SheetfuncsError:
        return
    ledger, positions = found.ledger, found.positions
    assert (ledger.used == positions + response.first_row).all()
    assert len(ledger.used) > 0
    assert (np.diff(ledger.used) > 0).all()
    sources = [(response, 0, found.response), *((predictors, i, c) for i, c in enumerate(found.predictors))]
    sources += [(order, 0, found.order)] if order is not None else []
    for block, index, column in sources:
        for position, place in zip(positions.tolist(), range(len(positions)), strict=True):
            if isinstance(column, CategoryColumn):
                assert column.levels[column.codes[place]] == block.text(position, index)
            else:
                assert column.values[place] == block.numbers[position, index]
                assert math.isfinite(column.values[place])
    excluded = {row.row - response.first_row for row in ledger.excluded}
    assert not excluded & set(positions.tolist())
    for position in excluded:
        kinds = [block.kinds[position, index] for block, index, _ in sources]
        assert any(kind in (Kind.BLANK, Kind.ERROR) for kind in kinds)
    accounted = excluded | set(positions.tolist()) | ({found.header_position} if found.has_header else set())
    for position in set(range(response.row_count)) - accounted:
        assert all(block.kinds[position, index] == Kind.BLANK for block, index, _ in sources)
    if response.hidden is not None:
        assert ledger.hidden == int(response.hidden[positions].sum())
    names = [found.response.name, *(column.name for column in found.predictors)]
    assert all(names)
