"""The VBA at work: wrappers, error values, help, buttons, and what happens when a workbook is opened.

The numbers of error values are Excel's constants (XlCVError).
"""

from __future__ import annotations

import pytest
from pyopenvba.interpreter import MISSING, NOTHING, VBAArray, VBAErrorValue, VBARuntimeError, parse_module
from vba_world import MODULES, SYSTEMS, Python, Workbook, as_compiled_on, running

from sheetfuncs.cells.block import ERROR_TEXTS
from sheetfuncs.functions.registry import REGISTRY

NUMBER_OF = {
    "#NULL!": 2000, "#DIV/0!": 2007, "#VALUE!": 2015, "#REF!": 2023, "#NAME?": 2029, "#NUM!": 2036, "#N/A": 2042,
}
VALUE_ERROR = VBAErrorValue(2015)


def called(name, answer, given=()):
    """What the wrapper gives for an answer of Python, and what it handed over."""
    python = Python(answer)
    vba, _ = running("FitFunctions", python=python)
    result = vba.run(name, list(given) or list(range(sum(not a.optional for a in REGISTRY[name].arguments))))
    return result, python.calls


def array(*rows):
    """Rows as a two-dimensional array, which VBA keeps column by column."""
    return VBAArray([(0, len(rows) - 1), (0, len(rows[0]) - 1)], items=[cell for column in zip(*rows, strict=True)
                                                                       for cell in column])  # fmt: skip


@pytest.mark.parametrize("name", REGISTRY)
def test_every_wrapper_calls_its_function_and_keeps_its_failure_to_itself(name):
    needed = [f"range {a.name}" for a in REGISTRY[name].arguments if not a.optional]
    omitted = [MISSING] * (len(REGISTRY[name].arguments) - len(needed))
    result, calls = called(name, 1.5, needed)
    assert result == 1.5
    assert calls == [("sheetfuncs.hosts.excel.functions", name, needed + omitted)]
    every = [f"given {a.name}" for a in REGISTRY[name].arguments]
    assert called(name, 2.5, every)[1][0][2] == every
    failure = VBARuntimeError(440, "Traceback (most recent call last): boom")
    assert called(name, failure)[0] == VALUE_ERROR


@pytest.mark.parametrize("text", sorted(ERROR_TEXTS))
def test_error_texts_become_error_values_in_scalars_rows_and_tables(text):
    error = VBAErrorValue(NUMBER_OF.get(text, 2015))
    assert called("FIT_PRESS", text)[0] == error
    assert called("FIT_WHY", text)[0] == error
    row = called("FIT_BOX_COX", VBAArray([(0, 2)], items=[1.5, text, "n/a"]))[0]
    assert (row.bounds, row.items) == ([(0, 2)], [1.5, error, "n/a"])
    table = called("FIT_ROWS", array(["head", "head"], [text, 2.0], [3.0, text]))[0]
    assert table.bounds == [(0, 2), (0, 1)]
    assert table.items == array(["head", "head"], [error, 2.0], [3.0, error]).items


@pytest.mark.parametrize("text", ["", "Traceback (most recent call last):", "no such thing", "#n/a", "1.5"])
def test_a_text_in_place_of_a_number_becomes_an_error_value(text):
    assert called("FIT_PRESS", text)[0] == VALUE_ERROR
    assert called("FIT_LEVERAGE", text)[0] == VALUE_ERROR


def test_a_sentence_that_was_asked_for_stays_and_a_traceback_does_not():
    assert called("FIT_WHY", "ok; 4 rows left out")[0] == "ok; 4 rows left out"
    assert called("FIT_WHY", "# of rows: 3")[0] == "# of rows: 3"
    assert called("FIT_WHY", "Traceback (most recent call last): boom")[0] == VALUE_ERROR


@pytest.mark.parametrize("value", [0.0, -1.5, 1e-300, True, False])
def test_numbers_and_truth_values_pass(value):
    result = called("FIT_PRESS", value)[0]
    assert result == value
    assert isinstance(result, bool) == isinstance(value, bool)


def test_help_is_registered_for_every_function_and_argument():
    vba, excel = running("FunctionHelp")
    vba.run("DescribeFunctions", [])
    assert excel.application.described == [
        (f"'sheetfuncs.xlam'!{name}", function.summary, "sheetfuncs", [one.help for one in function.arguments])
        for name, function in REGISTRY.items()
    ]


BUTTONS = {
    "OnCheckSelection": "check_selection", "OnCheckAgain": "check_again", "OnWhyThisValue": "why_this_value",
    "OnHealth": "show_health",
}


@pytest.mark.parametrize(("button", "macro"), BUTTONS.items())
def test_each_button_runs_its_macro(button, macro):
    python = Python()
    vba, _ = running("RibbonActions", python=python, active=Workbook("C:\\data\\orders.xlsx"))
    vba.run(button, [NOTHING])
    assert python.statements == [f"import sheetfuncs.hosts.excel.macros; sheetfuncs.hosts.excel.macros.{macro}()"]


def test_a_failing_macro_ends_in_one_sentence_and_a_working_screen():
    failure = VBARuntimeError(440, "Unexpected Python Error: Traceback:\r\n  File x, line 3\r\nError: boom\r\n \r\n")
    vba, excel = running("RibbonActions", python=Python(failure), active=Workbook("C:\\data\\orders.xlsx"))
    vba.run("OnHealth", [NOTHING])
    assert [text for _, text, *_ in vba.dialogs] == ["This could not be done. Error: boom"]
    assert excel.application.status is False
    assert excel.application.updating is True


@pytest.mark.parametrize(
    ("report", "sentence"), [("one line", "one line"), ("", ""), ("a\n\n", "a"), ("x" * 999, "x" * 600)]
)
def test_the_last_line_of_a_report_is_its_sentence(report, sentence):
    assert running("RibbonActions")[0].run("LastLine", [report]) == sentence


def test_without_a_workbook_a_button_says_what_to_do():
    python = Python()
    vba, _ = running("RibbonActions", python=python)
    vba.run("OnCheckSelection", [NOTHING])
    assert python.statements == []
    assert "Open one" in vba.dialogs[0][1]


@pytest.mark.parametrize("system", SYSTEMS)
def test_every_module_is_well_formed_on_every_system(system):
    for name, module in MODULES.items():
        parse_module(as_compiled_on(system, name), name=name, kind="standard" if module.kind == "module" else "class")
    assert ("FIT_VIF" in as_compiled_on(system, "FitFunctions")) == (system != "macOS")


def opened(book, active=NOTHING):
    vba, excel = running("FunctionHelp", active=active)
    vba.add_module(as_compiled_on("Windows, 64 bits", "ThisWorkbook"), name="BookCode")
    if book is not None:
        vba.run("mExcel_WorkbookOpen", [book])
    return vba, excel


def test_links_to_this_addin_elsewhere_lead_here_and_no_others_change():
    elsewhere, other = "D:\\firm\\Sheetfuncs.XLAM", "D:\\firm\\prices.xlsx"
    here = "c:\\START\\sheetfuncs.xlam"
    book = Workbook("D:\\data.xlsx", [other, elsewhere, here, "https://firm.example/sheetfuncs.xlam"])
    opened(book)
    addin = "C:\\start\\sheetfuncs.xlam"
    assert book.changes == [(elsewhere, addin), ("https://firm.example/sheetfuncs.xlam", addin)]
    assert book.saved is True


def test_a_workbook_without_links_is_left_alone():
    book = Workbook("D:\\data.xlsx")
    opened(book)
    assert book.changes == []


def test_help_waits_for_a_workbook_and_is_given_once():
    vba, excel = opened(None)
    vba.run("Workbook_Open", [])
    assert excel.application.described == []
    excel.books["activeworkbook"] = Workbook("D:\\data.xlsx")
    excel.books["thisworkbook"].saved = False
    vba.run("mExcel_WorkbookActivate", [excel.books["activeworkbook"]])
    assert len(excel.application.described) == len(REGISTRY)
    assert excel.books["thisworkbook"].saved is True
    vba.run("mExcel_WorkbookActivate", [excel.books["activeworkbook"]])
    assert len(excel.application.described) == len(REGISTRY)
