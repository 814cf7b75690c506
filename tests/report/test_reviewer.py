"""The cross-check: native formulas, recalculated by another program, give the values that are stored beside ours."""

from __future__ import annotations

import io
import re
import shutil
import subprocess
import zipfile

import numpy as np
import openpyxl
import pytest
from openpyxl.worksheet.formula import ArrayFormula
from report_cases import CASES, TITLE, categories, drawn, opened, orders, parts, planned, row_of, saturated, values_in

from sheetfuncs.report.reviewer import AGREEMENT

ORDERED = ["orders", "one_predictor", "without_intercept", "categories", "twelve_terms", "leverage_one", "four_rows",
           "offset_and_scale"]


@pytest.fixture(scope="module")
def recalculated(tmp_path_factory):
    """Every case's sheet, calculated again and saved by LibreOffice: {case: {cell: value}}, and what was stored."""
    folder = tmp_path_factory.mktemp("recalculated")
    stored = {}
    for name in ORDERED:
        book = _without_stored_values(drawn(planned(CASES[name]())))
        (folder / f"{name}.xlsx").write_bytes(book)
        stored[name] = _formula_cells(drawn(planned(CASES[name]())))
    # A private profile, so that a running office, or one that starts beside this, is no matter.
    profile = (folder / "profile").as_uri()
    out = folder / "out"
    subprocess.run(
        ["soffice", f"-env:UserInstallation={profile}", "--headless", "--convert-to", "xlsx:Calc MS Excel 2007 XML",
         "--outdir", str(out), *(str(folder / f"{name}.xlsx") for name in ORDERED)],
        check=True, capture_output=True, timeout=240,
    )
    found = {name: openpyxl.load_workbook(out / f"{name}.xlsx", data_only=True)[TITLE] for name in ORDERED}
    shutil.rmtree(folder / "profile", ignore_errors=True)
    return {
        name: {cell: (value, found[name][cell].value) for cell, value in cells.items()}
        for name, cells in stored.items()
    }


def _formula_cells(book: bytes) -> dict[str, object]:
    formulas, values = opened(book), opened(book, data_only=True)
    return {
        cell.coordinate: values[cell.coordinate].value for row in formulas.iter_rows() for cell in row
        if cell.data_type == "f" or isinstance(cell.value, ArrayFormula)
    }


def _without_stored_values(book: bytes) -> bytes:
    """The package with every formula's stored value taken out: whatever comes back was calculated."""
    contents = parts(book)
    sheet = contents["xl/worksheets/sheet1.xml"]
    contents["xl/worksheets/sheet1.xml"], count = re.subn(rb"(<f[^>]*>[^<]*</f>)<v>[^<]*</v>", rb"\1", sheet)
    assert count == sheet.count(b"<f") - sheet.count(b"<formula")
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as package:
        for name, data in contents.items():
            package.writestr(name, data)
    return out.getvalue()


@pytest.mark.libreoffice
@pytest.mark.parametrize("name", ORDERED)
def test_recalculated_by_libreoffice(recalculated, name):
    check = CASES[name]()
    assert len(recalculated[name]) >= 3 * len(check.design.terms)
    scale = float(np.abs(check.fit.coefficients).max()) + check.fit.sigma
    for cell, (stored, calculated) in recalculated[name].items():
        if isinstance(stored, str):
            assert calculated == stored == "agrees", cell
        else:
            assert calculated == pytest.approx(stored, rel=1e-9, abs=1e-9 * scale), cell


@pytest.mark.parametrize("name", ORDERED)
def test_stored_values_agree_with_the_fit(name):
    plan = planned(CASES[name]())
    verdicts = [cell.value for cell in plan.cells if cell.formula and isinstance(cell.value, str)]
    assert verdicts
    assert set(verdicts) == {"agrees"}


def test_a_wrong_figure_would_be_seen():
    """The values stored with the formulas come from the copy, not from the fit."""
    check = orders()
    check.fit.coefficients[1] *= 1 + 10 * AGREEMENT
    plan = planned(check)
    row = next(cell.row for cell in plan.cells if cell.value == "Coefficient of Weight (kg)")
    assert values_in(plan, row)[-1] == "differs"


def test_the_copy_stands_in_time_order():
    check = categories()
    plan = planned(check)
    copy = row_of(plan, "Copy of the used rows")
    rows = next(column for column in plan.columns if column.row > copy)
    assert list(rows.values) == check.design.rows[check.design.order].tolist()
    assert list(rows.values) != sorted(rows.values)


def test_without_error_bars_only_coefficients_are_compared():
    plan = planned(saturated())
    formulas = [cell.formula for cell in plan.cells if cell.formula]
    assert any("LINEST" in formula for formula in formulas)
    assert not any("SUMXMY2" in formula for formula in formulas)
