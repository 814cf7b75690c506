"""Pressing the button again: the sheet is replaced, its record kept, and everything is one step of undo."""

from __future__ import annotations

import os
import shutil
import signal
import threading
from pathlib import Path

import pytest
from office import type_formula, wait_for
from press import Pressed, named_cell, press, select, where, workers_ended

import sheetfuncs
from sheetfuncs.hosts.files import Request, check_book

pytestmark = pytest.mark.libreoffice

BOOK = Path(__file__).parents[3] / "templates" / "order-hours-unequal-spread.xlsx"
TITLE = "Check of Orders"
XLSX = "Calc MS Excel 2007 XML"


@pytest.fixture
def orders(calc, tmp_path):
    """A copy of the demo workbook, in a window that nobody sees."""
    shutil.copy(BOOK, tmp_path / BOOK.name)
    document = calc.open(tmp_path / BOOK.name, Hidden=False)
    with workers_ended(calc):
        yield document
        document.close(True)


@pytest.fixture
def checked(calc, orders):
    """The same with the button pressed once on the data."""
    select(orders, "Orders", "D4:G74")
    assert press(calc, orders).succeeded
    return orders


def titles(document):
    return list(document.Sheets.ElementNames)


def test_the_record_is_kept_and_the_sheet_stays_at_its_place(calc, checked):
    sheets = checked.Sheets
    sheet = sheets.getByName(TITLE)
    named_cell(sheet, "decision_1").String = "Use it"
    named_cell(sheet, "decision_4").Value = 46_000
    sheets.moveByName(TITLE, 0)
    outside = type_formula(sheets.getByName("Rates"), "Z1", f"=$'{TITLE}'.B1")
    array = type_formula(sheets.getByName("Rates"), "Z3:Z4", f"=$'{TITLE}'.B4:B5")
    checked.NamedRanges.addNewByName("Decided", f"$'{TITLE}'.$E$239", outside.CellAddress, 0)
    decided = checked.NamedRanges.getByName("Decided")
    decided.setContent(sheet.NamedRanges.getByName("_sheetfuncs_decision_1").Content)
    before, order = where(checked), titles(checked)
    outcome = press(calc, checked)
    assert outcome.succeeded
    assert "was written anew" in outcome.text
    assert where(checked) == before
    assert titles(checked) == order
    anew = sheets.getByName(TITLE)
    assert named_cell(anew, "decision_1").String == "Use it"
    assert named_cell(anew, "decision_4").Value == 46_000
    assert named_cell(anew, "decision_2").String == ""
    assert outside.String == TITLE
    assert outside.Formula == f"=$'{TITLE}'.B1"
    assert array.getCellByPosition(0, 0).String.startswith("Work time (h) from")
    assert array.getArrayFormula() == f"{{=$'{TITLE}'.B4:B5}}"
    for step in (checked.UndoManager.undo, checked.UndoManager.redo):
        step()
        assert outside.String == TITLE
        assert array.getCellByPosition(0, 0).String.startswith("Work time (h) from")
        assert decided.ReferredCells.getCellByPosition(0, 0).String == "Use it"
        assert titles(checked) == order


def test_each_press_is_one_step_of_undo(calc, orders):
    manager = orders.UndoManager
    note = orders.Sheets.getByName("Rates").getCellRangeByName("Z9")
    note.Value = 7
    original = titles(orders)
    select(orders, "Orders", "E20")
    press(calc, orders)
    assert len(manager.getAllUndoActionTitles()) == 2
    named_cell(orders.Sheets.getByName(TITLE), "decision_3").String = "Ines Invented"
    press(calc, orders)
    assert len(manager.getAllUndoActionTitles()) == 4
    named_cell(orders.Sheets.getByName(TITLE), "decision_3").String = "Someone else"

    def decided_by():
        return named_cell(orders.Sheets.getByName(TITLE), "decision_3").String

    steps = ["Ines Invented", "Ines Invented", "", None]
    for expected in steps:
        manager.undo()
        assert (decided_by() if expected is not None else None) == expected
    assert titles(orders) == original
    assert where(orders) == ("Orders", "E20")
    assert note.Value == 7
    for expected in ["", "Ines Invented", "Ines Invented", "Someone else"]:
        manager.redo()
        assert decided_by() == expected
    assert orders.Sheets.getByName(TITLE).Charts.Count == 7
    assert orders.Sheets.getByName(TITLE).PrintTitleRows


def test_an_undone_replacement_brings_the_old_sheet_back_whole(calc, checked):
    sheet = checked.Sheets.getByName(TITLE)
    sheet.getCellRangeByName("Q3").String = "a remark beside it"
    select(checked, "Orders", "D5").getCellRangeByName("D5").Value = 1_000.0
    press(calc, checked)
    anew = checked.Sheets.getByName(TITLE)
    assert anew.getCellRangeByName("Q3").String == ""
    checked.UndoManager.undo()
    back = checked.Sheets.getByName(TITLE)
    assert back.getCellRangeByName("Q3").String == "a remark beside it"
    assert back.Charts.Count == 7
    (area,) = back.PrintAreas
    assert area.EndRow > 200
    assert checked.StyleFamilies.getByName("PageStyles").getByName(back.PageStyle).IsLandscape
    select(checked, TITLE, "B5")
    assert checked.CurrentController.hasFrozenPanes()
    assert "written anew" in press(calc, checked, "again").text  # and it is still ours


def test_another_range_gets_another_sheet(calc, checked):
    select(checked, "Orders", "D4:E74")
    assert f"“{TITLE} (2)” stands right after “Orders”" in press(calc, checked).text
    place = titles(checked).index("Orders")
    assert titles(checked)[place:place + 3] == ["Orders", f"{TITLE} (2)", TITLE]
    refused = press(calc, checked, "again")
    assert not refused.succeeded
    assert "2 checks" in refused.text


def test_from_our_sheet_with_settings_changed_in_their_cells(calc, checked):
    sheet = select(checked, TITLE, "C9")
    entry = next(
        cell for cell in (named_cell(sheet, f"entry_{place}") for place in range(1, 8))
        if cell.String.startswith("Panel area")
    )
    entry.String = "Panel area (m²); Cut pieces"
    assert press(calc, checked).succeeded
    assert where(checked) == (TITLE, "C9")
    sheet = checked.Sheets.getByName(TITLE)
    texts = [text for row in sheet.getCellRangeByName("B1:O10").getDataArray() for text in row]
    assert any("from Panel area (m²) and Cut pieces" in str(text) for text in texts)
    assert any("changed under Settings: Predictors" in str(text) for text in texts)
    selected = select(checked, "Orders", "D4:G74")
    assert "another choice of predictors" in press(calc, checked).text
    assert selected.Name == "Orders"


def test_rows_added_below_are_said(calc, checked):
    data = checked.Sheets.getByName("Orders")
    data.getCellRangeByName("D75:G75").setDataArray(((12.0, 4.0, 2.0, 9.0),))
    select(checked, "Orders", "A1")
    assert press(calc, checked, "again").succeeded
    sheet = checked.Sheets.getByName(TITLE)
    texts = [str(text) for row in sheet.getCellRangeByName("B1:O10").getDataArray() for text in row]
    assert any("Row 75, right below the range" in text for text in texts)


def test_to_and_fro_between_programs_with_dates_and_two_windows(calc, tmp_path):
    book = tmp_path / "dryer.xlsx"
    shutil.copy(BOOK.with_name("dryer-gas-time-order.xlsx"), book)
    title = "Check of Drying days"
    document = calc.open(book, Hidden=False)
    with workers_ended(calc):
        first = document.CurrentController
        calc.service("com.sun.star.frame.DispatchHelper").executeDispatch(first.Frame, ".uno:NewWindow", "", 0, ())
        select(document, "Notes", "B2")
        second = document.CurrentController
        assert second != first
        document.setCurrentController(first)
        select(document, "Drying days", "C7")
        assert press(calc, document).succeeded
        assert first.ActiveSheet.Name == "Drying days"
        assert (second.ActiveSheet.Name, second.Selection.AbsoluteName) == ("Notes", "$Notes.$B$2")
        for controller in (first, second):
            controller.setActiveSheet(document.Sheets.getByName(title))
            assert controller.hasFrozenPanes()
        named_cell(document.Sheets.getByName(title), "decision_2").String = "invented, for a test"
        document.storeToURL((tmp_path / "there.xlsx").as_uri(), calc.properties(FilterName=XLSX))
        document.close(True)
        done = check_book(Request(book=tmp_path / "there.xlsx", in_place=True))
        assert (done.sheet, done.replaced, done.check.settings.order) == (title, True, "Date")
        document = calc.open(tmp_path / "there.xlsx", Hidden=False)
        select(document, title, "B2")
        assert "written anew" in press(calc, document, "again").text
        assert named_cell(document.Sheets.getByName(title), "decision_2").String == "invented, for a test"
        document.close(True)


def test_nothing_is_left_open_when_the_document_is_closed(calc, tmp_path):
    def open_documents():
        found = calc.desktop.Components.createEnumeration()
        return sum(1 for _ in iter(lambda: found.hasMoreElements() and found.nextElement(), False))

    before = open_documents()
    shutil.copy(BOOK, tmp_path / "closed.xlsx")
    document = calc.open(tmp_path / "closed.xlsx", Hidden=False)
    with workers_ended(calc):
        select(document, "Orders", "D10")
        assert press(calc, document).succeeded
        assert press(calc, document).succeeded
    assert open_documents() == before + 2  # the replaced sheet is kept for undo
    document.close(True)
    assert open_documents() == before


def test_long_ranges_are_read_in_slices(calc, document):
    rows = [(float(i % 7 + i % 3), float(i % 3)) for i in range(20_100)]
    rows[20_050] = ("", 1.0)
    rows[20_060] = (2.0, "=NA()")
    sheet = document.Sheets.getByIndex(0)
    sheet.getCellRangeByName("A1:B1").setDataArray((("Load", "Speed"),))
    sheet.getCellRangeByPosition(0, 1, 1, len(rows)).setDataArray(tuple(rows))
    sheet.getCellRangeByName("B20062").Formula = "=NA()"
    sheet.Rows.getByIndex(20_080).IsVisible = False
    with workers_ended(calc):
        select(document, sheet.Name, "A5")
        assert press(calc, document).succeeded
    texts = document.Sheets.getByIndex(1).getCellRangeByName("B1:O400").getDataArray()
    said = "\n".join(str(text) for row in texts for text in row if text)
    assert "20,098 rows used, 2 left out" in said
    assert "Blank in column A (Load)" in said
    assert "#N/A in column B (Speed)" in said
    assert "1 of the used" in said  # hidden


def test_ods_keeps_what_the_button_needs(calc, checked, tmp_path):
    named_cell(checked.Sheets.getByName(TITLE), "decision_5").String = "Otto Invented"
    checked.storeToURL((tmp_path / "orders.ods").as_uri(), calc.properties(FilterName="calc8"))
    again = calc.open(tmp_path / "orders.ods", Hidden=False)
    try:
        select(again, TITLE, "B3")
        assert "was written anew" in press(calc, again, "again").text
        assert titles(again) == titles(checked)
        sheet = again.Sheets.getByName(TITLE)
        assert named_cell(sheet, "decision_5").String == "Otto Invented"
        assert sheet.Charts.Count == 7
    finally:
        again.close(True)


@pytest.fixture
def held(calc, orders):
    """The worker of the button, standing still; it goes on at the end."""
    for pid in calc.workers():
        os.kill(pid, signal.SIGKILL)
    wait_for(lambda: not calc.workers(), "no worker is left of other tests")
    cells = type_formula(orders.Sheets.getByName("Rates"), "Y1", "=FIT_VIF(Orders.E5:F14;1)")
    assert cells.Value > 0
    for_cells = calc.workers()
    select(orders, "Orders", "D5:D9")
    assert not press(calc, orders).succeeded
    (pid,) = set(calc.workers()) - set(for_cells)
    os.kill(pid, signal.SIGSTOP)
    select(orders, "Orders", "D4:G74")
    yield pid
    if pid in calc.workers():
        os.kill(pid, signal.SIGCONT)


def test_functions_go_on_and_a_killed_worker_is_asked_again(calc, orders, held):
    pressed = Pressed(calc, orders, "check").start()
    rates = orders.Sheets.getByName("Rates")
    data = [list(row) for row in orders.Sheets.getByName("Orders").getCellRangeByName("D5:E14").getDataArray()]
    value = type_formula(rates, "Y2", "=FIT_DURBIN_WATSON(Orders.D5:D14;Orders.E5:E14)").Value
    expected = sheetfuncs.evaluate("FIT_DURBIN_WATSON", [row[:1] for row in data], [row[1:] for row in data])
    assert value == pytest.approx(expected, rel=1e-12)
    second = press(calc, orders)
    assert not second.succeeded
    assert "still running" in second.text
    assert pressed.listener.outcome is None
    os.kill(held, signal.SIGKILL)
    assert pressed.outcome().succeeded


def test_what_changes_while_the_check_runs_is_said_or_respected(calc, orders, held):
    pressed = Pressed(calc, orders, "check").start()
    threading.Event().wait(0.5)  # the cells have been read by then
    orders.Sheets.getByName("Orders").getCellRangeByName("D5").Value = 99.0
    os.kill(held, signal.SIGCONT)
    assert "data were changed while" in pressed.outcome().text


def test_a_document_closed_meanwhile_takes_its_check_along(calc, orders, held, tmp_path):
    shutil.copy(BOOK, tmp_path / "other.xlsx")
    other = calc.open(tmp_path / "other.xlsx", Hidden=False)
    select(other, "Orders", "D10")
    pressed = Pressed(calc, other, "check").start()
    other.close(True)
    os.kill(held, signal.SIGCONT)
    assert not pressed.outcome().succeeded
    assert press(calc, orders).succeeded
