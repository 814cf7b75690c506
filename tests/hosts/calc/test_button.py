"""The button in a real LibreOffice: the sheet that it brings in, beside that of the files host on the same data."""

from __future__ import annotations

import re
import shutil
from pathlib import Path

import pytest
from press import named_cell, press, select, where, workers_ended

from sheetfuncs.hosts.calc.check_job import layout_of
from sheetfuncs.hosts.files import Request, check_book
from sheetfuncs.hosts.live import check_block, draw_check
from sheetfuncs.workbook.read import open_book
from sheetfuncs.workbook.selection import resolve

pytestmark = pytest.mark.libreoffice

BOOK = Path(__file__).parents[3] / "templates" / "order-hours-unequal-spread.xlsx"
TITLE = "Check of Orders"


def contents(document, leave_out=()):
    """Everything in the other sheets, and what belongs to the document as a whole."""
    found = {}
    for sheet in (document.Sheets.getByName(name) for name in document.Sheets.ElementNames if name not in leave_out):
        cursor = sheet.createCursor()
        cursor.gotoEndOfUsedArea(False)
        last = cursor.RangeAddress
        cells = sheet.getCellRangeByPosition(0, 0, last.EndColumn, last.EndRow)
        found[sheet.Name] = (
            cells.getFormulaArray(), sheet.PageStyle, sheet.TabColor, sheet.IsVisible, sheet.DrawPage.Count,
            [cells.Columns.getByIndex(place).Width for place in range(last.EndColumn + 1)],
            [cells.Rows.getByIndex(place).Height for place in range(last.EndRow + 1)],
            [(names.Name, names.Content) for names in sheet.NamedRanges],
        )
    found["names"] = [(one.Name, one.Content) for one in document.NamedRanges]
    found["cell styles"] = document.StyleFamilies.getByName("CellStyles").ElementNames
    found["sheets"] = [name for name in document.Sheets.ElementNames if name not in leave_out]
    found["page styles"] = [
        name for name in document.StyleFamilies.getByName("PageStyles").ElementNames if TITLE not in name
    ]
    return found


@pytest.fixture(scope="module", params=["xlsx", "ods"])
def pressed(calc, request, tmp_path_factory):
    """The button was pressed in a copy of the demo workbook, with one cell of the data selected."""
    folder = tmp_path_factory.mktemp("pressed")
    book = folder / BOOK.name
    shutil.copy(BOOK, book)
    document = calc.open(book, Hidden=False)
    if request.param == "ods":
        document.storeToURL((folder / "orders.ods").as_uri(), calc.properties(FilterName="calc8"))
        document.close(True)
        document = calc.open(folder / "orders.ods", Hidden=False)
    with workers_ended(calc):
        select(document, "Orders", "F40")
        before = contents(document)
        outcome = press(calc, document)
        yield document, before, outcome
        document.close(True)


@pytest.fixture
def sheet(pressed):
    return pressed[0].Sheets.getByName(TITLE)


@pytest.fixture(scope="module")
def plan():
    """What the sheet was planned as."""
    import io

    with open_book(BOOK) as book:
        block = book.read(resolve(book, "Panels"))
    return draw_check(check_block(block, book=BOOK.name), io.BytesIO(), title=TITLE)


def test_it_stands_right_after_the_data_and_the_sentence_names_it(pressed):
    document, _, outcome = pressed
    titles = document.Sheets.ElementNames
    assert titles[titles.index("Orders") + 1] == TITLE
    assert outcome.succeeded
    assert f"“{TITLE}” stands right after “Orders”" in outcome.text
    assert "evidence against constant variance" in outcome.text


def test_the_view_stays_where_it_was(pressed):
    assert where(pressed[0]) == ("Orders", "F40")


def test_nothing_else_in_the_document_changed(pressed):
    document, before, _ = pressed
    assert contents(document, leave_out=(TITLE,)) == before


def test_figures_are_those_of_the_files_host(pressed, sheet, tmp_path):
    done = check_book(Request(book=BOOK, range_text="Panels", out=tmp_path / "checked.xlsx"))
    with open_book(done.out) as book:
        expected = book.read(resolve(book, f"'{done.sheet}'!A1:AG420"))
    found = sheet.getCellRangeByName("A1:AG420").getDataArray()
    pairs = [(expected.value(row, column), found[row][column]) for row in range(420) for column in range(33)]
    numbers = [(wanted, value) for wanted, value in pairs if isinstance(wanted, float)]
    assert len(numbers) > 500
    assert [value for _, value in numbers] == pytest.approx([wanted for wanted, _ in numbers], rel=1e-9, abs=1e-12)
    texts = {(wanted or "", value) for wanted, value in pairs if not isinstance(wanted, float)}
    others = {(wanted, value) for wanted, value in texts if wanted != value}
    assert {re.sub(r"[\d: -]", "", value) for _, value in others} <= {"", "orders.ods"}  # the time of the check


def test_links_lead_to_cells_that_are_there(pressed, sheet, plan):
    document, found = pressed[0], {}
    for planned in (cell for cell in plan.cells if cell.link):
        cell = sheet.getCellByPosition(planned.column - 1, planned.row - 1)
        fields = list(cell.Text.TextFields) if cell.Type.value == "TEXT" else []
        url = fields[0].URL if fields else cell.Hyperlink  # a number carries its link itself
        title, address = re.fullmatch(r"#'?(.+?)'?\.([A-Z]+\d+)", url).groups()
        assert document.Sheets.getByName(title).getCellRangeByName(address)
        found[planned.value] = (title, address)
    assert found["To the data: Orders!D4:G74"] == ("Orders", "D4")
    assert found[51] == ("Orders", "D51")
    assert len(found) > 10


def test_charts_are_alive_and_at_their_places(sheet, plan):
    shapes = [sheet.DrawPage.getByIndex(place) for place in range(sheet.DrawPage.Count)]
    assert len(shapes) == len(plan.charts) == sheet.Charts.Count
    for shape, chart, place in zip(shapes, plan.charts, layout_of(plan)["charts"], strict=True):
        corner = sheet.getCellByPosition(place[1] - 1, place[0] - 1).Position
        drawn_at = [shape.Position.X, shape.Position.Y, shape.Size.Width, shape.Size.Height]
        assert drawn_at == pytest.approx([corner.X + 53, corner.Y + 53, *place[3:]], abs=3)
        drawn = sheet.Charts.getByName(shape.PersistName).EmbeddedObject
        types = [one for system in drawn.FirstDiagram.CoordinateSystems for one in system.ChartTypes]
        series = [one for kind in types for one in kind.DataSeries]
        assert len(series) == len(chart.series)
        assert "".join(part.String for part in drawn.TitleObject.Text) == chart.title
        for one in series:
            ranges = [sequence.Values.SourceRangeRepresentation for sequence in one.DataSequences]
            assert all(TITLE in range_ for range_ in ranges)
            assert all(len(sequence.Values.Data) > 0 for sequence in one.DataSequences)


def test_page_set_up(pressed, sheet, plan):
    document = pressed[0]
    style = document.StyleFamilies.getByName("PageStyles").getByName(sheet.PageStyle)
    assert style.IsLandscape
    assert (style.ScaleToPagesX, style.ScaleToPagesY) == (1, 0)
    assert style.RightPageFooterContent.LeftText.String == TITLE
    (area,) = sheet.PrintAreas
    assert (area.StartRow, area.EndRow, area.EndColumn) == (0, plan.print_rows - 1, plan.last_column - 1)
    assert sheet.PrintTitleRows
    assert sheet.TitleRows.EndRow == 0
    assert tuple(one.Position for one in sheet.RowPageBreaks if one.ManualBreak) == plan.breaks
    assert sheet.TabColor == 0x1F2933


def test_widths_heights_and_merged_cells_are_as_planned(sheet, plan):
    layout = layout_of(plan)
    for first, last, width in layout["widths"]:
        for column in range(first, last + 1):
            assert sheet.Columns.getByIndex(column - 1).Width == pytest.approx(width, abs=20)
    for first, last, height in layout["heights"]:
        for row in range(first, last + 1):
            assert sheet.Rows.getByIndex(row - 1).Height == pytest.approx(height, abs=20)
    merged = [cell for cell in plan.cells if cell.last_column and cell.last_column > cell.column]
    for cell in merged:
        assert sheet.getCellByPosition(cell.column - 1, cell.row - 1).IsMerged


def test_the_record_offers_its_list_and_the_numbers_keep_their_formats(pressed, sheet, plan):
    validation = named_cell(sheet, "decision_1").Validation
    assert validation.Type.value == "LIST"
    assert "Use it" in validation.getFormula1()
    formats = pressed[0].NumberFormats
    checked = 0
    for cell in plan.cells:
        if isinstance(cell.value, float) and cell.style.number_format == "0.00" and cell.formula is None:
            key = sheet.getCellByPosition(cell.column - 1, cell.row - 1).NumberFormat
            assert formats.getByKey(key).FormatString == "0.00"
            checked += 1
    assert checked


def test_saved_it_is_still_ours_in_every_program(calc, pressed, sheet, tmp_path):
    import openpyxl

    from sheetfuncs.workbook import find_our_sheets

    document = pressed[0]
    document.storeToURL((tmp_path / "saved.xlsx").as_uri(), calc.properties(FilterName="Calc MS Excel 2007 XML"))
    (ours,) = find_our_sheets(tmp_path / "saved.xlsx")
    assert ours.name == TITLE
    assert (ours.settings["sheet"], ours.settings["area"]) == ("Orders", "D4:G74")
    saved = openpyxl.load_workbook(tmp_path / "saved.xlsx")
    frozen = {sheet.title: sheet.sheet_view.pane.ySplit for sheet in saved if sheet.sheet_view.pane}
    assert frozen == {TITLE: 2, "Orders": 4}
    assert [sheet.title for sheet in saved if sheet.sheet_view.showGridLines] == ["Time by area"]
    assert saved[TITLE].print_title_rows == "$1:$1"
    assert saved.active.title == "Orders"
    names = [name for name in saved[TITLE].defined_names if name.startswith("_sheetfuncs_decision")]
    assert len(names) == 6
