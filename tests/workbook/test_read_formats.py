"""Number formats that show dates and times, as ISO/IEC 29500-1 (18.8.30, 18.8.31) describes codes."""

from __future__ import annotations

import io

import openpyxl
import pytest
import xlsxwriter
from sheet_xml import cells_of, kinds

from sheetfuncs.workbook.read_formats import is_date_code

DATES = [
    "yyyy-mm-dd",
    "d/m/yy",
    "DD.MM.YYYY",
    "h:mm",
    "[h]:mm:ss",
    "[mm]:ss.0",
    "mmm\\ yy",
    '"on" d mmmm',
    "[$-409]d-mmm;@",
    "[Red]yyyy",
    "[$-F800]dddd\\,\\ mmmm\\ dd\\,\\ yyyy",
    "mm:ss.0",
    "h AM/PM",
    "_-yyyy",
    "[<40000]0;yyyy-mm-dd",
]
NUMBERS = [
    "General",
    "0.00",
    "#,##0",
    "0%",
    '0 "days"',
    "0.0\\ \\m",
    "[Red]0.00",
    "[$€-407] #,##0",
    "0.00E+00",
    "@",
    "?/?",
    '"yyyy"',
    "[<=100]0;[>100]0.0",
    "_(* #,##0_);_(* (#,##0)",
    "0_d",
    "*s0",
    "",
    "[$kms-409]0",
    "##0.0E-0",
    '"day',
]


@pytest.mark.parametrize("code", DATES)
def test_dates_and_times(code):
    assert is_date_code(code)


@pytest.mark.parametrize("code", NUMBERS)
def test_numbers(code):
    assert not is_date_code(code)


def test_built_in_formats_as_another_library_reads_them():
    """openpyxl knows its own table of the built-in formats; 27-36 and 50-58 are East Asian dates (18.8.30)."""
    data = io.BytesIO()
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = "Data"
    for number, code in sorted(openpyxl.styles.numbers.BUILTIN_FORMATS.items()):
        sheet.append([number, 1.25])
        sheet.cell(sheet.max_row, 2).number_format = code
    book.save(data)
    found = [row[1] == "DATE" for row in kinds(cells_of(data.getvalue()).block)]
    data.seek(0)
    again = openpyxl.load_workbook(data)["Data"]
    assert found == [row[1].is_date for row in again.iter_rows()]
    assert sum(found) > 10


def test_every_built_in_number():
    data = io.BytesIO()
    with xlsxwriter.Workbook(data) as book:
        sheet = book.add_worksheet("Data")
        for number in range(1, 60):
            sheet.write_number(number - 1, 0, 1.25, book.add_format({"num_format": number}))
    found = {number for number, row in enumerate(kinds(cells_of(data.getvalue()).block), 1) if row == ["DATE"]}
    assert found == {*range(14, 23), *range(27, 37), *range(45, 48), *range(50, 59)}
