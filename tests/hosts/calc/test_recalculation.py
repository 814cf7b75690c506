"""Values follow the cells: edits, formulas among the data, whole columns, two documents, files saved and loaded."""

from __future__ import annotations

import math
import random
import shutil

import pytest
from office import fill, type_formula

import sheetfuncs

pytestmark = pytest.mark.libreoffice

EDITS = 1_000


def durbin_watson(rows: list[list[float]]) -> float:
    return sheetfuncs.evaluate("FIT_DURBIN_WATSON", [row[:1] for row in rows], [row[1:] for row in rows])


def invented(count: int, seed: int) -> list[list[float]]:
    draw = random.Random(seed)
    return [[draw.gauss(5, 2), draw.gauss(0, 1), draw.uniform(1, 4)] for _ in range(count)]


def test_an_edit_recalculates(document):
    sheet, rows = document.Sheets.getByIndex(0), invented(12, 1)
    fill(sheet, "A1:C12", rows)
    cell = type_formula(sheet, "E1", "=FIT_DURBIN_WATSON(A1:A12;B1:C12)")
    assert cell.Value == pytest.approx(durbin_watson(rows), rel=1e-12)
    rows[4][1] = 3.25
    sheet.getCellByPosition(1, 4).Value = 3.25
    assert cell.Value == pytest.approx(durbin_watson(rows), rel=1e-12)
    sheet.getCellByPosition(1, 4).String = "a word"
    assert cell.getError() == 519
    sheet.getCellByPosition(1, 4).Value = 3.25
    assert cell.Value == pytest.approx(durbin_watson(rows), rel=1e-12)


def test_random_edits_never_show_an_old_value(document):
    """Data cells, cells that a formula in the range takes its value from, and several functions on one range."""
    sheet, draw = document.Sheets.getByIndex(0), random.Random(2)
    rows = invented(15, 2)
    fill(sheet, "A1:C15", rows)
    fill(sheet, "H1:H15", [[row[2]] for row in rows])
    fill(sheet, "C1:C15", [[f"=H{row}"] for row in range(1, 16)])  # the third column is calculated
    statistic = type_formula(sheet, "E1", "=FIT_DURBIN_WATSON(A1:A15;B1:C15)")
    residuals = type_formula(sheet, "F1:F15", "=FIT_RESIDUALS(A1:A15;B1:C15)")
    after = type_formula(sheet, "E2", "=E1+0")
    for edit in range(EDITS):
        row, column, value = draw.randrange(15), draw.randrange(3), draw.gauss(2, 3)
        rows[row][column] = value
        sheet.getCellByPosition(7 if column == 2 else column, row).Value = value
        if edit % 3 == 0:  # in between nobody looks, so that several edits come between two values
            continue
        assert after.Value == pytest.approx(durbin_watson(rows), rel=1e-12), edit
        if edit % 10 == 1:
            expected = sheetfuncs.evaluate("FIT_RESIDUALS", [one[:1] for one in rows], [one[1:] for one in rows])
            found = [list(one) for one in residuals.getDataArray()]
            assert [one[0] for one in found] == pytest.approx([one[0] for one in expected], rel=1e-12, abs=1e-12), edit
    assert statistic.Value == after.Value


def test_edits_in_one_macro_never_show_an_old_value(calc, document):
    """Edits and values within one turn of the program's main loop: a Basic macro gives it no time in between."""
    sheet, rows = document.Sheets.getByIndex(0), invented(10, 3)
    fill(sheet, "A1:C10", rows)
    type_formula(sheet, "E1", "=FIT_DURBIN_WATSON(A1:A10;B1:C10)")
    libraries = document.BasicLibraries
    if not libraries.hasByName("Standard"):
        libraries.createLibrary("Standard")
    libraries.getByName("Standard").insertByName("Edits", (
        "Function Values(document, count)\n Dim found(count - 1)\n sheet = document.Sheets(0)\n"
        " For i = 0 To count - 1\n  sheet.getCellByPosition(1, i Mod 10).Value = 10 * Sin(i)\n"
        "  found(i) = sheet.getCellRangeByName(\"E1\").Value\n Next\n Values = found()\nEnd Function\n"
    ))
    script = document.getScriptProvider().getScript("vnd.sun.star.script:Standard.Edits.Values?language=Basic&"
                                                    "location=document")
    found, _, _ = script.invoke((document, 50), (), ())


    for i, value in enumerate(found):
        rows[i % 10][1] = 10 * math.sin(i)
        assert value == pytest.approx(durbin_watson(rows), rel=1e-10), i


def test_a_whole_column_is_cut_to_the_used_rows_also_across_sheets(calc, document):
    first = document.Sheets.getByIndex(0)
    document.Sheets.insertNewByName("Loads", 1)
    loads, rows = document.Sheets.getByName("Loads"), invented(30, 4)
    fill(first, "A1:A31", [["hours"], *[row[:1] for row in rows]])
    fill(loads, "A1:B31", [["load", "width"], *[row[1:] for row in rows]])
    fill(loads, "D1:D60", [[1.0]] * 60)  # reaches further down than the first sheet
    cell = type_formula(first, "E1", "=FIT_DURBIN_WATSON(A:A;$Loads.A:B)")
    assert cell.Value == pytest.approx(durbin_watson(rows), rel=1e-12)
    rows.append([4.0, 0.5, 2.5])
    fill(first, "A32", [[4.0]])
    fill(loads, "A32:B32", [[0.5, 2.5]])
    assert cell.Value == pytest.approx(durbin_watson(rows), rel=1e-12)


def test_many_rows(document):
    sheet, rows = document.Sheets.getByIndex(0), invented(100_000, 5)
    sheet.getCellRangeByName("A1:C100000").setDataArray(tuple(map(tuple, rows)))
    cell = type_formula(sheet, "E1", "=FIT_DURBIN_WATSON(A1:A100000;B1:C100000)")
    assert cell.Value == pytest.approx(durbin_watson(rows), rel=1e-12)
    rows[77_777][0] = 99.0
    sheet.getCellByPosition(0, 77_777).Value = 99.0
    assert cell.Value == pytest.approx(durbin_watson(rows), rel=1e-12)


def test_cells_of_every_kind_among_the_data(document):
    sheet, rows = document.Sheets.getByIndex(0), invented(14, 6)
    cells: list[list[object]] = [list(row) for row in rows]
    cells[2][0], cells[5][1], cells[8][2] = "", "=1/0", None
    cells[9][1] = "=TRUE()"
    fill(sheet, "A1:C14", cells)
    sheet.getCellRangeByName("A11:A12").NumberFormat = document.NumberFormats.getStandardFormat(
        2, document.CharLocale)  # a date counts as its number
    cell = type_formula(sheet, "E1", "=FIT_DURBIN_WATSON(A1:A14;B1:C14)")
    rows[9][1] = 1.0
    kept = [row for place, row in enumerate(rows) if place not in (2, 5, 8)]
    assert cell.Value == pytest.approx(durbin_watson(kept), rel=1e-12)
    why = type_formula(sheet, "E2", "=FIT_WHY(A1:A14;B1:C14)").String
    assert "3 of 14 rows left out" in why
    assert "#DIV/0!" in why


def test_data_that_are_themselves_our_results(document):
    """Reading a range then calls a function within the call of another."""
    sheet, rows = document.Sheets.getByIndex(0), invented(20, 7)
    fill(sheet, "A1:C20", rows)
    cell = type_formula(sheet, "H1", "=FIT_DURBIN_WATSON(G1:G20;B1:B20)")
    type_formula(sheet, "G1:G20", "=FIT_FITTED(F1:F20;C1:C20)")
    type_formula(sheet, "F1:F20", "=FIT_RESIDUALS(A1:A20;B1:B20)")
    for value in (8.0, 2.0):
        rows[3][0] = value
        sheet.getCellByPosition(0, 3).Value = value
        third = [row[2:] for row in rows]
        first = sheetfuncs.evaluate("FIT_RESIDUALS", [row[:1] for row in rows], [row[1:2] for row in rows])
        second = sheetfuncs.evaluate("FIT_FITTED", first, third)
        expected = sheetfuncs.evaluate("FIT_DURBIN_WATSON", second, [row[1:2] for row in rows])
        assert cell.Value == pytest.approx(expected, rel=1e-9)  # the data themselves agree to 1e-12
        found = [one[0] for one in sheet.getCellRangeByName("G1:G20").getDataArray()]
        assert found == pytest.approx([one[0] for one in second], rel=1e-12)


def test_data_that_depend_on_each_other_many_deep(document):
    """LibreOffice then calls a function before its data are ready, and calls again; see recalculation.py."""
    count, rows = 1_500, invented(1_500, 9)
    sheet = document.Sheets.getByIndex(0)
    fill(sheet, f"A1:B{count}", [row[:2] for row in rows])
    fill(sheet, f"C1:C{count - 1}", [[f"=C{row + 1}*0.999+B{row}"] for row in range(1, count)])  # from below
    fill(sheet, f"C{count}", [[0.0]])
    ranges = f"A1:A{count};C1:C{count}"
    first = type_formula(sheet, "E1", f"=FIT_DURBIN_WATSON({ranges})")
    same = type_formula(sheet, "E2", f"=FIT_DURBIN_WATSON({ranges})")
    other = type_formula(sheet, "E3", f"=FIT_DURBIN_WATSON({ranges};FALSE())")
    for start in (2.0, 50.0, -300.0):
        sheet.getCellRangeByName(f"C{count}").Value = start
        third = [start]
        for row in range(count - 2, -1, -1):
            third.append(third[-1] * 0.999 + rows[row][1])
        data = [[row[0], value] for row, value in zip(rows, reversed(third), strict=True)]
        response, predictor = [row[:1] for row in data], [row[1:] for row in data]
        assert first.Value == pytest.approx(durbin_watson(data), rel=1e-10)
        assert same.Value == first.Value
        expected = sheetfuncs.evaluate("FIT_DURBIN_WATSON", response, predictor, False)
        assert other.Value == pytest.approx(expected, rel=1e-10)


def test_a_formula_filled_down_many_rows(document):
    """As many equal formulas below each other as LibreOffice would share among threads."""
    sheet, rows = document.Sheets.getByIndex(0), invented(320, 8)
    fill(sheet, "A1:C320", rows)
    type_formula(sheet, "E1", "=FIT_DURBIN_WATSON(A1:A20;B1:C20)")
    from com.sun.star.sheet.FillDirection import TO_BOTTOM

    sheet.getCellRangeByName("E1:E300").fillAuto(TO_BOTTOM, 1)
    document.calculateAll()
    found = [one[0] for one in sheet.getCellRangeByName("E1:E300").getDataArray()]
    assert found == pytest.approx([durbin_watson(rows[row:row + 20]) for row in range(300)], rel=1e-12)


def test_data_that_are_deleted_or_moved(document):
    sheets = document.Sheets
    sheet, rows = sheets.getByIndex(0), invented(12, 10)
    sheets.insertNewByName("Gone", 1)
    for one in (sheet, sheets.getByName("Gone")):
        fill(one, "A1:C12", rows)
    gone = type_formula(sheet, "E1", "=FIT_DURBIN_WATSON($Gone.A1:A12;$Gone.B1:C12)")
    cell = type_formula(sheet, "E2", "=FIT_DURBIN_WATSON(A1:A12;B1:C12)")
    assert gone.Value == cell.Value == pytest.approx(durbin_watson(rows), rel=1e-12)
    sheets.removeByName("Gone")
    assert gone.getError() != 0
    sheet.Rows.insertByIndex(3, 2)  # two blank rows among the data, and the formula moves along
    moved = sheet.getCellRangeByName("E2")
    assert moved.FormulaLocal.count("14") == 2
    assert moved.Value == pytest.approx(durbin_watson(rows), rel=1e-12)
    sheet.Rows.removeByIndex(5, 4)
    del rows[3:7]
    assert moved.Value == pytest.approx(durbin_watson(rows), rel=1e-12)
    sheet.Columns.removeByIndex(2, 1)
    assert sheet.getCellRangeByName("D2").Value == pytest.approx(durbin_watson([row[:2] for row in rows]), rel=1e-12)


def test_two_documents_keep_apart(calc, document):
    other = calc.new_document()
    try:
        values = []
        for place, one in enumerate((document, other)):
            sheet, rows = one.Sheets.getByIndex(0), invented(9, 20 + place)
            fill(sheet, "A1:C9", rows)
            values.append((type_formula(sheet, "E1", "=FIT_DURBIN_WATSON(A1:A9;B1:C9)"), rows))
        for _ in range(3):
            for one in (document, other):
                one.calculateAll()
            for cell, rows in values:
                assert cell.Value == pytest.approx(durbin_watson(rows), rel=1e-12)
                rows[3][2] += 1.5
                cell.getSpreadsheet().getCellByPosition(2, 3).Value = rows[3][2]
    finally:
        other.close(True)


def test_a_document_file_saves_and_loads(calc, document, tmp_path):
    sheet, rows = document.Sheets.getByIndex(0), invented(9, 30)
    fill(sheet, "A1:C9", rows)
    type_formula(sheet, "E1", "=FIT_DURBIN_WATSON(A1:A9;B1:C9)")
    path = tmp_path / "invented.ods"
    document.storeToURL(path.as_uri(), calc.properties(FilterName="calc8"))
    copy = shutil.copy(path, tmp_path / "copy.ods")
    loaded = calc.open(tmp_path / "copy.ods")
    try:
        cell = loaded.Sheets.getByIndex(0).getCellRangeByName("E1")
        assert cell.FormulaLocal.startswith("=FIT_DURBIN_WATSON(")
        loaded.calculateAll()
        assert cell.Value == pytest.approx(durbin_watson(rows), rel=1e-12), copy
        rows[0][0] = 0.5
        loaded.Sheets.getByIndex(0).getCellByPosition(0, 0).Value = 0.5
        assert cell.Value == pytest.approx(durbin_watson(rows), rel=1e-12)
    finally:
        loaded.close(True)
