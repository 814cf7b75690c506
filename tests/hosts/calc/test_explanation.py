""" "Why this value?": each of our functions in a cell says what stopped it, or that nothing did."""

from __future__ import annotations

import pytest
from office import type_formula
from press import Pressed, press, select, where

import sheetfuncs

pytestmark = pytest.mark.libreoffice

LEFT_OUT = "4 of 70 rows left out: row 15 (blank in column G (Cut pieces))"


def ask(calc, document, formula):
    """What is said of a formula in Rates.Z1."""
    sheet = select(document, "Rates", "Z1")
    type_formula(sheet, "Z5", "=NA()")
    type_formula(sheet, "Z1", formula)
    return press(calc, document, "why")


@pytest.mark.parametrize(
    ("formula", "sentences"),
    [
        ("=FIT_DURBIN_WATSON($Orders.D4:D74; Orders.$E$4:G74)+1", ["FIT_DURBIN_WATSON gives a value.", LEFT_OUT]),
        ("=IF(1;FIT_VIF(Panel_study;;TRUE());FIT_RESET_P(Orders.B4:B20;Orders.E4:E20))",
         ["FIT_VIF gives its values.\n\n", "FIT_RESET_P gives #VALUE!. Orders!B4, in column B"]),
        ("=FIT_BREUSCH_PAGAN_P(Orders.D:D;Orders.E:E)", ["gives a value.", "1 of 70 rows left out: row 73"]),
        ("=FIT_WHY(Orders.D4:D5;Orders.E4:E5)", ["FIT_WHY says: 1 usable row for 2 coefficients"]),
        ("=FIT_DURBIN_WATSON_BOUNDS(20;2;-5%)", ["gives #VALUE!.", "-0.05"]),
        ('=FIT_DURBIN_WATSON_P(Orders.D5:D30;Orders.E5:E30;"sideways")', ["gives #VALUE!.", "sideways"]),
        ("=FIT_VIF(OFFSET(Orders.E5;0;0;10;2))", ["the argument OFFSET(", "is itself computed"]),
        ("=FIT_VIF(#REF!.A1:A9)", ["Z1"]),
        ("=FIT_VIF({1;2;4|2;3;9})", ["Err:504", "not lists in braces"]),
        ("=FIT_DURBIN_WATSON(Orders.D5:D9;Orders.E5:E9;;Z3:Z7)", ["Err:504", "must hold no error value"]),
    ],
)
def test_what_is_said_of_a_formula(calc, orders, formula, sentences):
    outcome = ask(calc, orders, formula)
    assert outcome.text.startswith("Z1")
    for sentence in sentences:
        assert sentence in outcome.text


def test_a_cell_in_the_middle_of_an_array_formula(calc, orders):
    sheet = select(orders, "Rates", "AB3")
    type_formula(sheet, "AB1:AB6", "=FIT_LEVERAGE(Orders.D5:D10;Orders.E5:E10)")
    assert press(calc, orders, "why").text == "AB3: FIT_LEVERAGE gives its values."


@pytest.mark.parametrize(
    ("formula", "sentence"),
    [
        ("=SUM(1;2)", "Z1 holds no function of sheetfuncs. Select the one cell"),
        ("=FIT_NOTHING(1)", "LibreOffice does not know a function in Z1"),
    ],
)
def test_a_cell_without_a_function_of_ours(calc, orders, formula, sentence):
    outcome = ask(calc, orders, formula)
    assert not outcome.succeeded
    assert sentence in outcome.text


def test_the_state_of_things(calc, orders):
    outcome = press(calc, orders, "health")
    assert outcome.succeeded
    assert outcome.text.startswith("LibreOffice, the extension and sheetfuncs work together.")
    assert f"sheetfuncs {sheetfuncs.__version__}, in Python" in outcome.text


def test_the_state_of_things_names_other_versions(calc, orders):
    path = calc.folder / "settings.json"
    before = path.read_text("utf-8")
    try:
        path.write_text(before.replace(f'"{sheetfuncs.__version__}"', '"0.0.1"'), "utf-8")
        assert "different versions: close LibreOffice and run" in press(calc, orders, "health").text
        path.write_text("{}", "utf-8")
        assert "sheetfuncs calc install" in press(calc, orders, "health").text
    finally:
        path.write_text(before, "utf-8")


def test_going_to_the_sheet_that_was_made(calc, orders):
    select(orders, "Orders", "E20")
    assert press(calc, orders).succeeded
    assert where(orders)[0] == "Orders"
    pressed = Pressed(calc, orders, "show")
    pressed.dispatch.dispatch(pressed.url, ())
    assert where(orders)[0] == "Check of Orders"
