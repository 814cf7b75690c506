"""The checklist for a person with Excel says what is so: values, names of buttons, number of parts."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from fake_homes import place_on

from sheetfuncs.hosts.demo import templates_folder
from sheetfuncs.hosts.excel.addin import PROJECT_NAME
from sheetfuncs.hosts.excel.health import health
from sheetfuncs.hosts.excel.ribbon import BUTTONS, TAB_LABEL
from sheetfuncs.hosts.files import evaluate_cell

TEXT = (Path(__file__).parents[3] / "templates" / "excel-checklist.md").read_text("utf-8")
PROMISED = re.findall(r"`(=FIT_\w+\([^`]+)` must\s[^*]*\*\*([^*]+)\*\*", TEXT)


def value_on_orders(formula: str) -> object:
    formula = re.sub(r"\b[A-Z]+\d+:[A-Z]+\d+", lambda range_: f"Orders!{range_[0]}", formula)
    return evaluate_cell(formula, templates_folder() / "order-hours-unequal-spread.xlsx")


def test_there_are_all_kinds_of_values():
    assert [formula.partition("(")[0] for formula, _ in PROMISED] == [
        "=FIT_DURBIN_WATSON", "=FIT_COEFFICIENTS", "=FIT_WHY", "=FIT_DURBIN_WATSON", "=FIT_DURBIN_WATSON",
    ]


@pytest.mark.parametrize(("formula", "shown"), PROMISED)
def test_formula_gives_what_must_be_seen(formula, shown):
    value = value_on_orders(formula)
    if isinstance(value, list):
        assert f"{len(value)} rows and {len(value[0])} columns" == shown
        assert f"{value[1][0]}, {value[1][1]:.4f}." in " ".join(TEXT.split())
    elif isinstance(value, float):
        assert f"{value:.4f}" == shown
    else:
        assert str(value).startswith(shown)


def test_reason_of_the_error_is_the_one_that_the_button_gives():
    assert str(value_on_orders("=FIT_WHY(D5:D7,E5:G7)")).startswith("3 usable rows for 4 coefficients")


def test_names_are_those_on_the_screen(tmp_path):
    assert f"tab **{TAB_LABEL}** with {['no', 'one', 'two', 'three', 'four'][len(BUTTONS)]} buttons" in TEXT
    assert all(f"**{button.label}**" in TEXT for button in BUTTONS)
    assert f"choose {PROJECT_NAME}," in TEXT
    assert len(health(place_on("Windows", tmp_path))) == 9
    assert "nine lines" in TEXT


def test_steps_are_numbered_and_have_a_box():
    steps = re.findall(r"^(\d+)\. (\S)", TEXT, re.MULTILINE)
    assert steps == [(str(number), "☐") for number in range(1, len(steps) + 1)]
    assert len(steps) > 20
