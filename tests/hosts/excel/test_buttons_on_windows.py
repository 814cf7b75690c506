"""The buttons as the add-in starts them on Windows: xlwings' real server and Windows side, over the program in memory.

pywin32 is a stub. Below it stand objects with the names and habits of Excel's own (memory_com.py).
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

import sheetfuncs

HERE = Path(__file__).parent
DONE = "The check of “Jobs” is in the sheet “Check of Jobs” ({} rows used{})."


@pytest.fixture(scope="module")
def scenes():
    environment = {**os.environ, "PYTHONPATH": str(Path(sheetfuncs.__file__).parent.parent)}
    program = [sys.executable, "-W", "error", str(HERE / "buttons_inside.py")]
    run = subprocess.run(program, capture_output=True, text=True, env=environment)
    assert run.returncode == 0, run.stderr
    return json.loads(run.stdout)


def test_every_press_ends_in_one_message_and_leaves_excel_as_it_was(scenes):
    for scene in scenes.values():
        for press in scene["pressed"]:
            assert len(press["said"]) == 1
            assert press["held"] == [True, True, True, False]
            assert (press["seen"], press["left"]) == ([], [])
        assert scene["books"] == 1


@pytest.mark.parametrize(
    ("scene", "area", "response", "predictors", "rows", "left_out"),
    [
        ("selection", "B3:D33", "Cost", ["Weight", "Holes"], 30, ""),
        ("our_sheet", "B3:D33", "Cost", ["Weight", "Holes"], 30, ""),
        ("table", "B3:D33", "Cost", ["Weight", "Holes"], 30, ""),
        ("columns", "B:D", "Holes", ["Cost"], 30, ""),
        ("whole_sheet", "A1:D33", "Cost", ["Weight", "Holes"], 30, ""),
        ("names_lost", "B3:D33", "Cost", ["Weight", "Holes"], 30, ""),
        ("awkward", "B3:E33", "Cost", ["Weight", "Holes"], 29, ", 1 left out"),
    ],
)
def test_the_sheet_comes_in_behind_the_data(scenes, scene, area, response, predictors, rows, left_out):
    found = scenes[scene]
    assert found["pressed"][-1]["said"][0].startswith(DONE.format(rows, left_out))
    assert found["titles"] == ["Notes", "Jobs", "Check of Jobs", "Later"]
    assert found["in_front"] == ("Check of Jobs" if scene == "our_sheet" else "Jobs")
    settings = found["settings"]
    assert (settings["area"], settings["response"], settings["predictors"]) == (area, response, predictors)
    assert found["hidden"]
    assert all(found["hidden"])


def test_dates_are_the_order_and_hidden_rows_are_counted(scenes):
    assert scenes["awkward"]["settings"]["order"] == "Day"
    assert "2 used rows are hidden or filtered out, and counted like the others." in scenes["awkward"]["texts"]


def test_formulas_that_point_at_the_sheet_are_kept(scenes):
    found = scenes["selection"]
    assert "='Check of Jobs'!B5" in found["notes"]
    assert found["names"] == ["='Check of Jobs'!$B$5"]
    assert found["pressed"][1]["said"][0].endswith("have to be entered again: Notes!A6.")


def test_what_is_no_data_gets_a_sentence(scenes):
    assert scenes["chart"]["pressed"][0]["said"][0].startswith("No cells are selected")
    assert scenes["chart"]["titles"] == ["Notes", "Jobs", "Later"]


def test_a_value_is_explained(scenes):
    said = scenes["why"]["pressed"][0]["said"][0]
    assert said.startswith("Jobs!H40: FIT_VIF gives #VALUE!. Jobs!C10")
    assert "“heavy”" in said
