"""Milliseconds of a function call inside LibreOffice Calc: the first one on a range, and further ones.

    python tests/benchmarks/calc_calls.py

A private profile gets the extension, whose unpacked copy is made to log how long each call took. "marshalling" is
LibreOffice handing the cells over to Python (getDataArray) and nothing else; "built-in" is LINEST, and SUMSQ, on the
same cells, timed around a recalculation. The least of several rounds, since others may use the machine too.
"""

from __future__ import annotations

import statistics
import sys
import tempfile
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parents[1] / "hosts" / "calc"))
sys.path.insert(0, str(Path(__file__).parents[2]))

from office import Calc, installed_profile, type_formula

SIZES = ((60, 3), (5_000, 5), (100_000, 5))
FORMULAS = 20
ROUNDS = 7
LOGGING = '''
import gc, os, time
from sheetfuncs_bridge import recalculation as _recalculation
_LOG, _MARSHALLING = {log!r}, {marshalling!r}
_call, _read = calls.call, _recalculation.read_block


def _write(kind, start):
    with open(_LOG, "a") as log:
        log.write(kind + " " + repr(time.perf_counter() - start) + chr(10))


def _timed_call(*given):
    start = time.perf_counter()
    value = _call(*given)
    _write("call", start)
    return value


def _timed_marshalling(cells, document=None):
    if os.path.exists(_MARSHALLING):
        gc.disable()  # as the bridge reads
        start = time.perf_counter()
        cells.getDataArray()
        _write("marshalling", start)
        gc.enable()
    return _read(cells, document)


calls.call, _recalculation.read_block = _timed_call, _timed_marshalling
'''


def main() -> None:
    """Print one line a size."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        calc = Calc(installed_profile(folder))
        log, switch = folder / "log", folder / "switch"
        component = calc.folder / "component.py"
        component.write_text(component.read_text() + LOGGING.format(log=str(log), marshalling=str(switch)))
        calc.restart()
        try:
            print(f"{'rows x columns':>15} {'first':>8} {'further':>8} {'marshalling':>12} {'first / marshalling':>20}"
                  f" {'LINEST':>8} {'SUMSQ':>8}")
            for rows, columns in SIZES:
                measure(calc, rows, columns, log, switch)
        finally:
            calc.stop()


def measure(calc: Calc, rows: int, columns: int, log: Path, switch: Path) -> None:
    """One line of figures for a sheet of this size."""
    document = calc.new_document()
    sheet = document.Sheets.getByIndex(0)
    fill_with_numbers(sheet, rows, columns)
    response, predictors = f"A1:A{rows}", f"B1:{chr(64 + columns)}{rows}"
    built_in = [timed_alone(document, sheet, formula) for formula in
                (f"=LINEST({response};{predictors};TRUE();TRUE())", f"=SUMSQ(A1:{chr(64 + columns)}{rows})")]
    for place in range(FORMULAS):
        type_formula(sheet, f"H{place + 1}", f"=FIT_DURBIN_WATSON({response};{predictors})")
    firsts, further, marshalling = [], [], []
    for round_ in range(ROUNDS):
        times = recalculated(document, sheet, log, "call", 1.0 + round_)
        firsts.append(times[0])
        further.append(statistics.median(times[1:FORMULAS]))
        switch.touch()
        marshalling.append(sum(recalculated(document, sheet, log, "marshalling", 100.0 + round_)[:2]))
        switch.unlink()
    document.close(True)
    first, more, cells = (1e3 * min(times) for times in (firsts, further, marshalling))
    print(f"{rows:>9,} x {columns:<3} {first:8.2f} {more:8.2f} {cells:12.2f} {first / cells:20.2f}"
          f" {built_in[0]:8.2f} {built_in[1]:8.2f}", flush=True)


def recalculated(document, sheet, log: Path, kind: str, value: float) -> list[float]:
    """Seconds of each logged line of this kind after one data cell got another value."""
    sheet.getCellByPosition(0, 7).Value = value
    log.unlink(missing_ok=True)
    document.calculateAll()
    lines = [line.split() for line in log.read_text().splitlines()]
    return [float(seconds) for name, seconds in lines if name == kind]


def fill_with_numbers(sheet: object, rows: int, columns: int) -> None:
    """Invented numbers; handed over in pieces, since one message of everything would be large."""
    for start in range(0, rows, 20_000):
        stop = min(rows, start + 20_000)
        cells = sheet.getCellRangeByPosition(0, start, columns - 1, stop - 1)  # type: ignore[attr-defined]
        cells.setDataArray(tuple(
            tuple(float((row * (7 + column) * 7919 + column) % 1009) / 100 for column in range(columns))
            for row in range(start, stop)
        ))


def timed_alone(document, sheet, formula: str) -> float:
    """Milliseconds of a recalculation in which this is the only formula, less that of an empty one."""
    def once() -> float:
        start = time.perf_counter()
        document.calculateAll()
        return 1e3 * (time.perf_counter() - start)

    empty = min(once() for _ in range(ROUNDS))
    cell = type_formula(sheet, "H1", formula)
    assert cell.getError() == 0, formula
    taken = min(once() for _ in range(ROUNDS)) - empty
    cell.setFormula("")
    return taken


if __name__ == "__main__":
    main()
