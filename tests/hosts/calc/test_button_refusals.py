"""What cannot be checked gets a sentence, and nothing in the document changes."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest
from office import fill
from press import Pressed, press, select, workers_ended

pytestmark = pytest.mark.libreoffice

BOOK = Path(__file__).parents[3] / "templates" / "order-hours-unequal-spread.xlsx"


def refusal(calc, document, command="check"):
    titles = document.Sheets.ElementNames
    outcome = press(calc, document, command)
    assert not outcome.succeeded
    assert document.Sheets.ElementNames == titles
    assert not document.isModified()
    assert document.UndoManager.getAllUndoActionTitles() == ()
    return outcome.text


@pytest.mark.parametrize(
    ("sheet", "address", "sentence"),
    [
        ("Orders", "Z500", "The cell Z500 is empty, and nothing stands beside it. Select the data first"),
        ("Orders", "B2", "Nothing stands beside the cell B2. Select the data first"),
        ("Orders", "T3:V9", "is empty"),
        ("Orders", "D5:D74", "leaves no predictor"),
        ("Orders", "D4:D74;F5:G74", "Ranges on different rows"),
        ("Orders", "B4:D74", "Orders!B4, in column B, holds the text “Order” where numbers are needed"),
        ("Orders", "D4:G6", "rows"),
    ],
)
def test_a_selection_that_makes_no_sense(calc, orders, sheet, address, sentence):
    select(orders, sheet, address)
    assert sentence in refusal(calc, orders)


def test_a_chart_is_selected(calc, orders):
    sheet = select(orders, "Time by area", "A1")
    orders.CurrentController.select(sheet.DrawPage.getByIndex(0))
    assert "A chart or a drawing is selected" in refusal(calc, orders)


def test_nothing_to_check_again(calc, orders):
    select(orders, "Rates", "B5")
    assert "no check on this sheet" in refusal(calc, orders, "again")


def test_without_a_listener_nothing_waits_for_a_click(calc, orders):
    select(orders, "Orders", "Z500")
    pressed = Pressed(calc, orders, "check")
    pressed.dispatch.dispatch(pressed.url, ())
    assert not orders.isModified()


def test_a_document_for_reading_only(calc, tmp_path):
    shutil.copy(BOOK, tmp_path / BOOK.name)
    document = calc.open(tmp_path / BOOK.name, Hidden=False, ReadOnly=True)
    try:
        select(document, "Orders", "D10")
        assert "open for reading only" in refusal(calc, document)
    finally:
        document.close(True)


def test_changes_are_recorded(calc, document):
    document.RecordChanges = True
    outcome = press(calc, document)
    assert not outcome.succeeded
    assert "Changes to this document are being recorded" in outcome.text


def test_a_protected_structure(calc, document):
    sheet = document.Sheets.getByIndex(0)
    fill(sheet, "A1:B6", [[1.0, 1.0], [2.5, 2.0], [2.0, 3.0], [4.5, 4.0], [4.0, 5.0], [6.5, 6.0]])
    document.protect("")
    outcome = press(calc, document)
    assert not outcome.succeeded
    assert "structure of this document is protected" in outcome.text
    assert document.Sheets.Count == 1
    document.unprotect("")


def test_whole_columns_and_parts_of_a_selection(calc, document):
    with workers_ended(calc):
        sheet = document.Sheets.getByIndex(0)
        sheet.Name = "It's a test!"
        rows = [[float(3 * i + i % 3), float(i), float(i * i % 7), 1.0 + i % 5] for i in range(12)]
        fill(sheet, "A1", [["Invented hours of a test"]])
        fill(sheet, "B3:E3", [["Hours", "Pieces", "Colours", "Shift"]])
        fill(sheet, "B4:E15", rows)
        title = "Check of It's a test!"
        select(document, sheet.Name, "B:D")
        assert press(calc, document).succeeded
        settings = document.Sheets.getByName(title).NamedRanges.getByName("_sheetfuncs_settings_1").Content
        assert '""area"":""B:D""' in settings
        fill(sheet, "B16:E16", [[40.0, 12.0, 3.0, 2.0]])
        assert "was written anew" in press(calc, document).text
        texts = document.Sheets.getByName(title).getCellRangeByName("B1:O10").getDataArray()
        assert any("13 rows used" in str(text) for row in texts for text in row)
        select(document, sheet.Name, "B3:B16;D3:E16")
        assert press(calc, document).succeeded
        texts = document.Sheets.getByName(f"{title} (2)").getCellRangeByName("B1:O10").getDataArray()
        assert any("Hours from Colours and Shift" in str(text) for row in texts for text in row)
