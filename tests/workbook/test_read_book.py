"""A workbook opened for reading: its sheets, names, tables, and its cells as other libraries read them."""

from __future__ import annotations

import datetime
import io
import subprocess
from functools import cache
from pathlib import Path

import openpyxl
import pytest
import python_calamine
import xlsxwriter
from sheet_xml import assert_same, book_with, cells_of, kinds, opened_with, values
from workbook_build import opened
from workbook_hosts import HOSTS

from sheetfuncs.cells.address import Area, parse_area
from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.cells.serial_dates import date_of_serial
from sheetfuncs.errors import SheetNameError, WorkbookFormatError
from sheetfuncs.workbook.read import Table, open_book

TEMPLATES = Path(__file__).parents[2] / "templates"


@cache
def mixed() -> bytes:
    """Every kind of cell, hidden rows, a filter, in a book that starts counting days in 1904."""
    data = io.BytesIO()
    with xlsxwriter.Workbook(data, {"date_1904": True}) as book:
        sheet = book.add_worksheet("Data")
        date = book.add_format({"num_format": "yyyy-mm-dd hh:mm"})
        sheet.write_row(0, 0, ["Day", "Litres", "Rush", "Site", "Note", "Sum"])
        for row in range(1, 40):
            sheet.write_datetime(row, 0, datetime.datetime(2024, 1, 1, 6, 30) + datetime.timedelta(days=row), date)
            sheet.write_number(row, 1, 12.1 * row / 7)
            sheet.write_boolean(row, 2, row % 3 == 0)
            sheet.write_string(row, 3, ["north", "söuth & co", " "][row % 3])
            sheet.write_rich_string(row, 4, "a", book.add_format({"bold": True}), f"b{row}", "c")
            sheet.write_formula(row, 5, f"=B{row + 1}*2", None, 24.2 * row / 7)
        sheet.write_formula(4, 1, "=1/0", None, "#DIV/0!")
        sheet.write_formula(5, 1, '=""', None, "")
        sheet.write_blank(6, 1, None, date)
        sheet.autofilter(0, 0, 39, 5)
        sheet.filter_column("C", "x == TRUE")
        for row in (3, 7, 8):
            sheet.set_row(row, None, None, {"hidden": True})
    return data.getvalue()


def as_openpyxl_says(value: object, block: Block, row: int, column: int) -> object:
    """openpyxl's value in the terms of Block.value: dates as they are, whole numbers as floats, "" as None."""
    if isinstance(value, datetime.time):
        return datetime.timedelta(hours=value.hour, minutes=value.minute, seconds=value.second).total_seconds() / 86_400
    if isinstance(value, bool) or value is None:
        return value
    return float(value) if isinstance(value, int | float) else value or None


def compare_with_openpyxl(data: bytes, sheet: str) -> int:
    """Compare every cell of a sheet; returns how many are filled."""
    theirs = opened(data, data_only=True)[sheet]
    with open_book(io.BytesIO(data)) as book:
        block = book.read_sheet(sheet).block
    count = 0
    for row in range(max(block.row_count, theirs.max_row)):
        for column in range(max(block.column_count, theirs.max_column)):
            inside = row < block.row_count and column < block.column_count
            ours = block.value(row, column) if inside else None
            other = as_openpyxl_says(theirs.cell(row + 1, column + 1).value, block, row, column)
            if isinstance(other, datetime.datetime):
                assert block.kinds[row, column] == Kind.DATE
                ours = date_of_serial(ours, block.date1904)
                assert abs((ours - other).total_seconds()) <= 1
                count += 1
                continue
            assert ours == other, (row, column)
            assert type(ours) is type(other)
            count += ours is not None
    for row in range(block.row_count):
        assert block.hidden[row] == bool(theirs.row_dimensions[row + 1].hidden)
    return count


ODD = "by hand: odd spelling"


@pytest.mark.parametrize("name", [name for name in HOSTS if name != ODD])
def test_differently_built_books_read_as_openpyxl_reads_them(name):
    assert compare_with_openpyxl(HOSTS[name](), "Data") >= 3


def test_a_book_that_openpyxl_cannot_read_reads_as_its_ordinary_spelling():
    assert_same(cells_of(HOSTS[ODD]()), cells_of(HOSTS["by hand: bare"]()))


@pytest.mark.parametrize("path", sorted(TEMPLATES.glob("*.xlsx")), ids=lambda path: path.stem)
def test_demonstration_books_read_as_openpyxl_reads_them(path):
    data = path.read_bytes()
    with open_book(path) as book:
        for sheet in book.sheets:
            assert compare_with_openpyxl(data, sheet.name) > 5


def test_every_kind_of_cell_as_openpyxl_reads_it():
    assert compare_with_openpyxl(mixed(), "Data") == 6 * 40 - 2
    block = cells_of(mixed()).block
    assert block.date1904
    assert {kind for row in kinds(block) for kind in row} == {kind.name for kind in Kind}
    assert block.hidden.nonzero()[0].tolist() == [3, 7, 8]


def test_numbers_and_texts_as_calamine_reads_them():
    """calamine gives '' for errors and for formulas that give ""; everything else must agree."""
    block = cells_of(mixed()).block
    theirs = python_calamine.CalamineWorkbook.from_filelike(io.BytesIO(mixed())).get_sheet_by_index(0).to_python()
    assert len(theirs) == block.row_count
    for row, cells in enumerate(theirs):
        for column, other in enumerate(cells):
            kind, ours = block.kinds[row, column], block.value(row, column)
            if kind in (Kind.BLANK, Kind.ERROR):
                assert other == ""
            elif kind == Kind.DATE:
                assert abs((date_of_serial(ours, True) - other).total_seconds()) <= 1
            else:
                assert ours == other


@pytest.mark.libreoffice
def test_a_book_that_libreoffice_saved_again(tmp_path):
    source = tmp_path / "mixed.xlsx"
    source.write_bytes(mixed())
    profile = f"-env:UserInstallation=file://{tmp_path}/profile"
    command = ["soffice", profile, "--headless", "--convert-to", "xlsx:Calc MS Excel 2007 XML", "--outdir",
               str(tmp_path / "out"), str(source)]  # fmt: skip
    subprocess.run(command, check=True, capture_output=True, timeout=240)
    data = (tmp_path / "out" / "mixed.xlsx").read_bytes()
    assert compare_with_openpyxl(data, "Data") > 200
    before, after = cells_of(mixed()).block, cells_of(data).block
    assert after.date1904
    assert kinds(after) == kinds(before)
    for row in range(before.row_count):
        for column in range(before.column_count):
            one, other = before.value(row, column), after.value(row, column)
            assert other == (pytest.approx(one, rel=1e-14) if isinstance(one, float) else one)


def test_a_book_that_was_never_calculated():
    data = io.BytesIO()
    book = openpyxl.Workbook()
    book.active.title = "Data"
    for row in range(1, 13):
        book.active.append([row, f"=A{row}*2"])
    book.save(data)
    cells = cells_of(data.getvalue())
    assert cells.unstored.tolist() == [0, 12]
    assert kinds(cells.block)[0] == ["NUMBER", "BLANK"]


def test_reading_after_the_whole_sheet_was_read_gives_the_same():
    for text in ("Data!B2:C9", "Data!A:B", "Data!F40:F40", "Data!F40:H44"):
        area = parse_area(text)
        with open_book(io.BytesIO(mixed())) as book:
            fresh = book.read_cells(area)
            book.read_sheet("data")
            kept = book.read_cells(area)
        assert values(fresh.block) == values(kept.block)
        assert fresh.block.hidden.tolist() == kept.block.hidden.tolist()
        assert (fresh.block.first_row, fresh.block.first_column) == (kept.block.first_row, kept.block.first_column)
        assert fresh.formulas.tolist() == kept.formulas.tolist()


def several_sheets() -> bytes:
    data = io.BytesIO()
    with xlsxwriter.Workbook(data) as book:
        first = book.add_worksheet("Notes")
        book.add_chartsheet("Picture")
        jobs = book.add_worksheet("Job's list")
        hidden = book.add_worksheet("Lists")
        first.write(0, 0, "see Job's list")
        jobs.add_table(2, 1, 6, 3, {"name": "Jobs", "total_row": True, "columns": [
            {"header": "Cost"}, {"header": "Weight"}, {"header": "Holes"}]})  # fmt: skip
        jobs.add_table(10, 1, 12, 2, {"name": "Bare", "header_row": False})
        jobs.write(3, 1, 5)
        hidden.hide()
        jobs.activate()
        book.define_name("study", "='Job''s list'!$B$3:$D$6")
        book.define_name("'Job's list'!own", "='Job''s list'!$B$3")
    return data.getvalue()


def test_sheets_names_and_tables():
    with open_book(io.BytesIO(several_sheets())) as book:
        assert [(sheet.name, sheet.state) for sheet in book.sheets] == [
            ("Notes", "visible"), ("Job's list", "visible"), ("Lists", "hidden")
        ]  # fmt: skip
        assert book.active_sheet == "Job's list"
        assert {(name.name, name.formula, name.sheet) for name in book.defined_names} == {
            ("study", "'Job''s list'!$B$3:$D$6", None), ("own", "'Job''s list'!$B$3", "Job's list")
        }  # fmt: skip
        assert book.local_name("job's LIST", "Own") == "'Job''s list'!$B$3"
        assert book.local_name("Notes", "own") is None
        assert book.tables == (
            Table("Jobs", Area("Job's list", 3, 2, 7, 4), 1, 1, ("Cost", "Weight", "Holes")),
            Table("Bare", Area("Job's list", 11, 2, 13, 3), 0, 0, ("Column1", "Column2")),
        )
        assert book.tables[0].data_and_header == Area("Job's list", 3, 2, 6, 4)
        assert book.used_area("job's list") == Area("Job's list", 1, 1, 4, 4)
        assert book.used_area("Lists") is None


def test_a_sheet_that_is_not_there_is_named_with_those_that_are():
    with open_book(io.BytesIO(several_sheets())) as book, pytest.raises(SheetNameError) as refused:
        book.read(parse_area("'Jobs list'!A1"))
    assert "“Jobs list”" in str(refused.value)
    assert "did you mean “Job's list”?" in str(refused.value)
    assert "“Notes”, “Job's list”, “Lists”" in str(refused.value)


def test_a_book_of_chart_sheets_only_is_refused():
    data = io.BytesIO()
    with xlsxwriter.Workbook(data) as book:
        chart = book.add_chart({"type": "line"})
        chart.add_series({"values": "={1,2}"})
        book.add_chartsheet("Only").set_chart(chart)
    with pytest.raises(WorkbookFormatError, match="no worksheet"):
        open_book(io.BytesIO(data.getvalue()))


def test_a_path_is_closed_again_and_a_file_stays_open(tmp_path):
    path = tmp_path / "one.xlsx"
    path.write_bytes(book_with('<row r="1"><c r="A1"><v>1</v></c></row>'))
    with open_book(path) as book:
        assert values(book.read(parse_area("A1"))) == [[1.0]]
        assert book.label == "one.xlsx"
    path.unlink()
    file = io.BytesIO(book_with(""))
    open_book(file).close()
    assert not file.closed


def test_a_book_without_styles_and_strings():
    with opened_with('<row r="1"><c r="A1" s="1"><v>1</v></c></row>', strings=None, styles=None) as book:
        assert kinds(book.read(parse_area("A1"))) == [["NUMBER"]]
