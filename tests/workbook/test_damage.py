"""Workbooks whose XML is well-formed but wrong: a result or a named error, never a traceback."""

from __future__ import annotations

import contextlib
import io
from functools import cache

import pytest
from lxml import etree
from workbook_build import sheet_to_insert, unzipped, zipped
from workbook_hosts import HOSTS

from sheetfuncs.errors import WorkbookError
from sheetfuncs.workbook import find_our_sheets, insert_sheet

PARTS = ["xl/workbook.xml", "xl/styles.xml", "xl/_rels/workbook.xml.rels", "[Content_Types].xml", "_rels/.rels",
         "docProps/app.xml"]  # fmt: skip


@cache
def book_with_our_sheet() -> dict[str, bytes]:
    out = io.BytesIO()
    insert_sheet(io.BytesIO(HOSTS["xlsxwriter: active_and_hidden"]()), io.BytesIO(guest()), after="Data", out=out)
    return unzipped(out.getvalue())


@cache
def guest() -> bytes:
    return sheet_to_insert()


def attempt(part: str, content: bytes) -> None:
    book = zipped({**book_with_our_sheet(), part: content})
    with contextlib.suppress(WorkbookError):
        insert_sheet(io.BytesIO(book), io.BytesIO(guest()), replace="Check of Data", out=io.BytesIO())
    with contextlib.suppress(WorkbookError):
        find_our_sheets(io.BytesIO(book))


@pytest.mark.parametrize("part", PARTS)
def test_every_attribute_may_be_missing_or_nonsense(part):
    text = book_with_our_sheet()[part]
    count = sum(len(element.attrib) for element in etree.fromstring(text).iter())
    for place in range(count):
        for value in (None, "-1", "x"):
            root = etree.fromstring(text)
            element, name = [(element, name) for element in root.iter() for name in element.attrib][place]
            if value is None:
                del element.attrib[name]
            else:
                element.set(name, value)
            attempt(part, etree.tostring(root))


@pytest.mark.parametrize("part", PARTS)
def test_every_element_may_be_missing_or_renamed(part):
    text = book_with_our_sheet()[part]
    for place in range(1, len(list(etree.fromstring(text).iter()))):
        for rename in (False, True):
            root = etree.fromstring(text)
            element = list(root.iter())[place]
            if rename:
                element.tag = "{urn:unknown}thing"
            else:
                element.getparent().remove(element)
            attempt(part, etree.tostring(root))


@pytest.mark.parametrize("part", PARTS)
@pytest.mark.parametrize("content", [b"", b"<x/>", b"<x", b"\0\0\0", b"\xff\xfe<", b"<?xml version='1.0'?>"])
def test_every_part_may_be_something_else(part, content):
    attempt(part, content)


@pytest.mark.parametrize("part", sorted(set(book_with_our_sheet()) - {"[Content_Types].xml"}))
def test_every_part_may_be_missing(part):
    files = {name: data for name, data in book_with_our_sheet().items() if name != part}
    with contextlib.suppress(WorkbookError):
        insert_sheet(io.BytesIO(zipped(files)), io.BytesIO(guest()), replace="Check of Data", out=io.BytesIO())
