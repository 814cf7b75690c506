"""What Excel sends and takes, cell by cell; and the functions where nothing but Python is there."""

from __future__ import annotations

import inspect
import math
import subprocess
import sys
from datetime import UTC, datetime
from decimal import Decimal

import numpy as np
import openpyxl.utils.datetime as openpyxl_dates
import pytest

import sheetfuncs
from sheetfuncs.functions.registry import REGISTRY
from sheetfuncs.hosts.excel import functions, values

# Excel's type library, XlCVError: 2000 to 2042; as a VARIANT of type error they come as 0x800A0000 plus that number.
PUBLISHED_ERRORS = {
    -2146826288: "#NULL!", -2146826281: "#DIV/0!", -2146826273: "#VALUE!", -2146826265: "#REF!", -2146826259: "#NAME?",
    -2146826252: "#NUM!", -2146826246: "#N/A",
}


def test_error_numbers_become_the_texts_of_their_errors():
    assert [values.as_cell(number) for number in PUBLISHED_ERRORS] == list(PUBLISHED_ERRORS.values())
    assert values.as_cell(-2146826100) == "#UNKNOWN!"  # of a version yet to come
    assert values.as_cell(-2146828289) == -2146828289.0


@pytest.mark.parametrize("moment", [datetime(1900, 3, 1), datetime(1999, 12, 31, 18), datetime(2026, 11, 30, 7, 30, 1)])
def test_dates_are_the_serial_numbers_that_openpyxl_gives(moment):
    assert values.serial_of(moment) == pytest.approx(openpyxl_dates.to_excel(moment), abs=1e-9)
    in_1904 = openpyxl_dates.to_excel(moment, openpyxl_dates.MAC_EPOCH)
    if moment.year > 1904:
        assert values.serial_of(moment, date1904=True) == pytest.approx(in_1904, abs=1e-9)


def test_a_time_zone_is_cut_off_and_a_time_is_a_part_of_a_day():
    assert values.serial_of(datetime(2026, 1, 1, 12, tzinfo=UTC)) == 46023.5
    assert values.serial_of(datetime(1899, 12, 30, 6)) == 0.25


@pytest.mark.parametrize(
    ("given", "rows"),
    [
        (None, None),
        (5.0, [[5.0]]),
        ("", [[None]]),
        (True, [[True]]),
        (-2146826265, "#REF!"),
        ((1.0, None, "a"), [[1.0, None, "a"]]),
        (((1.0,), (Decimal("2.5"),)), [[1.0], [2.5]]),
        ([[datetime(2026, 1, 1)], [object()]], [[46023.0], [None]]),
        ((), []),
    ],
)
def test_a_range_as_rows(given, rows):
    assert values.as_rows(given) == rows


def test_results_in_the_shape_that_excel_takes():
    assert values.for_excel(None) == ""
    assert values.for_excel(math.inf) == "#NUM!"
    assert values.for_excel([[np.float64(1.5), None], [True, "#N/A"], [math.nan, 3]]) == [
        [1.5, ""], [True, "#N/A"], ["#NUM!", 3.0],
    ]
    assert type(values.for_excel(np.float64(1.5))) is float


def test_one_function_for_each_entry_of_the_registry_and_no_more():
    made = {name for name in vars(functions) if name.startswith("FIT_")}
    assert made == set(REGISTRY)
    for name, declared in REGISTRY.items():
        signature = inspect.signature(getattr(functions, name))
        assert list(signature.parameters) == [argument.name for argument in declared.arguments]
        omitted = [one.name for one in signature.parameters.values() if one.default is None]
        assert omitted == [argument.name for argument in declared.arguments if argument.optional]


def test_a_failure_that_nobody_foresaw_is_an_error_value_and_its_sentence_is_kept(monkeypatch):
    def broken(*args, **options):
        raise RuntimeError("the roof\nis off")

    monkeypatch.setattr(functions, "evaluate", broken)
    assert functions.FIT_VIF(((1.0, 2.0),)) == "#VALUE!"
    kept = functions.unexpected_failure("FIT_VIF")
    assert kept is not None
    assert "RuntimeError: the roof is off" in kept
    assert "\n" not in kept
    assert functions.unexpected_failure("FIT_PRESS") is None


def test_arguments_too_many_are_an_error_value_too():
    assert functions.FIT_VIF(((1.0, 2.0),), None, None, 5.0) == "#VALUE!"


def test_without_windows_the_module_loads_and_xlwings_commercial_part_stays_out():
    program = (
        "from sheetfuncs.hosts.excel import functions, macros\n"
        "import sys, xlwings\n"
        "assert functions.FIT_RESIDUAL_MEAN(((1.,), (2.,), (4.,)), ((1.,), (2.,), (3.,))) < 1e-12\n"
        "print('xlwings.pro' in sys.modules, xlwings.__pro__)"
    )
    run = subprocess.run([sys.executable, "-W", "error", "-c", program], capture_output=True, text=True,
                         cwd=sheetfuncs.__path__[0] + "/..", env={})
    assert (run.stdout, run.stderr) == ("False False\n", "")
