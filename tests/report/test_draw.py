"""The drawn package: opens, holds no formula of the data's making, and its charts show cells of its own sheet."""

from __future__ import annotations

import io
import re

import numpy as np
import pytest
from lxml import etree
from openxml_audit import FileFormat, OpenXmlValidator
from report_cases import CASES, TITLE, drawn, opened, orders, parts, planned, twelve_terms

import sheetfuncs
from sheetfuncs.report.draw import draw_plan
from sheetfuncs.report.record import DECISION_FIELDS
from sheetfuncs.workbook import find_our_sheets

CHART = "{http://schemas.openxmlformats.org/drawingml/2006/chart}"
TEXT = "{http://schemas.openxmlformats.org/drawingml/2006/main}"


@pytest.fixture(scope="module", params=list(CASES))
def case(request):
    check = CASES[request.param]()
    plan = planned(check)
    return check, plan, drawn(plan)


def test_another_reader_finds_the_planned_values(case):
    _, plan, book = case
    sheet = opened(book, data_only=True)
    assert sheet.title == TITLE
    for cell in plan.cells:
        calculated = cell.formula is not None and isinstance(cell.value, float)
        expected = pytest.approx(cell.value, rel=1e-14) if calculated else cell.value
        assert sheet.cell(cell.row, cell.column).value == expected, cell
    for column in plan.columns:
        for place, value in enumerate(column.values):
            assert sheet.cell(column.row + place, column.column).value == value


def test_the_package_is_clean(case, tmp_path):
    path = tmp_path / "sheet.xlsx"
    path.write_bytes(case[2])
    findings = OpenXmlValidator(FileFormat.OFFICE_2019).validate(path)
    assert findings.is_valid, findings.errors


def test_only_planned_formulas_stand_in_cells(case):
    _, plan, book = case
    planned_formulas = {(cell.row, cell.column) for cell in plan.cells if cell.formula}
    found = {
        (cell.row, cell.column) for row in opened(book).iter_rows() for cell in row if cell.data_type == "f"
    }
    assert found == planned_formulas
    for cell in plan.cells:
        assert cell.formula is None or not re.search(r"!|\[|#", cell.formula)  # cells of this sheet, and nothing else


def test_charts_refer_to_their_own_sheet_only(case):
    _, plan, book = case
    charts = {name: data for name, data in parts(book).items() if name.startswith("xl/charts/chart")}
    assert len(charts) == len(plan.charts)
    for data in charts.values():
        root = etree.fromstring(data)
        references = [element.text for element in root.iter(CHART + "f")]
        assert references
        assert all(reference.startswith(f"'{TITLE}'!$") for reference in references)
        for series in root.iter(CHART + "ser"):
            assert series.find(f"{CHART}tx/{CHART}strRef/{CHART}f") is not None
        assert root.find(f"{CHART}chart/{CHART}title/{CHART}tx/{CHART}rich") is not None


@pytest.mark.parametrize("name", [
    "=cmd|' /C calc'!A0", "+1", "-1", "@SUM(1)", "http://example.com", "internal:A!B1", "{=1}", "x!A1 cost",
    "a" * 80, "עלות", "line\nbreak", "a&b<c>\"d\"",
])
def test_a_response_of_any_name_stays_a_text(name):
    series = np.random.default_rng(1)
    x = series.normal(size=30)
    frame = _frame(name, x + series.normal(size=30), x)
    check = sheetfuncs.check(frame[name], frame[["x"]])
    plan = planned(check)
    book = drawn(plan)
    sheet = opened(book)
    assert {cell.data_type for row in sheet.iter_rows() for cell in row if cell.value == name} == {"s"}
    links = re.findall(rb"<hyperlink [^>]*>", parts(book)["xl/worksheets/sheet1.xml"])
    assert links
    assert all(b"location=" in link and b"r:id=" not in link for link in links)
    for part, data in parts(book).items():
        if part.startswith("xl/charts/chart"):
            assert all(f.text.startswith(f"'{TITLE}'!$") for f in etree.fromstring(data).iter(CHART + "f"))


def _frame(name: str, y: np.ndarray, x: np.ndarray):
    import pandas

    return pandas.DataFrame({name: y, "x": x})


@pytest.mark.parametrize("title", ["Check of O'Neil", "Check of a!b", "Check of R1C1 & <x>", "检查", "x" * 31])
def test_titles_and_data_sheets_of_any_name(title):
    book = drawn(planned(orders(), title=title, data_sheet="It's #1 & <more>!"))
    sheet = opened(book)
    assert sheet.title == title
    jumps = {cell.hyperlink.location for row in sheet.iter_rows() for cell in row if cell.hyperlink}
    assert any(jump.startswith("'It''s #1 & <more>!'!B") for jump in jumps)
    own = "'" + title.replace("'", "''") + "'!"
    for part, data in parts(book).items():
        if part.startswith("xl/charts/chart"):
            references = [f.text for f in etree.fromstring(data).iter(CHART + "f")]
            assert all(reference.startswith((own, title + "!")) for reference in references)
    assert len(find_our_sheets(io.BytesIO(book))) == 1


def test_recognised_by_its_settings_whatever_their_length():
    check = twelve_terms()
    plan = planned(check)
    (ours,) = find_our_sheets(io.BytesIO(drawn(plan)))
    assert ours.settings == plan.settings
    names = opened(drawn(plan)).defined_names
    constants = [name for name in names if name.startswith("_sheetfuncs_settings_")]
    assert len(constants) > 1
    assert all(len(names[name].attr_text) <= 257 and names[name].hidden for name in constants)


def test_the_same_plan_gives_the_same_bytes():
    plan = planned(orders())
    assert drawn(plan) == drawn(plan)


def test_a_number_that_no_cell_holds_is_refused():
    plan = planned(orders())
    broken = type(plan)(**{**vars(plan), "cells": (*plan.cells, type(plan.cells[0])(
        900, 2, float("nan"), plan.cells[0].style))})
    with pytest.raises(ValueError, match="which no cell holds"):
        draw_plan(broken, io.BytesIO())


def test_the_record_is_kept_when_the_sheet_is_made_again():
    filled = {
        "decision": "Use it", "reason": "=1+1 is text here", "by": "K. Example", "date": 45000.0, "reviewed by": None,
    }
    first = planned(orders(), decision=filled)
    sheet = opened(drawn(first))
    read = {}
    for place, field in enumerate(DECISION_FIELDS, 1):
        target = sheet.defined_names[f"_sheetfuncs_decision_{place}"].attr_text
        read[field] = sheet[target.rpartition("!")[2].replace("$", "")].value
    assert {field: read[field] for field in filled if field != "date"} == {
        field: value for field, value in filled.items() if field != "date"
    }
    assert read["date"].isoformat() == "2023-03-15T00:00:00"  # day 45,000 of the 1900 system
    again = planned(orders(), decision={**read, "date": 45000.0})
    assert again.cells == first.cells


def test_a_change_of_the_data_since_the_decision_is_said():
    first = planned(orders())
    said = "The used data have changed since this record was filled in."
    record = {"decision": "Use it", "data": first.settings["fingerprint"]}
    assert not _says(planned(orders(), decision=record), said)
    changed = planned(orders(intercept=True, n=59), decision=record)
    assert _says(changed, said)
    assert not _says(planned(orders(n=59), decision={"data": record["data"]}), said)  # nothing was decided


def _says(plan, text: str) -> bool:
    return any(text in str(cell.value) for cell in plan.cells)


def test_page_setup():
    plan = planned(orders())
    sheet = opened(drawn(plan))
    assert sheet.page_setup.orientation == "landscape"
    assert sheet.page_setup.fitToWidth is None or sheet.page_setup.fitToWidth == 1
    assert sheet.page_setup.fitToHeight == 0
    assert "&P" in sheet.oddFooter.right.text or "Page" in sheet.oddFooter.right.text
    assert not sheet.sheet_view.showGridLines
    assert sheet.freeze_panes == "A3"
