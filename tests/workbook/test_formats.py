"""Files that are no workbook we can write into: one clear sentence each, and nothing is written."""

from __future__ import annotations

import io
import os

import pytest
from workbook_build import DECLARATION, SHEET_ML, sheet_to_insert, unzipped, zipped
from workbook_hosts import HOSTS

from sheetfuncs.errors import WorkbookError, WorkbookFormatError
from sheetfuncs.workbook import find_our_sheets, insert_sheet

COMPOUND = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(504)


def changed(part: str, old: str, new: str) -> bytes:
    files = unzipped(HOSTS["xlsxwriter: plain"]())
    assert old.encode() in files[part]
    files[part] = files[part].replace(old.encode(), new.encode())
    return zipped(files)


def with_type(new: str) -> bytes:
    return changed("[Content_Types].xml", f"{SHEET_ML}sheet.main+xml", new)


OTHERS = {
    "encrypted": (lambda: COMPOUND + "EncryptedPackage".encode("utf-16-le") + bytes(400), "encrypted with a password"),
    "xls": (lambda: COMPOUND + "Workbook".encode("utf-16-le") + bytes(400), r"before 2007 \(.xls\)"),
    "xlsb": (
        lambda: with_type("application/vnd.ms-excel.sheet.binary.macroEnabled.main"),
        r"binary workbook \(.xlsb\)",
    ),
    "xlam": (lambda: with_type("application/vnd.ms-excel.addin.macroEnabled.main+xml"), r"add-in \(.xlam\)"),
    "docx": (
        lambda: with_type("application/vnd.openxmlformats-officedocument.wordprocessingml.document.main+xml"),
        "but no workbook",
    ),
    "strict, by its relationship": (
        lambda: changed(
            "_rels/.rels",
            "http://schemas.openxmlformats.org/officeDocument/2006/relationships/officeDocument",
            "http://purl.oclc.org/ooxml/officeDocument/relationships/officeDocument",
        ),
        "Strict Open XML",
    ),
    "strict, by its namespace": (
        lambda: changed(
            "xl/workbook.xml",
            "http://schemas.openxmlformats.org/spreadsheetml/2006/main",
            "http://purl.oclc.org/ooxml/spreadsheetml/main",
        ),
        "not an ordinary workbook",
    ),
    "ods": (
        lambda: zipped({"mimetype": b"application/vnd.oasis.opendocument.spreadsheet", "content.xml": b"<x/>"}),
        r"OpenDocument file \(.ods\)",
    ),
    "another zip": (lambda: zipped({"readme.txt": b"hello"}), "zip file, but no workbook"),
    "an empty zip": (lambda: zipped({}), "empty zip file"),
    "csv": (lambda: b"load;hours\n1,5;2\n", "plain text"),
    "utf-16 text": (lambda: "load;hours".encode("utf-16"), "no workbook, or damaged"),
    "html": (lambda: b"\xef\xbb\xbf\n<HTML><table>", "web page or XML text"),
    "xml of 2003": (lambda: DECLARATION.encode() + b"<Workbook/>", "web page or XML text"),
    "nothing": (lambda: b"", "is empty"),
    "half a file": (lambda: HOSTS["xlsxwriter: plain"]()[:3000], "is damaged"),
}


@pytest.mark.parametrize("name", OTHERS)
def test_other_files_are_named_for_what_they_are(name, tmp_path):
    build, words = OTHERS[name]
    book, out = tmp_path / "loads.xlsx", tmp_path / "out.xlsx"
    book.write_bytes(build())
    with pytest.raises(WorkbookFormatError, match=words) as caught:
        insert_sheet(book, io.BytesIO(sheet_to_insert()), out=out)
    assert str(caught.value).startswith("loads.xlsx ")
    assert "\n" not in str(caught.value)
    assert os.listdir(tmp_path) == ["loads.xlsx"]
    with pytest.raises(WorkbookFormatError):
        find_our_sheets(book)


def test_a_file_that_is_not_there_and_a_folder(tmp_path):
    with pytest.raises(WorkbookError, match="There is no file"):
        find_our_sheets(tmp_path / "gone.xlsx")
    with pytest.raises(WorkbookError, match=r"folder|permission"):
        find_our_sheets(tmp_path)


@pytest.mark.parametrize(
    ("host", "extension"), [("xlsxwriter: macros", ".xlsx"), ("xlsxwriter: plain", ".xlsm"), ("a template", ".xlsx")]
)
def test_an_output_name_under_which_the_book_would_not_open_is_refused(host, extension, tmp_path):
    with pytest.raises(WorkbookFormatError, match="would not open"):
        insert_sheet(io.BytesIO(HOSTS[host]()), io.BytesIO(sheet_to_insert()), out=tmp_path / f"out{extension}")
    assert os.listdir(tmp_path) == []


def test_macros_are_carried_along(tmp_path):
    host = HOSTS["xlsxwriter: macros"]()
    insert_sheet(io.BytesIO(host), io.BytesIO(sheet_to_insert()), out=tmp_path / "out.XLSM")
    after = unzipped((tmp_path / "out.XLSM").read_bytes())
    assert after["xl/vbaProject.bin"] == unzipped(host)["xl/vbaProject.bin"]
    assert b"macroEnabled.main+xml" in after["[Content_Types].xml"]
