"""The stored add-in and the workbook with our functions in cells: rebuilt, compared, and read by others.

The add-in is built here for the version of xlwings that the stored one was built for, whichever is installed. With
another version of pyopenvba the VBA project may be packed otherwise: then its modules are compared, not its bytes.
"""

from __future__ import annotations

import importlib
import io
import math
import sys
import warnings
import zipfile
from importlib.metadata import version
from itertools import chain
from pathlib import Path

import openpyxl
import pytest
from lxml import etree
from openxml_audit import FileFormat, OpenXmlValidator

from sheetfuncs.functions.registry import REGISTRY
from sheetfuncs.hosts.excel.addin import addin_versions, build_addin
from sheetfuncs.hosts.files import evaluate_cell

TEMPLATES = Path(__file__).parents[2] / "templates"
ADDIN, BOOK = TEMPLATES / "sheetfuncs.xlam", TEMPLATES / "order-hours-functions.xlsm"
AGAIN = "run templates/build_excel_addin.py and look at the difference"
MAIN = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}"


def parts(file):
    with zipfile.ZipFile(file) as package:
        return {item.filename: package.read(item) for item in package.infolist()}


def vba(file):
    from pyopenvba import ExcelFile

    with ExcelFile(file) as book:
        return book.vba_modules()


def test_the_stored_addin_is_what_the_script_builds(tmp_path):
    built_from, fresh = addin_versions(ADDIN), tmp_path / ADDIN.name
    build_addin(fresh, xlwings_version=built_from["xlwings"])
    assert vba(fresh) == vba(ADDIN), AGAIN
    if built_from["pyopenvba"] == version("pyopenvba"):
        assert fresh.read_bytes() == ADDIN.read_bytes(), AGAIN
    else:
        own = {"xl/vbaProject.bin", "docProps/custom.xml"}
        new, old = parts(fresh), parts(ADDIN)
        assert new.keys() == old.keys()
        assert all(new[name] == old[name] for name in new.keys() - own if not name.startswith("xl/")), AGAIN


@pytest.fixture(scope="module")
def fresh_book(tmp_path_factory):
    folder = tmp_path_factory.mktemp("functions")
    sys.path.insert(0, str(TEMPLATES))
    try:
        return importlib.import_module("demo_books.order_hours_functions").write(folder)
    finally:
        sys.path.remove(str(TEMPLATES))


def test_a_second_build_of_the_workbook_gives_the_same_bytes(fresh_book, tmp_path):
    again = sys.modules["demo_books.order_hours_functions"].write(tmp_path)
    assert again.read_bytes() == fresh_book.read_bytes()


def test_the_stored_workbook_is_what_the_script_builds(fresh_book):
    """Stored figures may differ in their last digits between processors; all else may not."""
    new, old = parts(fresh_book), parts(BOOK)
    assert list(new) == list(old)
    for name in new:
        if name.startswith("xl/worksheets/sheet"):
            left, right = (list(etree.fromstring(content).iter()) for content in (new[name], old[name]))
            assert len(left) == len(right), f"{name}: {AGAIN}"
            assert all(map(same_element, left, right)), f"{name}: {AGAIN}"
        else:
            assert new[name] == old[name], f"{name}: {AGAIN}"


def same_element(left, right):
    if (left.tag, left.attrib) != (right.tag, right.attrib):
        return False
    if left.text == right.text:
        return True
    return left.tag == f"{MAIN}v" and math.isclose(float(left.text), float(right.text), rel_tol=1e-9, abs_tol=1e-12)


def test_the_audit_finds_nothing():
    findings = OpenXmlValidator(FileFormat.OFFICE_2019).validate(BOOK)
    assert findings.is_valid, findings.errors


def read(**options):
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", UserWarning)
        return openpyxl.load_workbook(io.BytesIO(BOOK.read_bytes()), **options)


def formulas():
    """Sheet, cells and text of every formula of ours, arrays once."""
    for sheet in read().worksheets:
        for row in sheet.iter_rows():
            for cell in row:
                text = getattr(cell.value, "text", cell.value)
                if cell.data_type == "f" and "FIT_" in text:
                    yield sheet.title, getattr(cell.value, "ref", cell.coordinate), "=" + text.lstrip("=")


FORMULAS = list(formulas())


def test_every_function_stands_in_a_cell():
    assert {text.strip("=").partition("(")[0] for *_, text in FORMULAS} == set(REGISTRY)


def test_formulas_name_the_functions_plainly():
    """Without a link to the add-in of one machine, and without the mark of a function that Excel itself has."""
    assert not any("[" in text or "!" in text or "_xl" in text for *_, text in FORMULAS)


@pytest.mark.parametrize(("sheet", "place", "formula"), FORMULAS, ids=[text for *_, text in FORMULAS])
def test_stored_values_are_those_of_the_function_on_the_stored_data(sheet, place, formula):
    stored = read(data_only=True)[sheet][place]
    stored = [[cell.value for cell in row] for row in stored] if isinstance(stored, tuple) else [[stored.value]]
    value = evaluate_cell(formula, BOOK)
    expected = value if isinstance(value, list) else [[value]]
    assert [len(row) for row in stored] == [len(row) for row in expected]
    for found, wanted in zip(chain(*stored), chain(*expected), strict=True):
        if isinstance(wanted, str) and formula.startswith("=FIT_WHY"):
            assert found.partition(";")[0] == wanted.partition(";")[0] == "ok"  # a file also tells places
        elif isinstance(wanted, float):
            assert found == pytest.approx(wanted, rel=1e-9, abs=1e-12)
        else:
            assert (found or None) == (wanted or None)


def test_nothing_is_computed_anew_on_opening_and_no_macro_is_inside():
    stored = parts(BOOK)
    assert b"fullCalcOnLoad" not in stored["xl/workbook.xml"]
    assert b'calcId="191029"' in stored["xl/workbook.xml"]
    assert b"application/vnd.ms-excel.sheet.macroEnabled.main+xml" in stored["[Content_Types].xml"]
    assert not any("vba" in name.lower() for name in stored)


def test_errors_are_error_values():
    sheet = etree.fromstring(parts(BOOK)["xl/worksheets/sheet2.xml"])
    cells = {cell.get("r"): cell for cell in sheet.iter(f"{MAIN}c")}
    assert [(cells[place].get("t"), cells[place].findtext(f"{MAIN}v")) for place in ("I15", "J38", "K62", "L73")] == [
        ("e", "#N/A")
    ] * 4


def test_it_says_that_the_data_are_invented():
    notes = read(data_only=True)["Notes"]
    assert notes["B4"].value == "Invented data for demonstration"
    assert "there is no such firm" in notes["C6"].value
