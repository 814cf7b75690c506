"""Every worksheet function, typed into a cell of a real LibreOffice, gives what `sheetfuncs.evaluate` gives."""

from __future__ import annotations

import pytest
from office import fill, type_formula

import sheetfuncs

pytestmark = pytest.mark.libreoffice


def test_durbin_watson(document):
    sheet = document.Sheets.getByIndex(0)
    rows = [[1.0, 1.0], [2.5, 2.0], [2.0, 3.0], [4.5, 4.0]]
    fill(sheet, "A1:B4", rows)
    cell = type_formula(sheet, "D1", "=FIT_DURBIN_WATSON(A1:A4;B1:B4)")
    expected = sheetfuncs.evaluate("FIT_DURBIN_WATSON", [[y] for y, _ in rows], [[x] for _, x in rows])
    assert cell.Value == pytest.approx(expected, rel=1e-12)
