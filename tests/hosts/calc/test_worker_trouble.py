"""The worker may be killed, hang, or lose its Python: the right value, or an error and a sentence; nothing freezes."""

from __future__ import annotations

import json
import os
import shutil
import signal
import threading
import time
from pathlib import Path

import pytest
from office import Calc, fill, type_formula, wait_for

import sheetfuncs

pytestmark = pytest.mark.libreoffice

ROWS = [[1.0, 1.0], [2.5, 2.0], [2.0, 3.0], [4.5, 4.0], [4.0, 5.0], [6.5, 6.0]]
EXPECTED = sheetfuncs.evaluate("FIT_DURBIN_WATSON", [[y] for y, _ in ROWS], [[x] for _, x in ROWS])
FORMULA = "=FIT_DURBIN_WATSON(A1:A6;B1:B6)"


@pytest.fixture
def sheet(calc, document):
    """The functions' worker alone runs, whatever other tests left."""
    for worker in calc.workers():
        os.kill(worker, signal.SIGKILL)
    wait_for(lambda: not calc.workers(), "no worker runs")
    sheet = document.Sheets.getByIndex(0)
    fill(sheet, "A1:B6", ROWS)
    assert type_formula(sheet, "D1", FORMULA).Value == pytest.approx(EXPECTED, rel=1e-12)
    return sheet


@pytest.fixture
def settings(calc):
    """Change the extension's settings for one test; they are read anew for each request."""
    path = calc.folder / "settings.json"
    before = path.read_text("utf-8")

    def change(**values):
        path.write_text(json.dumps({**json.loads(before), **values}), "utf-8")

    yield change
    path.write_text(before, "utf-8")


def test_killed_while_idle(calc, document, sheet):
    (worker,) = calc.workers()
    os.kill(worker, signal.SIGKILL)
    document.calculateAll()
    assert sheet.getCellRangeByName("D1").Value == pytest.approx(EXPECTED, rel=1e-12)
    assert calc.workers() != [worker]


def test_killed_in_the_middle_of_a_call(calc, document, sheet):
    (worker,) = calc.workers()
    os.kill(worker, signal.SIGSTOP)  # the call begins, and gets no answer
    killer = threading.Timer(0.7, os.kill, (worker, signal.SIGKILL))
    killer.start()
    try:
        document.calculateAll()
        assert not killer.is_alive()
        assert sheet.getCellRangeByName("D1").Value == pytest.approx(EXPECTED, rel=1e-12)
    finally:
        killer.join()


def test_a_worker_that_hangs_is_waited_for_once(calc, document, sheet, settings):
    """The first formula meets the limit, and the others of this recalculation do not wait again."""
    settings(seconds=1.0)
    for row in range(1, 8):
        type_formula(sheet, f"E{row}", FORMULA)
    (worker,) = calc.workers()
    os.kill(worker, signal.SIGSTOP)
    document.calculateAll()
    found = [sheet.getCellRangeByName(f"E{row}").getError() for row in range(1, 8)]
    assert found == [519] * 7
    wait_for(lambda: worker not in calc.workers(), "the worker that hung is ended")
    wait_for(lambda: _recalculated(document, sheet), "the next recalculation has its values again")


def _recalculated(document, sheet) -> bool:
    document.calculateAll()
    return sheet.getCellRangeByName("E7").Value == pytest.approx(EXPECTED, rel=1e-12)


def test_the_interpreter_is_gone(calc, document, sheet, settings):
    settings(interpreter=str(calc.folder / "python-that-was-removed"))
    os.kill(calc.workers()[0], signal.SIGKILL)
    wait_for(lambda: not calc.workers(), "the worker has ended")
    document.calculateAll()
    assert sheet.getCellRangeByName("D1").getError() == 519
    settings()
    wait_for(lambda: _value_again(document, sheet), "values come again")


def _value_again(document, sheet) -> bool:
    document.calculateAll()
    return sheet.getCellRangeByName("D1").Value == pytest.approx(EXPECTED, rel=1e-12)


def test_the_window_says_why_there_are_no_values(calc, settings):
    """In a document with a window: a bar above the sheet, which goes when values come again."""
    document = calc.new_document(Hidden=False)
    try:
        sheet, controller = document.Sheets.getByIndex(0), document.CurrentController
        fill(sheet, "A1:B6", ROWS)
        settings(interpreter="/nowhere/python")
        for worker in calc.workers():
            os.kill(worker, signal.SIGKILL)
        controller.Frame.activate()
        cell = type_formula(sheet, "D1", FORMULA)
        assert cell.getError() == 519
        wait_for(lambda: controller.hasInfobar("org.sheetfuncs.calc.trouble"), "a bar says it")
        settings()
        wait_for(lambda: _bar_gone(document, controller), "the bar is gone")
        assert cell.Value == pytest.approx(EXPECTED, rel=1e-12)
    finally:
        document.close(True)


def _bar_gone(document, controller) -> bool:
    document.calculateAll()
    time.sleep(0.1)
    return not controller.hasInfobar("org.sheetfuncs.calc.trouble")


@pytest.mark.parametrize("end", ["killed", "closed"])
def test_no_process_is_left_behind(calc, tmp_path, end):
    profile = shutil.copytree(calc.profile, tmp_path / "profile", ignore=shutil.ignore_patterns(".lock"))
    other = Calc(profile)
    try:
        document = other.new_document()
        fill(document.Sheets.getByIndex(0), "A1:B6", ROWS)
        cell = type_formula(document.Sheets.getByIndex(0), "D1", FORMULA)
        assert cell.Value == pytest.approx(EXPECTED, rel=1e-12)
        (worker,) = other.workers()
        if end == "killed":
            other.office.process.kill()
            assert other.office.wait(20)
        else:
            document.close(True)
            other.stop()
        wait_for(lambda: _is_gone(worker), "the worker has ended")
    finally:
        other.office.stop()


def _is_gone(pid: int) -> bool:
    try:
        return Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split()[0] == "Z"  # ended, not yet collected
    except OSError:
        return True
