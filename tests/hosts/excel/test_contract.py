"""Every worksheet function through xlwings' real server, udfs and conversion, fed with what Excel sends.

pywin32 and the rest of Windows are stubs (windows_stubs.py); what stands between them and our code is xlwings' own.
"""

from __future__ import annotations

import json
import math
import os
import subprocess
import sys
from pathlib import Path

import pytest
from contract_cases import cases, meaning

import sheetfuncs
from sheetfuncs.functions.registry import REGISTRY

HERE = Path(__file__).parent


@pytest.fixture(scope="module")
def inside():
    """What the calls gave, in a process that believes to be on Windows."""
    environment = {**os.environ, "PYTHONPATH": str(Path(sheetfuncs.__file__).parent.parent)}
    environment.pop("XLWINGS_LICENSE_KEY", None)
    run = subprocess.run(
        [sys.executable, "-W", "error", str(HERE / "contract_inside.py")], capture_output=True, text=True,
        env=environment,
    )
    assert run.returncode == 0, run.stderr
    assert "Other Excels" not in run.stdout
    return json.loads(run.stdout)


def as_vba_sees(result):
    """One value for one cell, a flat list for one row, "" for an empty cell."""
    if not isinstance(result, list):
        return result
    rows = [["" if cell is None else cell for cell in row] for row in result]
    return rows if len(rows) > 1 else rows[0][0] if len(rows[0]) == 1 else rows[0]


def same(one, other):
    """Equal, numbers but for the last digits: sums may be formed in another order in another process."""
    if isinstance(one, list) and isinstance(other, list):
        return len(one) == len(other) and all(map(same, one, other))
    if isinstance(one, float) and isinstance(other, float):
        return math.isclose(one, other, rel_tol=1e-10, abs_tol=1e-12)
    return type(one) is type(other) and one == other


@pytest.mark.parametrize("name", REGISTRY)
def test_a_cell_gets_what_evaluate_gives(inside, name):
    answers = inside["answers"][name]
    expected = {
        title: as_vba_sees(sheetfuncs.evaluate(name, *map(meaning, given))) for title, given in cases(name)
    }
    assert answers.keys() == expected.keys()
    for title in expected:
        assert same(answers[title], expected[title]), (title, answers[title], expected[title])


@pytest.mark.parametrize("name", REGISTRY)
def test_the_cases_reach_values_and_every_kind_of_refusal(inside, name):
    """So that the comparison above compares something: plain ranges give values, spoilt ones error values."""
    answers = inside["answers"][name]
    assert not str(answers["ranges of numbers"]).startswith("#")
    assert not any("Traceback" in str(answer) for answer in answers.values())
    if "predictors" in [argument.name for argument in REGISTRY[name].arguments] and name != "FIT_WHY":
        assert answers["a range that is gone"] == "#REF!"
        assert answers["no range"] == answers["several areas at once"] == "#VALUE!"


@pytest.mark.parametrize("name", REGISTRY)
def test_xlwings_would_wrap_each_function_with_its_own_name_and_arguments(inside, name):
    function = REGISTRY[name]
    signature = ", ".join(("Optional " if one.optional else "") + one.name for one in function.arguments)
    names = ", ".join(one.name for one in function.arguments)
    assert f"Function {name}({signature})" in inside["wrappers"]
    assert f'XLPy.CallUDF("sheetfuncs.hosts.excel.functions", "{name}", Array({names}), ' in inside["wrappers"]


@pytest.mark.parametrize("name", REGISTRY)
def test_help_and_reading_options_of_each_function(inside, name):
    function, found = REGISTRY[name], inside["help"][name]
    assert found["doc"] == function.summary
    assert found["category"] == "sheetfuncs"
    assert found["arguments"] == [
        [one.name, one.help, one.optional, 2 if one.kind == "range" else None, True] for one in function.arguments
    ]


def test_a_button_finds_its_macro_and_its_workbook(inside):
    assert json.loads(inside["macros"]) == [
        ["Invented jobs.xlsx", job] for job in ("_check_selection", "_check_again", "_why_this_value", "_show_health")
    ]


def test_nothing_of_xlwings_commercial_part_is_used(inside):
    assert inside["pro"] == []
    assert inside["licensed"] is False
