"""The button that explains a cell, and the one that tells about the installation, on the program in memory."""

from __future__ import annotations

import pytest
from excel_cases import press, sheet, workshop
from memory_engine import running_excel
from memory_model import Cell

from sheetfuncs.errors import InstallError
from sheetfuncs.hosts.excel import functions, macros
from sheetfuncs.hosts.excel.explaining import calls_in
from sheetfuncs.hosts.excel.macros import show_health, why_this_value


@pytest.fixture
def app():
    app = workshop()
    with running_excel(app):
        yield app


def ask(app, formula, value=None, shape="", on="Jobs"):
    """What is said of a cell with this formula, which shows this value."""
    where = sheet(app, on)
    where.cells[40, 8] = Cell(value, formula, shape=shape)
    where.selected, app.active.active = "$H$40", where
    before = app.active.state()
    said = press(app, why_this_value)
    assert app.active.state() == before
    return said


def test_a_refusal_is_said_in_its_sentence(app):
    sheet(app).cells[10, 3].value = "heavy"
    said = ask(app, "=FIT_DURBIN_WATSON(B4:B33,C4:D33)", "#VALUE!")
    assert said.startswith("Jobs!H40: FIT_DURBIN_WATSON gives #VALUE!. ")
    assert "heavy" in said
    assert "C10" in said


def test_a_value_is_said_to_be_one_and_rows_left_out_are_named(app):
    assert ask(app, "=FIT_VIF(C4:D33)", 1.02) == "Jobs!H40: FIT_VIF gives its values."
    sheet(app).cells[10, 3].value = None
    said = ask(app, "=FIT_RESIDUALS(B3:B33,C3:D33)", "#N/A", shape="array")
    assert said.startswith("Jobs!H40: FIT_RESIDUALS gives its values. 1 of 30 rows left out: row 10")


def test_a_call_inside_a_calculation_is_found(app):
    formula = '=IF(FIT_VIF(C4:D33,3)>5,"FIT_ROWS(","ok")&FIT_PRESS(Jobs!B4:B33,Jobs!C4:D33)'
    said = ask(app, formula, "#VALUE!", on="Notes")
    first, second = said.removeprefix("Notes!H40: ").split("\n\n")
    assert first.startswith("FIT_VIF gives #NUM!. There are no rows of data in")
    assert second == "FIT_PRESS gives a value now: have the sheet calculated again."


def test_calls_are_cut_out_with_their_brackets():
    formula = "=@'C:\\A b\\sheetfuncs.xlam'!FIT_VIF('a)b'!C4:D33,\"x)\")+fit_press(B4:B33,(C4:D33))+MY_FIT_VIF(2)"
    assert calls_in(formula) == ["FIT_VIF('a)b'!C4:D33,\"x)\")", "fit_press(B4:B33,(C4:D33))"]
    assert calls_in("=FIT_VIF(C4:D33") == ["FIT_VIF(C4:D33"]


def test_a_cell_that_is_filled_from_the_formula_above_it(app):
    jobs = sheet(app)
    jobs.cells[39, 8] = Cell(1.2, "=FIT_VIF(C4:D33)", shape="spill")
    jobs.cells[40, 8] = Cell(1.2, None, shape="spilled")
    jobs.selected = "H40"
    assert press(app, why_this_value) == "Jobs!H40: FIT_VIF gives its values."


@pytest.mark.parametrize("formula", ["=SUM(B4:B33)", None])
def test_a_cell_without_a_function_of_ours_is_said_so(app, formula):
    assert "Jobs!H40 holds no function of sheetfuncs" in ask(app, formula, 12.0)


@pytest.mark.parametrize(
    ("formula", "sentence"),
    [
        ("=FIT_VIF(Gone!C4:D33)", "has no sheet “Gone” any more"),
        ("=FIT_VIF(Weights)", "Excel does not find 'Weights' here"),
        ("=FIT_VIF([Other.xlsx]Jobs!C4:D33)", "points into another workbook"),
        ("=FIT_VIF(C4:D33*2)", "put a calculation into a cell"),
        ("=FIT_VIF(C4:D33,1,TRUE,5)", "takes at most 3 arguments and 4 were given"),
        ("=FIT_PRESS(B4:B33)", "The argument predictors is missing"),
        ("=FIT_VIF(#REF!)", "FIT_VIF gives #REF!. The range predictors is the error #REF!"),
    ],
)
def test_what_cannot_be_read_is_said(app, formula, sentence):
    assert sentence in ask(app, formula, "#VALUE!")


def test_a_failure_of_before_is_told_where_all_is_well_now(app, monkeypatch):
    monkeypatch.setitem(functions._unexpected, "FIT_VIF", "The roof was off.")
    said = ask(app, "=FIT_VIF(C4:D33)", "#VALUE!")
    assert said.endswith("FIT_VIF gives a value now: have the sheet calculated again. Before: The roof was off.")


def test_whole_columns_are_read_no_further_than_they_are_used(app):
    assert ask(app, "=FIT_VIF(C:D)", 1.0).startswith("Jobs!H40: FIT_VIF gives")


def test_health_is_told_in_a_message(app, monkeypatch):
    monkeypatch.setattr(macros, "health_text", lambda: "All parts are in place.")
    assert press(app, show_health) == "All parts are in place."
    assert app.alerts[0][0] == "info"


def test_health_that_cannot_be_told_is_a_sentence_too(app, monkeypatch):
    def refused():
        raise InstallError("There is no Excel here.")

    monkeypatch.setattr(macros, "health_text", refused)
    assert press(app, show_health) == "There is no Excel here."
    assert app.alerts[0][0] == "critical"
