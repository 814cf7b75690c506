"""What people type, and what it means in a workbook: areas, tables, names, the block around a cell, or nothing."""

from __future__ import annotations

import io
from collections.abc import Callable

import numpy as np
import pytest
import xlsxwriter
from hypothesis import given
from hypothesis import strategies as st
from sheet_xml import book_with

from sheetfuncs.cells.address import Area, format_area, parse_area
from sheetfuncs.cells.block import Block
from sheetfuncs.errors import AddressError, SheetfuncsError, SheetNameError
from sheetfuncs.workbook.read import Book, open_book
from sheetfuncs.workbook.regions import block_around, first_block
from sheetfuncs.workbook.selection import find_selection, resolve, resolve_reference

HEADER = ["Cost", "Weight", "Holes"]
ROWS = [HEADER, *([float(10 + 2 * i), float(i), float(i % 4)] for i in range(8))]


def book(fill: Callable[[xlsxwriter.Workbook], None]) -> Book:
    data = io.BytesIO()
    with xlsxwriter.Workbook(data) as made:
        fill(made)
    return open_book(io.BytesIO(data.getvalue()))


def put(sheet, row: int, column: int, rows: list[list[object]] = ROWS) -> None:
    for place, cells in enumerate(rows):
        sheet.write_row(row + place, column, cells)


def jobs(made: xlsxwriter.Workbook) -> None:
    """A sheet in front with plain data, one with a table, names of several sorts."""
    first, list_, other = made.add_worksheet("Jobs"), made.add_worksheet("Job list"), made.add_worksheet("Empty")
    put(first, 2, 1)
    first.write(0, 0, "Parts of June")
    list_.add_table(1, 1, 9, 3, {"name": "Parts", "total_row": True, "data": ROWS[1:8], "columns": [
        {"header": "Cost [EUR]"}, {"header": "Weight"}, {"header": "Holes", "total_function": "sum"}]})  # fmt: skip
    other.write_blank(3, 3, None, made.add_format({"bold": True}))
    made.define_name("Study", "=Jobs!$B$3:$D$11")
    made.define_name("'Job list'!Study", "='Job list'!$B$2:$C$9")
    made.define_name("Own", "='Job list'!$C$2:$D$9")
    made.define_name("Moving", "=OFFSET(Jobs!$B$3,0,0,9,3)")
    made.define_name("Rate", "=0.19")
    made.define_name("Lost", "=#REF!")
    made.define_name("Columns", "=Jobs!$B:$D")
    made.define_name("Apart", "=Jobs!$B$3:$B$11,Jobs!$D$3:$D$11")


@pytest.fixture
def opened():
    with book(jobs) as found:
        yield found


@pytest.mark.parametrize(
    ("text", "means"),
    [
        ("Jobs!B3:D11", "Jobs!B3:D11"), ("jobs!b3:d11", "Jobs!B3:D11"), ("B3:D11", "Jobs!B3:D11"),
        ("Job list!B2:C5", "'Job list'!B2:C5"), ("Jobs!B:D", "Jobs!B:D"), ("Jobs!C4", "Jobs!B3:D11"),
        ("Jobs!E12", "Jobs!B3:D11"), ("Parts", "'Job list'!B2:D9"), ("=parts", "'Job list'!B2:D9"),
        ("Parts[Weight]", "'Job list'!C2:C9"), ("Parts[[Weight]:[Holes]]", "'Job list'!C2:D9"),
        ("Parts[[Holes] : [Weight]]", "'Job list'!C2:D9"), ("Parts[Cost '[EUR']]", "'Job list'!B2:B9"),
        ("Parts[#All]", "'Job list'!B2:D9"), ("Parts[#Data]", "'Job list'!B3:D9"),
        ("Parts[[#Data],[Weight]]", "'Job list'!C3:C9"), ("Job list!C4", "'Job list'!B2:D9"),
        ("study", "Jobs!B3:D11"), ("Own", "'Job list'!C2:D9"), ("Columns", "Jobs!B:D"),
    ],
)  # fmt: skip
def test_what_is_typed_means_an_area(opened, text, means):
    assert format_area(resolve(opened, text)) == means


@pytest.mark.parametrize(
    ("text", "means"),
    [("Jobs!C4", "Jobs!C4"), ("$C$4", "Jobs!C4"), ("Parts", "'Job list'!B3:D9"), ("Parts[Weight]", "'Job list'!C3:C9"),
     ("Parts[#All]", "'Job list'!B3:D9"), ("Study", "Jobs!B3:D11"), ("Jobs!B:B", "Jobs!B:B")],
)  # fmt: skip
def test_a_reference_in_a_formula_means_just_its_cells(opened, text, means):
    assert format_area(resolve_reference(opened, text)) == means


@pytest.mark.parametrize(
    ("text", "kind", "said"),
    [
        ("Jops!B3:D11", SheetNameError, "did you mean “Jobs”?"), ("Part", AddressError, "did you mean “Parts”?"),
        ("Parts[Weigt]", AddressError, "did you mean “Weight”?"),
        ("Nothing", AddressError, "it has Parts, Apart, Columns"),
        ("Parts[#Totals]", AddressError, "no rows of data"), ("Parts[[Weight]x]", AddressError, "not understood"),
        ("Part[Weight]", AddressError, "did you mean “Parts”?"), ("Moving", AddressError, r"is the formula “OFFSET\("),
        ("Rate", AddressError, "not a plain range"), ("Lost", AddressError, "is an error"),
        ("Jobs", AddressError, "is a sheet"),
        ("Apart", AddressError, "The name Apart cannot be used: .*more than one area"),
        ("3:5", AddressError, "whole rows"),
        ("Empty!D4", AddressError, "is empty and stands alone"), ("Jobs!H20", AddressError, "stands alone"),
        ("Empty!B2", AddressError, "stands alone"),
    ],
)  # fmt: skip
def test_what_cannot_be_meant_is_said(opened, text, kind, said):
    with pytest.raises(kind, match=said) as refused:
        find_selection(opened, text)
    assert str(refused.value).endswith(".")


@given(st.text(max_size=12) | st.text(alphabet="Parts[]#:,'AllWeight!B3 ", max_size=20))
def test_any_text_means_something_or_is_refused(text):
    with book(jobs) as opened:
        for find in (resolve, resolve_reference):
            try:
                area = find(opened, text)
            except SheetfuncsError as refusal:
                message = str(refusal)
                assert message.endswith(".")
            else:
                assert opened.sheet(area.sheet).name == area.sheet


def test_a_single_cell_means_the_block_and_says_so(opened):
    found = find_selection(opened, "C4")
    assert found.remarks == ("Jobs!C4 is one cell: the block around it, B3:D11, is used.",)
    assert "lies in the table Parts" in find_selection(opened, "Job list!C4").remarks[0]


def test_nothing_means_the_first_block_with_titles_skipped(opened):
    found = find_selection(opened)
    assert found.area == Area("Jobs", 3, 2, 11, 4)
    assert found.remarks == (
        "No range was given: the block B3:D11 on sheet “Jobs” is used.",
        "What stands at A1 (“Parts of June”) was skipped, as a title or note.",
    )


def test_nothing_means_the_table_of_the_active_sheet():
    def fill(made):
        jobs(made)
        made.get_worksheet_by_name("Job list").activate()
        made.get_worksheet_by_name("Job list").write(0, 1, "All parts")

    with book(fill) as opened:
        found = find_selection(opened, " ")
    assert found.area == Area("Job list", 2, 2, 9, 4)
    assert found.remarks == ("No range was given: the table Parts on sheet “Job list” (B2:D9) is used.",)


def test_nothing_on_a_sheet_without_data():
    def fill(made):
        jobs(made)
        made.get_worksheet_by_name("Empty").activate()

    with book(fill) as opened, pytest.raises(AddressError, match=r"Empty.*such as “Jobs!B3:F64”"):
        find_selection(opened)


def first(cells: dict[str, object]) -> tuple[str, list[str]] | None:
    """The first block of a sheet with these cells ("B3": one value; "B3": rows), and what was said."""
    places = {}
    for name, value in cells.items():
        area = parse_area(name)
        for down, row in enumerate(value if isinstance(value, list) else [[value]]):
            for right, cell in enumerate(row):
                places[area.first_row + down, area.first_column + right] = cell
    height, width = (max(place[axis] for place in places) for axis in (0, 1))
    block = Block.from_rows(
        [[places.get((r, c)) for c in range(1, width + 1)] for r in range(1, height + 1)], sheet="S"
    )
    found = first_block(block)
    return None if found is None else (format_area(found[0]), found[1])


def test_titles_right_above_the_data_are_taken_off():
    assert first({"A1": "Parts of June", "A2": ROWS}) == (
        "A2:C10",
        ["A1 (“Parts of June”) was taken for a title above the data."],
    )
    assert first({"B1": "Parts", "A2": "of June", "A3": ROWS})[0] == "A3:C11"
    assert first({"A1": "Parts", "B2": ROWS})[0] == "B2:D10"


def test_a_header_is_no_title():
    assert first({"A1": ROWS}) == ("A1:C9", [])
    assert first({"A1": [["Cost"], *([row[0]] for row in ROWS[1:])]}) == ("A1:A9", [])
    assert first({"A1": [["Cost", None, None], *ROWS[1:]]})[0] == "A2:C9"


def test_small_blocks_of_settings_are_passed_over():
    settings = [["Rate", 0.19], ["Hours", 8.0], ["Shifts", 2.0]]
    area, remarks = first({"A1": settings, "A6": ROWS})
    assert area == "A6:C14"
    assert remarks == ["What stands at A1 (“Rate”) was skipped, as a title or note."]
    assert first({"A1": settings}) == ("A1:B3", [])


def test_many_notes_are_counted():
    notes = {f"{letter}1": "note" for letter in "ACEGI"}
    said = "What stands at A1 (“note”), C1 (“note”), E1 (“note”) and 2 more was skipped, as a title or note."
    assert first(notes | {"B4": ROWS})[1] == [said]
    assert first({"A1": "only", "C3": "words"}) is None


def test_gaps_inside_a_block_do_not_end_it():
    rows = [list(row) for row in ROWS]
    rows[3][1] = None
    rows[5] = [None, None, 2.0]
    assert first({"B2": rows})[0] == "B2:D10"
    assert first({"B2": ROWS, "B12": ROWS})[0] == "B2:D10"


shapes = st.tuples(st.integers(1, 8), st.integers(1, 6)).flatmap(
    lambda shape: st.lists(st.booleans(), min_size=shape[0] * shape[1], max_size=shape[0] * shape[1]).map(
        lambda cells: np.array(cells).reshape(shape)
    )
)


@given(shapes, st.integers(1, 9), st.integers(1, 7))
def test_the_block_around_a_cell_is_bounded_by_blanks(filled, row, column):
    block = Block.from_rows([[1.0 if cell else None for cell in line] for line in filled.tolist()])
    found = block_around(block, row, column)
    padded = np.pad(filled, ((1, 3), (1, 3)))  # so that worksheet cell (r, c) is padded[r, c]
    if found is None:
        assert not padded[max(row - 1, 0) : row + 2, max(column - 1, 0) : column + 2].any()
        return
    top, bottom, left, right = found.first_row, found.last_row, found.first_column, found.last_column
    inside = padded[top : bottom + 1, left : right + 1]
    assert inside[0].any()
    assert inside[-1].any()
    assert inside[:, 0].any()
    assert inside[:, -1].any()
    frame = padded[top - 1 : bottom + 2, left - 1 : right + 2].copy()
    frame[1:-1, 1:-1] = False
    if padded[row, column]:
        assert not frame.any()
        assert top <= row <= bottom
        assert left <= column <= right


def test_an_empty_sheet_has_no_block():
    with open_book(io.BytesIO(book_with(""))) as opened, pytest.raises(AddressError, match="has no block"):
        find_selection(opened)
