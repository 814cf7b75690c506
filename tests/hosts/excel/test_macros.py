"""The button on real xlwings objects, over a spreadsheet program in memory that behaves as Excel does."""

from __future__ import annotations

import openpyxl
import pytest
from excel_cases import entry, invented_jobs, press, recorded, sheet, titles, workshop
from memory_engine import running_excel
from memory_model import Cell, ExcelError, Name, Table

from sheetfuncs.hosts.excel import macros
from sheetfuncs.hosts.files import Request, check_book

FOUND = "The check of “Jobs” is in the sheet “Check of Jobs”"


@pytest.fixture
def app():
    app = workshop()
    with running_excel(app):
        yield app


def test_the_sheet_stands_right_after_the_data_and_nothing_else_changed(app):
    book = app.active
    before = [one.state() for one in book.sheets]
    said = press(app)
    assert said.startswith(FOUND + " (30 rows used).")
    assert "Read a coefficient, predict an average value and predict one new value: No test found evidence" in said
    assert titles(app) == ["Notes", "Jobs", "Check of Jobs", "Later"]
    assert [one.state() for one in book.sheets if one.name != "Check of Jobs"] == before
    assert (app.active, book.active.name, book.active.selected) == (book, "Jobs", "B3:D33")
    assert [other.name for other in app.books] == ["Invented jobs.xlsx"]


def test_the_sheet_is_complete_and_points_into_the_same_workbook(app):
    press(app)
    made = sheet(app, "Check of Jobs")
    assert made.charts >= 6
    assert {name.visible for name in made.names} == {False}
    assert any("Cost" in str(cell.value) for cell in made.cells.values())
    assert {link.split("!")[0] for link in made.links} == {"'Jobs'", "'Check of Jobs'"}
    # Formulas on another sheet's cells would have to be entered after the copy; there are none.
    assert any(cell.formula for cell in made.cells.values())
    assert not any("!" in (cell.formula or "") for cell in made.cells.values())


def test_steps_are_shown_in_the_status_bar(app):
    app.status_bar = "Zoom 85 %"
    press(app)
    assert [step.split(": ")[1] for step in app.steps if step.startswith("sheetfuncs")] == [
        "reading the cells ...", "checking ...", "drawing the sheet ...", "bringing the sheet in ...",
    ]
    assert app.status_bar == "Zoom 85 %"


def test_pressed_again_the_sheet_is_replaced_and_the_decision_kept(app):
    press(app)
    entry(app, "_sheetfuncs_decision_1").value = "Use it"
    entry(app, "_sheetfuncs_decision_4").value = 46357.0
    entry(app, "_sheetfuncs_decision_4").number_format = "yyyy-mm-dd"
    sheet(app).cells[4, 2].value += 1.0
    mark = recorded(app)["fingerprint"]
    press(app)
    assert titles(app) == ["Notes", "Jobs", "Check of Jobs", "Later"]
    assert entry(app, "_sheetfuncs_decision_1").value == "Use it"
    assert openpyxl.utils.datetime.to_excel(entry(app, "_sheetfuncs_decision_4").value) == 46357.0
    assert entry(app, "_sheetfuncs_decision_6").value == mark  # of the data decided on, which have changed since
    assert recorded(app)["fingerprint"] != mark


def test_in_a_workbook_that_counts_from_1904_a_decision_keeps_its_date(app):
    app.active.date1904 = True
    press(app)
    entry(app, "_sheetfuncs_decision_4").value = 44895.0
    entry(app, "_sheetfuncs_decision_4").number_format = "yyyy-mm-dd"
    press(app)
    # The number in the cell is what is copied, and the workbook's system says which date that is.
    assert openpyxl.utils.datetime.to_excel(entry(app, "_sheetfuncs_decision_4").value) == 44895.0


def test_another_range_gets_a_sheet_of_its_own(app):
    press(app)
    sheet(app).selected = "B3:C33"
    press(app)
    assert titles(app) == ["Notes", "Jobs", "Check of Jobs (2)", "Check of Jobs", "Later"]
    assert recorded(app, "Check of Jobs (2)")["predictors"] == ["Weight"]
    assert recorded(app)["predictors"] == ["Weight", "Holes"]


def test_a_sheet_that_was_renamed_and_moved_keeps_its_name_and_place(app):
    press(app)
    made = sheet(app, "Check of Jobs")
    for name in made.names:
        name.refers_to = name.refers_to.replace("'Check of Jobs'", "'It''s fine'")
    made.name = "It's fine"
    book = app.active
    book.sheets.remove(made)
    book.sheets.append(made)
    press(app)
    assert titles(app) == ["Notes", "Jobs", "Later", "It's fine"]
    assert made not in book.sheets


def test_on_our_sheet_the_check_is_made_again_with_the_settings_in_its_cells(app):
    press(app)
    app.active.active = sheet(app, "Check of Jobs")
    entry(app, "_sheetfuncs_entry_2").value = "Weight"
    entry(app, "_sheetfuncs_entry_7").value = 0.9
    said = press(app)
    assert said.startswith(FOUND)
    assert app.active.active is sheet(app, "Check of Jobs")
    assert titles(app) == ["Notes", "Jobs", "Check of Jobs", "Later"]
    assert recorded(app)["predictors"] == ["Weight"]
    assert recorded(app)["level"] == 0.9
    texts = [str(cell.value) for cell in sheet(app, "Check of Jobs").cells.values()]
    assert any("of which Predictors and Interval level changed there" in text for text in texts)


def test_a_setting_that_is_not_understood_is_refused_and_the_sheet_stays(app):
    press(app)
    app.active.active = sheet(app, "Check of Jobs")
    entry(app, "_sheetfuncs_entry_7").value = "high"
    before = app.active.state()
    assert "Interval level says “high”" in press(app)
    assert app.active.state() == before


def test_check_again_finds_the_only_check_of_the_sheet_in_front(app):
    press(app)
    sheet(app).selected = "A1"
    assert press(app, macros.check_again).startswith(FOUND)
    assert titles(app) == ["Notes", "Jobs", "Check of Jobs", "Later"]


def test_check_again_asks_which_one_where_there_are_several_and_says_where_there_is_none(app):
    assert "holds no check yet" in press(app, macros.check_again)
    press(app)
    sheet(app).selected = "B3:C33"
    press(app)
    before = app.active.state()
    assert "several checks (“Check of Jobs (2)”, “Check of Jobs”)" in press(app, macros.check_again)
    assert app.active.state() == before


def test_check_again_says_that_the_data_are_gone(app):
    press(app)
    book = app.active
    book.active = sheet(app, "Check of Jobs")
    book.sheets.remove(sheet(app, "Jobs"))
    assert "no sheet “Jobs” any more" in press(app, macros.check_again)


def test_one_cell_stands_for_the_block_around_it(app):
    sheet(app).selected = "$C$10"
    press(app)
    assert recorded(app)["area"] == "B3:D33"


def test_one_cell_of_a_table_stands_for_its_data_without_the_totals(app):
    sheet(app).put(34, 2, [["=SUM(B4:B33)", 800.0, 200.0]])
    sheet(app).cells[34, 2].value = 2500.0
    sheet(app).tables.append(Table("JobList", (3, 2), (33, 4), totals=1))
    sheet(app).selected = "C10"
    press(app)
    assert recorded(app)["area"] == "B3:D33"


@pytest.mark.parametrize(
    ("selected", "area"),
    [("B:D", "B:D"), ("3:33", "A3:D33"), ("B3:D60", "B3:D60"), ("1:1048576", "A1:D33"), ("$B:$B,$C:$D", "B:D")],
)
def test_whole_columns_and_rows_are_read_as_far_as_they_are_used(app, selected, area):
    sheet(app).selected = selected
    press(app)
    assert recorded(app)["area"] == area
    assert recorded(app)["predictors"] in (["Weight", "Holes"], ["C", "D"])


def test_more_rows_in_whole_columns_are_no_new_range_and_a_title_above_is_skipped(app):
    sheet(app).put(1, 2, [["Invented jobs of one week"]])
    sheet(app).selected = "B:D"
    press(app)
    entry(app, "_sheetfuncs_decision_1").value = "Use it"
    sheet(app).put(34, 2, [[50.0, 11.0, 3.0]])
    assert "(31 rows used)" in press(app)
    assert titles(app) == ["Notes", "Jobs", "Check of Jobs", "Later"]
    assert entry(app, "_sheetfuncs_decision_1").value == "Use it"
    app.active.active = sheet(app, "Check of Jobs")
    assert "(31 rows used)" in press(app)
    assert recorded(app)["area"] == "B:D"


def test_a_title_right_above_the_data_is_skipped_for_one_cell_in_them(app):
    sheet(app).put(2, 2, [["Invented jobs of one week"]])
    sheet(app).selected = "C10"
    press(app)
    assert recorded(app)["area"] == "B3:D33"


def test_several_parts_mean_their_columns_the_response_first(app):
    press(app)
    sheet(app).selected = "$D$3:$D$33,$B$3:$B$33"
    said = press(app)
    assert (recorded(app)["response"], recorded(app)["predictors"]) == ("Holes", ["Cost"])
    assert recorded(app)["area"] == "B3:D33"
    assert titles(app) == ["Notes", "Jobs", "Check of Jobs", "Later"]
    assert "The sheet before was made with another choice of response and predictors." in said


@pytest.mark.parametrize(
    ("selected", "sentence"),
    [
        ("$B$3:$B$33,$D$3:$D$20", "The selected parts (B3:B33, D3:D20) stand on different rows"),
        ("H40", "Jobs!H40 stands alone"),
        ("F3:G9", "is empty; give the range that holds the data"),
        ("B3:B33", "leaves no predictor"),
        ("B3:D3", "No column is left for the response"),
        (None, "No cells are selected"),
    ],
)
def test_a_selection_that_is_no_data_gets_a_sentence_and_changes_nothing(app, selected, sentence):
    sheet(app).selected = selected
    before = app.active.state()
    assert sentence in press(app)
    assert app.alerts[0][0] == "critical"
    assert app.active.state() == before


def test_a_sheet_that_is_a_chart_in_front_gets_a_sentence(app):
    app.active.active = app.active.add("Chart1", is_chart=True)
    assert "No cells are selected" in press(app)
    assert "No cell is selected" in press(app, macros.why_this_value)
    assert "holds no check yet" in press(app, macros.check_again)


def test_a_chart_selected_on_our_sheet_does_not_keep_it_from_being_made_again(app):
    press(app)
    app.active.active, app.selection_is_cells = sheet(app, "Check of Jobs"), False
    assert press(app).startswith(FOUND)


def test_a_chart_sheet_with_the_title_makes_another_title(app):
    app.active.add("Check of Jobs", is_chart=True)
    press(app)
    assert titles(app) == ["Notes", "Jobs", "Check of Jobs (2)", "Later", "Check of Jobs"]
    assert entry(app, "_sheetfuncs_decision_1", "Check of Jobs (2)").value is None


def test_hidden_names_that_the_copy_lacks_are_made_anew(app):
    app.carries_names = False
    press(app)
    assert {name.visible for name in sheet(app, "Check of Jobs").names} == {False}
    entry(app, "_sheetfuncs_decision_1").value = "Use it"
    press(app)
    assert titles(app) == ["Notes", "Jobs", "Check of Jobs", "Later"]
    assert entry(app, "_sheetfuncs_decision_1").value == "Use it"


@pytest.mark.parametrize("action", ["open", "copy", "delete"])
def test_a_failure_in_the_middle_leaves_the_workbook_as_it_was(app, action):
    press(app)
    entry(app, "_sheetfuncs_decision_1").value = "Use it"
    before = app.active.state()
    app.fail[action] = ExcelError("0x800A03EC")
    said = press(app)
    assert "Excel did not take the sheet into Invented jobs.xlsx (ExcelError: 0x800A03EC)" in said
    assert app.active.state() == before
    assert len(app.books) == 1


def test_a_guest_that_does_not_close_does_not_undo_the_check(app):
    app.fail["close"] = ExcelError("busy")
    assert press(app).startswith(FOUND)
    assert titles(app) == ["Notes", "Jobs", "Check of Jobs", "Later"]
    assert app.active.name == "Invented jobs.xlsx"


def test_what_nobody_foresaw_becomes_a_sentence(app, monkeypatch):
    def broken(*args, **options):
        raise ZeroDivisionError("division by zero")

    monkeypatch.setattr("sheetfuncs.hosts.excel.macros.check_block", broken)
    before = app.active.state()
    said = press(app)
    assert "ZeroDivisionError: division by zero, broken, line" in said
    assert "\n" not in said
    assert app.active.state() == before


@pytest.mark.parametrize("setting", ["status_bar", "screen_updating", "display_alerts", "enable_events"])
def test_a_setting_that_excel_does_not_take_keeps_nothing_else_from_its_place(app, setting):
    app.fail[setting] = ExcelError("busy")
    macros.check_selection()
    assert app.alerts[0][1].startswith(FOUND)
    assert (app.screen_updating, app.display_alerts, app.enable_events, app.status_bar) == (True, True, True, False)


def test_a_protected_structure_is_said_before_anything_is_done(app):
    app.active.structure_protected = True
    before = app.active.state()
    assert "The structure of Invented jobs.xlsx is protected" in press(app)
    assert app.active.state() == before
    assert app.opened == []


def test_a_workbook_that_came_to_the_front_meanwhile_is_left_alone(app):
    other = app.add("Other.xlsx")
    other.add("Sheet1").put(1, 1, invented_jobs())
    other.active.selected = "A1"
    before = [book.state() for book in app.books]
    assert press(app) == "Other.xlsx came to the front meanwhile: go to Invented jobs.xlsx, and press the button again."
    assert [book.state() for book in app.books] == before


def test_a_new_workbook_and_one_open_for_reading_both_work(app):
    app.active.name, app.active.read_only = "Book1", True
    assert press(app).endswith("save it under another name to keep the sheet.")
    assert recorded(app)["book"] == "Book1"


def test_what_points_at_the_sheet_points_at_the_new_one(app):
    press(app)
    notes, later, book = sheet(app, "Notes"), sheet(app, "Later"), app.active
    notes.put(5, 1, [["='Check of Jobs'!B5", "=1+1"]])
    notes.cells[6, 1] = Cell(formula="='Check of Jobs'!B5:B9", shape="spill")
    notes.cells[7, 1] = Cell(formula="=SUM('Check of Jobs'!B5:B9)", shape="array")
    later.put(2, 1, [["='Check of Jobs'!B5"]])
    later.protected = True
    book.names.append(Name("CheckedOn", "='Check of Jobs'!$B$5"))
    said = press(app)
    assert "have to be entered again: Notes!A7, Later!A2." in said
    assert [notes.cells[5, 1].formula, notes.cells[5, 2].formula] == ["='Check of Jobs'!B5", "=1+1"]
    assert (notes.cells[6, 1].formula, notes.cells[6, 1].shape) == ("='Check of Jobs'!B5:B9", "spill")
    assert book.names[0].refers_to == "='Check of Jobs'!$B$5"


def test_an_older_excel_without_spilling_keeps_formulas_too(app):
    app.has_formula2 = False
    press(app)
    sheet(app, "Notes").put(5, 1, [["='Check of Jobs'!B5"]])
    assert "entered again" not in press(app)
    assert sheet(app, "Notes").cells[5, 1].formula == "='Check of Jobs'!B5"


@pytest.mark.parametrize("mac", [False, True])
def test_hidden_rows_are_counted_on_a_protected_sheet_too(app, mac, monkeypatch, tmp_path):
    monkeypatch.setattr("sheetfuncs.hosts.excel.ranges.on_mac", lambda: mac)
    sheet(app).protected, sheet(app).hidden_rows = True, {1, 3, 7, 8, 20, 33, 50}
    press(app)
    texts = [str(cell.value) for cell in sheet(app, "Check of Jobs").cells.values()]
    assert "4 used rows are hidden or filtered out, and counted like the others." in texts


def test_that_hidden_rows_are_not_known_is_said(app):
    sheet(app).protected, app.tells_hidden_rows = True, False
    press(app)
    texts = [str(cell.value) for cell in sheet(app, "Check of Jobs").cells.values()]
    assert any("Excel did not say which rows are hidden" in text for text in texts)


def awkward_jobs():
    """Dates, currency with more digits than it shows, an error, a blank, a truth value."""
    rows = invented_jobs()
    rows = [[*rows[0], "Urgent", "Day"], *([*row, i % 3 == 0, 46000.0 + i] for i, row in enumerate(rows[1:]))]
    rows[5][1], rows[9][2], rows[12][1] = "#N/A", None, 17.123456789
    return rows


def put_awkward_jobs(app):
    jobs = sheet(app)
    jobs.put(3, 2, awkward_jobs())
    for row in range(4, 34):
        jobs.cells[row, 3].number_format = "$#,##0.00"
        jobs.cells[row, 6].number_format = "yyyy-mm-dd"
    jobs.hidden_rows, jobs.hidden_columns, jobs.selected = {4, 5, 20}, {4}, "B3:F33"


@pytest.mark.parametrize("mac", [False, True])
def test_the_same_workbook_gives_the_same_data_as_its_file(app, mac, tmp_path, monkeypatch):
    monkeypatch.setattr("sheetfuncs.hosts.excel.native.sys.platform", "darwin" if mac else "win32")
    monkeypatch.setattr("sheetfuncs.hosts.excel.sheets.Path.home", lambda: tmp_path)
    (tmp_path / "Library/Containers/com.microsoft.Excel/Data").mkdir(parents=True)
    app.mac = mac
    put_awkward_jobs(app)
    said = press(app)
    assert "28 rows used, 2 left out" in said
    assert app.opened[0].is_relative_to(tmp_path) == mac
    from_file = check_book(Request(file_with(awkward_jobs(), tmp_path / "jobs.xlsx"), "Jobs!B3:F33", write=False))
    settings = recorded(app)
    assert settings["fingerprint"] == fingerprint(from_file.check)
    expected = from_file.check.settings.to_dict()
    assert {key: settings[key] for key in expected if key != "book"} == {
        key: value for key, value in expected.items() if key != "book"
    }
    texts = [str(cell.value) for cell in sheet(app, "Check of Jobs").cells.values()]
    assert "3 used rows are hidden or filtered out, and counted like the others." in texts


def test_an_error_is_one_on_a_mac_that_speaks_another_language(app, tmp_path, monkeypatch):
    monkeypatch.setattr("sheetfuncs.hosts.excel.ranges.on_mac", lambda: True)
    app.mac, app.error_words = True, {"#N/A": "#NV", "#DIV/0!": "#DIV/0!"}
    sheet(app).cells[8, 3].value, sheet(app).cells[9, 3].value, sheet(app).cells[10, 3].value = "#N/A", "#DIV/0!", None
    assert "27 rows used, 3 left out" in press(app)
    texts = " ".join(str(cell.value) for cell in sheet(app, "Check of Jobs").cells.values())
    assert all(word in texts for word in ("#UNKNOWN! in", "#DIV/0! in", "Blank in"))


def file_with(rows, path):
    book = openpyxl.Workbook()
    cells = book.active
    cells.title = "Jobs"
    for i, row in enumerate(rows):
        for j, value in enumerate(row):
            cell = cells.cell(3 + i, 2 + j, value)
            if i and j == 4:
                cell.number_format = "yyyy-mm-dd"
    book.save(path)
    return path


def fingerprint(check):
    from sheetfuncs.report.record import fingerprint_of

    return fingerprint_of(check)
