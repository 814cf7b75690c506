"""From cells to the arrays of a regression: headers, kinds, rows left out, and the sentences of refusals."""

from __future__ import annotations

import numpy as np
import pytest

from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.cells.observations import CategoryColumn, Column, Observations, read_observations, read_predictors
from sheetfuncs.errors import (
    ArgumentError,
    BlockShapeError,
    CellKindError,
    CollinearPredictorsError,
    SheetfuncsError,
    TooFewRowsError,
)

# Invented: costs of turned parts, by weight, holes and the line that made them.
ROWS = [
    ["Cost", "Weight", "Holes", "Line"],
    [12.5, 2.0, 4.0, "new"],
    [14.0, 2.5, 3.0, "old"],
    [9.5, 1.0, 2.0, "new"],
    [20.0, 4.5, 6.0, "old"],
    [16.5, 3.0, 5.0, "new"],
]


def sheet(rows: list[list[object]], **more) -> Block:
    return Block.from_rows(rows, **{"sheet": "Jobs", "first_row": 3, "first_column": 2, **more})


def read(rows: list[list[object]], columns=(1, 2), order=None, bare=False, **options) -> Observations:
    block = Block.from_rows(rows) if bare else sheet(rows)
    return read_observations(
        block.columns([0]), block.columns(columns), None if order is None else block.columns([order]), **options
    )


def refusal(kind: type[SheetfuncsError], *arguments, **options) -> str:
    with pytest.raises(kind) as refused:
        read(*arguments, **options)
    assert str(refused.value).endswith(".")
    return str(refused.value)


def changed(row: int, column: int, cell: object) -> list[list[object]]:
    rows = [list(cells) for cells in ROWS]
    rows[row][column] = cell
    return rows


def dated(rows: list[list[object]], *cells: tuple[int, int]) -> Block:
    block = sheet(rows)
    for row, column in cells:
        block.kinds[row, column] = Kind.DATE
    return block


def test_a_table_with_a_header():
    found = read(ROWS, (1, 2, 3))
    assert found.response.name == "Cost"
    assert found.response.values.tolist() == [12.5, 14.0, 9.5, 20.0, 16.5]
    weight, holes, line = found.predictors
    assert isinstance(weight, Column)
    assert isinstance(line, CategoryColumn)
    assert (weight.name, holes.values.tolist()) == ("Weight", [4.0, 3.0, 2.0, 6.0, 5.0])
    assert (line.name, line.levels, line.codes.tolist()) == ("Line", ("new", "old"), [0, 1, 0, 1, 0])
    assert found.ledger.used.tolist() == [4, 5, 6, 7, 8]
    assert found.ledger.used.dtype == found.positions.dtype == np.int64
    assert (found.ledger.excluded, found.ledger.hidden, found.ledger.header_row) == ((), 0, 3)
    assert (found.has_header, found.header_position, found.block_rows) == (True, 0, 6)
    assert found.positions.tolist() == [1, 2, 3, 4, 5]
    assert found.used_mask.tolist() == [False, True, True, True, True, True]
    assert (found.order, found.remarks) == (None, ())


def test_without_a_header_columns_are_named_by_letter_or_role():
    found = read(ROWS[1:], (1, 3))
    assert [found.response.name, *(column.name for column in found.predictors)] == ["B", "C", "E"]
    assert (found.ledger.header_row, found.has_header, found.positions.tolist()) == (None, False, [0, 1, 2, 3, 4])
    bare = read(ROWS[1:], (1, 3), order=2, bare=True)
    assert [bare.response.name, *(c.name for c in bare.predictors)] == ["response", "predictor 1", "predictor 2"]
    assert bare.order.name == "order"
    assert bare.ledger.used.tolist() == [1, 2, 3, 4, 5]


def test_the_response_decides_on_the_header():
    assert read([["Cost", 2019.0], *([row[0], row[1]] for row in ROWS[1:])], (1,)).predictors[0].name == "2019"
    assert read([["Cost", None], *([row[0], row[1]] for row in ROWS[1:])], (1,)).predictors[0].name == "C"
    assert read([["Cost", "#REF!"], *([row[0], row[1]] for row in ROWS[1:])], (1,)).predictors[0].name == "C"
    message = refusal(CellKindError, [[1.0, "Weight"], *([row[0], row[1]] for row in ROWS[1:])], (1,))
    assert message.startswith("Jobs!C3, in column C,")
    assert read([["Cost", "w"], [None, 1.0], ["#N/A", 2.0], [5.0, 3.0]], (1,)).ledger.used.tolist() == [6]


def test_a_header_that_reads_as_a_number():
    assert read([["2019", "2018"], [1.0, 2.0], [3.0, 5.0]], (1,)).response.name == "2019"
    assert "stored as text" in refusal(CellKindError, [["12,5", 3.0], [1.0, 2.0], [3.0, 5.0]], (1,))


def test_headers_are_one_line_and_unique():
    rows = [[" Cost \n(EUR) ", "Size", "Size"], *([row[0], row[1], row[2]] for row in ROWS[1:])]
    found = read(rows)
    assert found.response.name == "Cost (EUR)"
    assert [column.name for column in found.predictors] == ["Size (C)", "Size (D)"]
    assert [c.name for c in read(rows, bare=True).predictors] == ["Size (predictor 1)", "Size (predictor 2)"]


def test_dates_in_a_header_are_written_as_dates():
    block = dated([["Cost", 45352.0], [1.0, 2.0], [2.0, 3.0]], (0, 1))
    assert read_observations(block.columns([0]), block.columns([1])).predictors[0].name == "2024-03-01"


def test_names_replace_headers():
    found = read(ROWS[1:], (1, 2), order=2, names=["y", "a", "b", "t"], bare=True)
    assert [found.response.name, *(c.name for c in found.predictors), found.order.name] == ["y", "a", "b", "t"]


def test_rows_with_blanks_and_errors_are_left_out_with_their_reasons():
    rows = [
        *ROWS,
        [1.0, None, "", "new"],
        [2.0, "#DIV/0!", None, "old"],
        [None, None, None, None],
        ["#N/A", 1.0, 1.0, "x"],
    ]
    rows += [[17.0, 3.5, 5.0, "old"]]
    found = read(rows)
    assert [(row.row, row.reason) for row in found.ledger.excluded] == [
        (9, "blank in column C (Weight) and column D (Holes)"),
        (10, "#DIV/0! in column C (Weight); blank in column D (Holes)"),
        (11, "blank row"),
        (12, "#N/A in column B (Cost)"),
    ]
    assert found.ledger.used.tolist() == [4, 5, 6, 7, 8, 13]
    assert found.positions.tolist() == [1, 2, 3, 4, 5, 10]
    assert (found.ledger.gaps, found.ledger.excluded_between) == (1, 4)
    assert read(rows, bare=True).ledger.excluded[0].reason == "blank in predictor 1 (Weight) and predictor 2 (Holes)"


def test_a_blank_counts_only_in_used_columns():
    rows = changed(2, 3, None)
    assert read(rows).ledger.excluded == ()
    assert read(rows, (1, 3)).ledger.excluded[0].reason == "blank in column E (Line)"
    assert read(rows, (1,), order=3 - 1).ledger.excluded == ()


def test_empty_rows_above_and_below_are_no_rows():
    blank: list[object] = [None] * 4
    found = read([blank, blank, *ROWS, blank, blank])
    assert (found.ledger.excluded, found.ledger.used.tolist(), found.ledger.header_row) == ((), [6, 7, 8, 9, 10], 5)
    assert (found.header_position, found.block_rows, found.positions.tolist()) == (2, 10, [3, 4, 5, 6, 7])


def test_hidden_rows_are_used_and_counted():
    block = sheet(changed(2, 1, None), hidden=np.array([True, True, True, False, True, False]))
    found = read_observations(block.columns([0]), block.columns([1]))
    assert found.ledger.used.tolist() == [4, 6, 7, 8]
    assert found.ledger.hidden == 2


@pytest.mark.parametrize(("cell", "said"), [
    ("about 3", "Jobs!C5, in column C (Weight), holds the text “about 3” among 4 numbers"),
    (" ", "nothing but spaces"), ("2,5", "holds “2,5”, a number stored as text"), ("1.234,5", "stored as text"),
    ("12 %", "stored as text"), (" 3 ", "stored as text"), ("\u00a07", "stored as text"),
])  # fmt: skip
def test_text_among_numbers_names_the_cell(cell, said):
    assert said in refusal(CellKindError, changed(2, 1, cell))


def test_text_is_refused_even_in_a_row_that_is_left_out():
    rows = changed(2, 1, "about 3")
    rows[2][2] = None
    assert "Jobs!C5" in refusal(CellKindError, rows)


def test_text_in_the_response_and_the_order():
    rows = [[row[3], row[1]] for row in ROWS]
    assert refusal(CellKindError, rows, (1,)).startswith("Jobs!B3, in column B,")
    assert "Jobs!E3" in refusal(CellKindError, ROWS[1:], (1,), order=3)
    bare = refusal(CellKindError, ROWS[1:], (1,), order=3, bare=True)
    assert bare.startswith("row 1 of order holds the text “new” where numbers are needed, and 4 more")


def test_a_text_of_numbers_is_no_category():
    rows = [["Cost", "Code"], *([row[0], str(place)] for place, row in enumerate(ROWS[1:]))]
    message = refusal(CellKindError, rows, (1,))
    assert "Jobs!C4 holds “0”, a number stored as text (5 such cells in column C (Code))" in message
    mixed = [["Cost", "Code"], [1.0, "a"], [2.0, "7"], [3.0, "a"], [4.0, "b"]]
    assert "Jobs!C5 holds “7”" in refusal(CellKindError, mixed, (1,))


def levels(count: int, rows: int) -> list[list[object]]:
    return [["Cost", "Site"], *([float(place % 7), f"site {place % count:c>3}"] for place in range(rows))]


def test_how_many_levels_a_category_may_have():
    assert len(read(levels(12, 30), (1,)).predictors[0].levels) == 12
    assert "13 different values" in refusal(CellKindError, levels(13, 30), (1,))
    assert "a different text in every used row" in refusal(CellKindError, levels(9, 9), (1,))
    message = refusal(CollinearPredictorsError, levels(1, 9), (1,))
    assert "in every used row" in message


def test_only_levels_of_used_rows_count():
    rows = [["Cost", "Site"], [None, "gone"], [1.0, "a"], [2.0, "b"], [3.0, "a"]]
    assert read(rows, (1,)).predictors[0].levels == ("a", "b")


def test_levels_that_look_alike_are_remarked():
    rows = [["Cost", "Site"], [1.0, "North"], [2.0, "north "], [3.0, " "], [4.0, "North"], [5.0, " "]]
    found = read(rows, (1,))
    assert found.predictors[0].levels == ("North", "north ", " ")
    assert len(found.remarks) == 2
    assert "differ only in spaces or capitals" in found.remarks[0]


def test_a_base_level_can_be_chosen():
    for name in ("Line", "line", "E"):
        line = read(ROWS, (1, 3), base_levels={name: "old"}).predictors[1]
        assert (line.levels, line.codes.tolist()) == (("old", "new"), [1, 0, 1, 0, 1])
    assert read(ROWS, (1, 3), base_levels={"Line": "new"}).predictors[1].levels == ("new", "old")
    rows = [["Cost", "Site"], *([float(i), "abcab"[i]] for i in range(5))]
    site = read(rows, (1,), base_levels={"Site": "c"}).predictors[0]
    assert [site.levels[code] for code in site.codes] == list("abcab")
    assert site.levels == ("c", "a", "b")
    assert "did you mean “old”?" in refusal(ArgumentError, ROWS, (1, 3), base_levels={"Line": "olt"})
    assert "did you mean “Line”?" in refusal(ArgumentError, ROWS, (1, 3), base_levels={"Lime": "old"})
    assert "none of the predictors is text" in refusal(ArgumentError, ROWS, (1,), base_levels={"Weight": "1"})


def test_truth_values_are_zero_and_one_with_a_remark():
    rows = [["Cost", "Rush"], [1.0, True], [2.0, False], [3.0, True], [4.0, 0.0]]
    found = read(rows, (1,))
    assert found.predictors[0].values.tolist() == [1.0, 0.0, 1.0, 0.0]
    assert found.remarks == ("column C (Rush) holds TRUE and FALSE; they count as 1 and 0.",)
    assert "holds the text “yes”" in refusal(CellKindError, [*rows, [5.0, "yes"]], (1,))


DAYS = [["Cost", "Done"], *([row[0], 45000.0 + place] for place, row in enumerate(ROWS[1:]))]
EVERY_DAY = tuple((row, 1) for row in range(1, 6))


def read_days(block: Block, **options) -> Observations:
    return read_observations(block.columns([0]), block.columns([1]), **options)


def test_dates_as_predictors_only_where_asked_for():
    block = dated(DAYS, *EVERY_DAY)
    assert read_days(block).predictors[0].values[0] == 45000.0
    with pytest.raises(CellKindError, match=r"--date-predictor Done") as refused:
        read_days(block, dates="check")
    assert "first in Jobs!C4" in str(refused.value)
    asked = read_days(block, dates="check", date_predictors=["done"])
    assert asked.remarks == ("column C (Done) holds dates or times; they count in days.",)
    with pytest.raises(ArgumentError, match="did you mean “Done”"):
        read_days(block, dates="check", date_predictors=["Dome"])


def test_a_date_among_numbers_is_named():
    with pytest.raises(CellKindError, match=r"Jobs!C6, in column C \(Done\), is a date or time among 4 plain numbers"):
        read_days(dated(DAYS, (3, 1)), dates="check")


def test_dates_are_numbers_for_the_order():
    block = dated(DAYS, *EVERY_DAY)
    found = read_observations(block.columns([0]), sheet(ROWS).columns([1]), block.columns([1]), dates="check")
    assert (found.order.name, found.order.values.tolist()) == ("Done", [45000.0, 45001.0, 45002.0, 45003.0, 45004.0])
    assert found.remarks == ()


def test_rows_of_equal_order_are_remarked():
    rows = [["Cost", "Weight", "Week"], *([row[0], row[1], float(place // 2)] for place, row in enumerate(ROWS[1:]))]
    assert read(rows, (1,), order=2).remarks == (
        "4 rows share their value of the order Week with another row; these keep the sheet's order.",
    )


def test_an_order_may_repeat_a_predictor():
    found = read(ROWS, (1, 2), order=1)
    assert ([c.name for c in found.predictors], found.order.name) == (["Weight", "Holes"], "Weight")


def test_blocks_of_unequal_shape():
    tall, short = sheet(ROWS), sheet(ROWS[:-1])
    with pytest.raises(BlockShapeError, match="6 rows and the predictors have 5"):
        read_observations(tall.columns([0]), short.columns([1]))
    with pytest.raises(BlockShapeError, match="6 rows and the order has 5"):
        read_observations(tall.columns([0]), tall.columns([1]), short.columns([2]))
    with pytest.raises(BlockShapeError, match="2 columns where one is allowed"):
        read_observations(tall.columns([0, 1]), tall.columns([2]))
    with pytest.raises(BlockShapeError, match="TRANSPOSE"):
        read_observations(Block.from_rows([[1.0, 2.0, 3.0]]), Block.from_rows([[1.0, 2.0, 3.0]]))
    with pytest.raises(BlockShapeError, match="no predictor column"):
        read_observations(tall.columns([0]), tall.columns([]))


def test_no_rows_left():
    assert "no rows of data" in refusal(TooFewRowsError, ROWS[:1])
    assert "no rows of data" in refusal(TooFewRowsError, [[None] * 4] * 3)
    assert "no rows of data" in refusal(TooFewRowsError, [["Cost", "w", "h"], [None, None, None]])
    message = refusal(
        TooFewRowsError, [["Cost", "Weight", "Holes"], [1.0, None, 1.0], [2.0, None, 2.0], [3.0, 1.0, "#N/A"]]
    )
    assert "2 × blank in column C (Weight); 1 × #N/A in column D (Holes)" in message


def test_predictors_alone():
    found = read_predictors(sheet(ROWS).columns([1, 2, 3]))
    assert [c.name for c in found.predictors] == ["Weight", "Holes", "Line"]
    assert (found.has_header, found.block_rows, found.positions.tolist()) == (True, 6, [1, 2, 3, 4, 5])
    bare = read_predictors(Block.from_rows([row[1:] for row in ROWS[1:]]))
    assert [c.name for c in bare.predictors] == ["predictor 1", "predictor 2", "predictor 3"]
    assert not bare.has_header


@pytest.mark.parametrize(("first", "header"), [
    (["Weight", "Line"], True), (["Weight", None], True), ([None, "Line"], False), (["Weight", 2019.0], True),
    ([1.0, "old"], False), (["2018", "2019"], True),
])  # fmt: skip
def test_when_predictors_alone_have_a_header(first, header):
    found = read_predictors(Block.from_rows([first, *([row[1], row[3]] for row in ROWS[1:])]))
    assert found.has_header is header


def test_categories_alone_have_a_header_where_the_first_texts_do_not_come_again():
    rows = [["a", "x"], ["b", "y"], ["a", "y"], ["b", "x"]]
    assert not read_predictors(Block.from_rows(rows)).has_header
    assert read_predictors(Block.from_rows([["Line", "Shift"], *rows])).has_header


def test_predictors_alone_are_refused_as_beside_a_response():
    with pytest.raises(CellKindError, match="row 2 of predictor 1 holds “7,5”, a number stored as text"):
        read_predictors(Block.from_rows([[1.0], ["7,5"], [2.0]]))
    with pytest.raises(TooFewRowsError):
        read_predictors(Block.from_rows([["Weight"], [None]]))
    with pytest.raises(BlockShapeError):
        read_predictors(Block.from_rows([]))
