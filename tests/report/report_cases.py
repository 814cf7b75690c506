"""Checks to draw, all of invented numbers."""

from __future__ import annotations

import io
import zipfile
from collections.abc import Callable
from typing import Any

import numpy as np
import openpyxl

import sheetfuncs
from sheetfuncs.checking import Check
from sheetfuncs.report.draw import draw_plan
from sheetfuncs.report.elements import SheetPlan
from sheetfuncs.report.plan import plan_sheet

TITLE, SHEET, AREA = "Check of Orders", "Orders", "B3:E64"


def orders(n: int = 60, **options: Any) -> Check:
    """Hours from weight and holes, with errors that grow, one row that pulls, and two rows with blanks."""
    draws = np.random.default_rng(7)
    weight, holes = draws.uniform(2, 40, n).round(1), draws.integers(2, 30, n).astype(float)
    hours = 1.2 + 0.31 * weight + 0.14 * holes + draws.normal(0, 1, n) * 0.03 * weight
    hours[20] += 9.0
    weight[4], holes[33] = np.nan, np.nan
    return sheetfuncs.check(hours, [weight, holes], names=["Weight (kg)", "Holes"], **options)


def one_predictor() -> Check:
    x = np.arange(1.0, 31.0)
    return sheetfuncs.check(2 + 3 * x + np.cos(x * x), x, names=["x"])


def without_intercept() -> Check:
    return orders(intercept=False)


def categories() -> Check:
    draws = np.random.default_rng(8)
    site = np.array(["north", "south", "east"], object)[draws.integers(0, 3, 50)]
    weight = draws.uniform(1, 9, 50)
    day = draws.permutation(50).astype(float)
    return sheetfuncs.check(weight + (site == "north") + draws.normal(size=50), [site, weight],
                            names=["Site", "Weight"], order=day)


def twelve_terms() -> Check:
    draws = np.random.default_rng(9)
    x = draws.normal(size=(80, 12))
    x[:, 5] = x[:, 4] + 0.1 * draws.normal(size=80)
    names = ["=1+1", "+SUM(A1)", "@x", "-2", "http://example.com", "mailto:a@example.com", "internal:Sheet1!A1",
             "משקל החלק", "重量（千克）", "{=1}", "x!A1 y",
             "a name that goes on and on for a good deal more than sixty characters, as some do"]
    return sheetfuncs.check(1e6 * (x.sum(axis=1) + draws.normal(size=80)), list(x.T), names=names)


def moving_together() -> Check:
    """Two pairs of columns that nearly determine each other, and one far from zero beside its variation."""
    draws = np.random.default_rng(14)
    n = 60
    length, mass = draws.normal(size=n), draws.normal(size=n)
    columns = [length, length + 0.01 * draws.normal(size=n), mass, mass + 0.01 * draws.normal(size=n),
               500 + draws.normal(size=n)]
    names = ["Length of the part as drawn (mm)", "Length of the part as measured (mm)", "Mass, dry (kg)",
             "Mass, wet (kg)", "Kiln temperature (K)"]
    return sheetfuncs.check(length + mass + draws.normal(size=n), columns, names=names)


def perfect() -> Check:
    x = np.arange(1.0, 21.0)
    return sheetfuncs.check(2 + 3 * x, x, names=["x"])


def saturated() -> Check:
    return sheetfuncs.check([1.0, 2.0, 4.0], [np.array([1.0, 2.0, 3.0]), np.array([1.0, 0.0, 2.0])], names=["a", "b"])


def leverage_one() -> Check:
    draws = np.random.default_rng(10)
    only = np.zeros(25)
    only[3] = 1.0
    x = draws.normal(size=25)
    return sheetfuncs.check(x + draws.normal(size=25), [x, only], names=["x", "only row 4"])


def four_rows() -> Check:
    return sheetfuncs.check([1.0, 2.0, 2.5, 4.4], [np.array([1.0, 2.0, 3.0, 4.0])], names=["x"])


def offset_and_scale() -> Check:
    draws = np.random.default_rng(11)
    x = draws.normal(size=40)
    return sheetfuncs.check(1e-9 * (x + draws.normal(size=40)), 1e9 + x, names=["x"])


CASES: dict[str, Callable[[], Check]] = {
    function.__name__: function
    for function in (
        orders, one_predictor, without_intercept, categories, twelve_terms, moving_together, perfect, saturated,
        leverage_one, four_rows, offset_and_scale,
    )
}


def planned(check: Check, **options: Any) -> SheetPlan:
    return plan_sheet(check, **{"title": TITLE, "data_sheet": SHEET, "data_area": AREA, **options})


def drawn(plan: SheetPlan) -> bytes:
    out = io.BytesIO()
    draw_plan(plan, out)
    return out.getvalue()


def opened(book: bytes, **options: Any) -> Any:
    """The only worksheet of a package, as an independent reader sees it."""
    return openpyxl.load_workbook(io.BytesIO(book), **options).worksheets[0]


def parts(book: bytes) -> dict[str, bytes]:
    with zipfile.ZipFile(io.BytesIO(book)) as package:
        return {name: package.read(name) for name in package.namelist()}


def row_of(plan: SheetPlan, text: str) -> int:
    """The row of the first cell with this text."""
    return next(cell.row for cell in plan.cells if cell.value == text)


def values_in(plan: SheetPlan, row: int) -> list[Any]:
    """What stands on a row, from left to right."""
    cells = sorted((cell.column, cell.value) for cell in plan.cells if cell.row == row and cell.value is not None)
    return [value for _, value in cells]
