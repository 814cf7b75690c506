"""Which columns of a range become the response, the predictors and the order."""

from __future__ import annotations

import datetime
import io
from collections.abc import Iterator
from contextlib import contextmanager

import openpyxl
import pytest
import xlsxwriter

from sheetfuncs.cells.block import Kind
from sheetfuncs.cells.observations import read_observations
from sheetfuncs.errors import ArgumentError, BlockShapeError, CellKindError, TooFewRowsError
from sheetfuncs.workbook.read import Book, open_book
from sheetfuncs.workbook.selection import find_selection
from sheetfuncs.workbook.selection_columns import SelectedColumns, read_selection

START = datetime.datetime(2024, 3, 1)
# Invented: a tank's draw by hours open, valve and crew.
HEADER = ["Day", "Litres", "Hours", "Valve", "Crew"]
ROWS = [
    HEADER,
    *(
        [START + datetime.timedelta(days=day), 5.0 + 2 * day, 1.0 + day % 3, float(day % 4), ["early", "late"][day % 2]]
        for day in range(9)
    ),
]


@contextmanager
def sheet(rows: list[list[object]], at: tuple[int, int] = (0, 0), other: tuple = ()) -> Iterator[Book]:
    data = io.BytesIO()
    with xlsxwriter.Workbook(data, {"default_date_format": "yyyy-mm-dd"}) as made:
        work = made.add_worksheet("Tank")
        for row, cells in enumerate(rows, at[0]):
            for column, cell in enumerate(cells, at[1]):
                work.write_formula(row, column, *cell) if isinstance(cell, tuple) else work.write(row, column, cell)
        for row, column, cell in other:
            work.write(row, column, cell)
    with open_book(io.BytesIO(data.getvalue())) as book:
        yield book


def select(rows: list[list[object]], text: str | None = None, at=(0, 0), other=(), **named) -> SelectedColumns:
    with sheet(rows, at, other) as book:
        return read_selection(book, find_selection(book, text), **named)


def names(found: SelectedColumns) -> tuple[str, list[str], str | None]:
    read = read_observations(found.response, found.predictors, found.order)
    return read.response.name, [column.name for column in read.predictors], read.order and read.order.name


def without(*columns: int) -> list[list[object]]:
    return [[cell for place, cell in enumerate(row) if place not in columns] for row in ROWS]


def test_the_first_column_is_the_response_and_all_others_predictors():
    found = select(without(0), "Tank!A1:D10")
    assert names(found) == ("Litres", ["Hours", "Valve", "Crew"], None)
    assert found.remarks == ()
    assert str(found.area) == "Tank!A1:D10"


def test_a_single_date_column_becomes_the_order_and_is_said():
    found = select(ROWS, "Tank!A1:E10")
    assert names(found) == ("Litres", ["Hours", "Valve", "Crew"], "Day")
    assert found.remarks == (
        "Column A (Day) holds dates and was taken as the time order of the rows; to use it as a predictor, say so "
        "under Settings on the sheet, or with --date-predictor.",
        "Column B (Litres) is the response, the first column left.",
    )


@pytest.mark.parametrize("named", [
    {"response": "Litres", "predictors": ["Valve", "Hours"], "order": "Day"},
    {"response": "b", "predictors": ["D", "C"]},
    {"response": " litres ", "predictors": ["VALVE", "hours"], "order": "A"},
])  # fmt: skip
def test_columns_are_named_by_header_or_letter(named):
    assert names(select(ROWS, "Tank!A1:E10", **named)) == ("Litres", ["Valve", "Hours"], "Day")


def test_letters_are_those_of_the_sheet():
    found = select(ROWS, "Tank!C4:G13", at=(3, 2), response="F")
    assert names(found) == ("Valve", ["Litres", "Hours", "Crew"], "Day")
    assert [found.predictors.worksheet_column(index) for index in range(3)] == [4, 5, 7]


def test_a_date_column_that_is_named_stays_what_it_is_named():
    found = select(ROWS, "Tank!A1:E10", date_predictors=["Day"])
    assert names(found) == ("Litres", ["Day", "Hours", "Valve", "Crew"], None)
    assert names(select(ROWS, "Tank!A1:E10", response="Litres", predictors=["Day", "Hours"])) == (
        "Litres", ["Day", "Hours"], None
    )  # fmt: skip
    assert names(select(ROWS, "Tank!A1:E10", order="Hours", predictors=["Valve"])) == ("Day", ["Valve"], "Hours")


def test_two_date_columns_are_left_to_the_user():
    rows = [[*row, row[0]] for row in ROWS]
    rows[0][-1] = "Paid"
    found = select(rows, "Tank!A1:F10", response="Litres")
    assert found.order is None
    with pytest.raises(CellKindError, match="--order Day"):
        read_observations(found.response, found.predictors, dates="check")


def test_times_of_day_are_no_order():
    rows = [[(datetime.time(6, 30) if place else "Begun") if column == 0 else cell for column, cell in enumerate(row)]
            for place, row in enumerate(ROWS)]  # fmt: skip
    with sheet(rows) as book:
        found = read_selection(book, find_selection(book, "Tank!A1:E10"), response="Litres")
    assert found.predictors.kinds[1, 0] == Kind.DATE
    assert found.order is None


def test_columns_without_values_are_skipped_and_said():
    rows = [[row[1], None, row[2], "Remarks" if place == 0 else None, row[3]] for place, row in enumerate(ROWS)]
    found = select(rows, "Tank!A1:I10")
    assert names(found) == ("Litres", ["Hours", "Valve"], None)
    assert found.remarks == ("Columns B, D, F to I have no values and were skipped.",)
    assert select(rows, "Tank!A1:C10").remarks == ("Column B has no values and was skipped.",)
    named = select(rows, "Tank!A1:I10", predictors=["Remarks"])
    with pytest.raises(TooFewRowsError, match="blank in column D \\(Remarks\\)"):
        read_observations(named.response, named.predictors)


def test_whole_columns_begin_below_their_title():
    found = select(ROWS, "Tank!B:E", at=(2, 0), other=[(0, 1, "Draws of March")])
    assert names(found) == ("Litres", ["Hours", "Valve", "Crew"], None)
    assert found.remarks == ("What stands above row 3 was skipped, as a title or note.",)
    assert found.response.first_row == 3
    assert str(found.area) == "Tank!B:E"


def test_what_was_decided_about_the_range_comes_first():
    assert select(ROWS, other=[(13, 0, "Sources: none")]).remarks[0].startswith("No range was given: the block A1:E10")


@pytest.mark.parametrize(("named", "said"), [
    ({"response": "Liters"}, "did you mean “Litres”?"), ({"response": "H"}, "is no column of Tank!A1:E10"),
    ({"predictors": ["Hours", "Hourz"]}, "did you mean “Hours”?"), ({"order": "Time"}, "The order “Time”"),
    ({"date_predictors": ["Dai"]}, "did you mean “Day”?"),
    ({"response": "Hours", "predictors": ["C"]}, r"Column C \(Hours\) is named as response and as predictor"),
    ({"predictors": ["Hours", "C"]}, "named twice"),
])  # fmt: skip
def test_names_that_are_not_there_or_used_twice(named, said):
    with pytest.raises(ArgumentError, match=said) as refused:
        select(ROWS, "Tank!A1:E10", **named)
    assert str(refused.value).endswith(".")


def test_a_header_that_stands_twice_is_named_by_letter():
    rows = [["Litres", "Hours", "Hours"], *([row[1], row[2], row[3]] for row in ROWS[1:])]
    with pytest.raises(ArgumentError, match="heads the columns B and C; name the predictor by its letter"):
        select(rows, "Tank!A1:C10", predictors=["Hours"])
    assert names(select(rows, "Tank!A1:C10", predictors=["C"]))[1] == ["Hours"]


def test_ranges_too_small():
    with pytest.raises(
        BlockShapeError, match=r"Tank!B1:B10 leaves no predictor beside the response, column B \(Litres\)"
    ):
        select(ROWS, "Tank!B1:B10")
    with pytest.raises(BlockShapeError, match="Tank!K1:L10 is empty"):
        select(ROWS, "Tank!K1:L10")
    with pytest.raises(BlockShapeError, match="No column is left for the response"):
        select(ROWS, "Tank!A1:A10")


def test_a_list_of_names_is_refused_with_the_way_out():
    rows = [[*row, f"Job {place}" if place else "Name"] for place, row in enumerate(ROWS)]
    found = select(rows, "Tank!A1:F10")
    with pytest.raises(CellKindError, match=r"--predictors A,B"):
        read_observations(found.response, found.predictors, found.order, dates="check")


def test_formulas_that_were_never_calculated_are_said():
    data = io.BytesIO()
    made = openpyxl.Workbook()
    made.active.title = "Tank"
    made.active.append(["Litres", "Hours", "Twice"])
    for row in range(2, 9):
        made.active.append([row * 1.5, row % 3, f"=B{row}*2" if row < 8 else 3])
    made.save(data)
    with open_book(data) as book:
        found = read_selection(book, find_selection(book, "Tank!A1:C8"))
        plain = read_selection(book, find_selection(book, "Tank!A1:C8"), predictors=["Hours"])
    assert found.remarks == (
        "6 formula cells of column C (Twice) hold no stored value and count as blank: open and save the workbook in a "
        "spreadsheet program first.",
    )
    assert plain.remarks == ()


def test_formulas_that_all_store_the_zero_of_a_place_holder_are_said():
    rows = [
        ["Litres", "Hours", "Twice"],
        *([row[1], row[2], (f"=B{place}*2",)] for place, row in enumerate(ROWS[1:], 2)),
    ]
    assert "all store 0 and may never have been calculated" in select(rows, "Tank!A1:C10").remarks[0]
    stored = [[*row[:2], (*row[2], None, 2 * row[1]) if place else row[2]] for place, row in enumerate(rows)]
    assert select(stored, "Tank!A1:C10").remarks == ()
