"""A sheet inserted into differently-built workbooks: everything else is carried as it was.

The checks read the packages with zipfile, lxml and openpyxl, and audit them with openxml-audit; none of them shares
code with the insertion.
"""

from __future__ import annotations

import io
import struct
import zipfile
from collections import Counter
from functools import cache
from pathlib import Path

import pytest
from lxml import etree
from openxml_audit import FileFormat, OpenXmlValidator
from workbook_build import MAIN, opened, sheet_to_insert
from workbook_hosts import HOSTS

from sheetfuncs.workbook import insert_sheet

TITLE = "Check of Data"
MAY_CHANGE = {"workbook.xml", "book.xml", "workbook.xml.rels", "book.xml.rels", "[Content_Types].xml", "styles.xml",
              "deep.xml", "app.xml"}  # fmt: skip
FORECAST = "Excel_InlineStrCells"
"""openxml-audit's forecast (a warning, not an error) that Excel will move inline strings to shared strings on its next
save. It is issued only for packages without shared strings; there it is expected, for inline strings are wanted."""


@cache
def host(name: str) -> bytes:
    return HOSTS[name]()


@cache
def guest() -> bytes:
    return sheet_to_insert(TITLE)


@cache
def inserted(name: str, rounds: int = 1) -> bytes:
    """The host with the sheet; every further round replaces it."""
    book, replace = (host(name), None) if rounds == 1 else (inserted(name, rounds - 1), TITLE)
    out = io.BytesIO()
    insert_sheet(io.BytesIO(book), io.BytesIO(guest()), after="Data", replace=replace, out=out)
    return out.getvalue()


def raw_entries(data: bytes) -> dict[str, tuple]:
    """Name -> method, check sum and the compressed bytes behind the local header, in the order of the directory."""
    found = {}
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        for info in archive.infolist():
            lengths = struct.unpack_from("<2H", data, info.header_offset + 26)
            start = info.header_offset + 30 + sum(lengths)
            clock = info.date_time
            found[info.filename] = (info.compress_type, info.CRC, clock, data[start : start + info.compress_size])
    return found


def findings(data: bytes, folder: Path) -> Counter:
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        types = archive.read("[Content_Types].xml").replace(b"\0", b"")
    path = folder / ("book.xlsm" if b"macroEnabled" in types else "book.xltx" if b"template" in types else "book.xlsx")
    path.write_bytes(data)
    validator = OpenXmlValidator(file_format=FileFormat.MICROSOFT_365, max_errors=0)
    return Counter((e.id, e.part_uri, e.description) for e in validator.validate(path).errors)


def canonical(element: etree._Element) -> bytes:
    if not isinstance(element.tag, str):
        return etree.tostring(element, with_tail=False)
    copy = etree.fromstring(etree.tostring(element, with_tail=False))
    for blank in copy.iter():
        blank.tail = blank.tail if (blank.tail or "").strip() else None
        blank.text = blank.text if (blank.text or "").strip() else None
    return etree.tostring(copy, method="c14n", exclusive=True)


def pieces(data: bytes) -> tuple[etree._Element, list[etree._Element]]:
    root = etree.fromstring(data)
    return root, list(root)


def workbook_part(data: bytes) -> etree._Element:
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        name = next(name for name in archive.namelist() if name.split("/")[-1] in ("workbook.xml", "book.xml"))
        return etree.fromstring(archive.read(name))


def each_sheet(data: bytes) -> dict[str, list]:
    book = opened(data)
    return {
        sheet.title: [[getattr(cell.value, "text", cell.value) for cell in row] for row in sheet.iter_rows()]
        for sheet in book.worksheets
        if hasattr(sheet, "iter_rows")
    }


def test_there_are_at_least_thirty_ways_to_build_a_workbook():
    assert len(HOSTS) >= 30


@pytest.mark.parametrize("name", HOSTS)
def test_untouched_entries_keep_their_compressed_bytes_and_order(name):
    before, after = raw_entries(host(name)), raw_entries(inserted(name))
    assert list(after)[: len(before)] == list(before)
    changed = {entry for entry in before if before[entry] != after[entry]}
    assert {entry.split("/")[-1] for entry in changed} <= MAY_CHANGE
    assert sum(entry.endswith(("workbook.xml", "book.xml")) for entry in changed) == 1


@pytest.mark.parametrize("name", HOSTS)
def test_the_archive_is_plain_and_sound(name):
    data = inserted(name)
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        assert archive.testzip() is None
        for info in archive.infolist():
            assert info.flag_bits & ~0x0806 == 0
            assert b"\1\0" not in [info.extra[at : at + 2] for at in range(0, len(info.extra), 20)]
            assert struct.unpack_from("<L", data, info.header_offset + 18)[0] == info.compress_size
        with zipfile.ZipFile(io.BytesIO(host(name))) as original:
            assert archive.comment == original.comment


@pytest.mark.parametrize("name", HOSTS)
def test_nothing_is_lost_from_the_parts_that_change(name):
    before, after = host(name), inserted(name)
    with zipfile.ZipFile(io.BytesIO(before)) as old, zipfile.ZipFile(io.BytesIO(after)) as new:
        for entry in old.namelist():
            if old.read(entry) == new.read(entry):
                continue
            (old_root, old_children), (new_root, new_children) = pieces(old.read(entry)), pieces(new.read(entry))
            assert dict(old_root.attrib) == dict(new_root.attrib), entry
            assert old_root.nsmap == new_root.nsmap, entry
            kept = iter(new_children)
            for child in old_children:  # the old children are there, in their old order
                twin = next(other for other in kept if other.tag == child.tag)
                if canonical(child) != canonical(twin):
                    assert_grown(child, twin, entry)


def assert_grown(old: etree._Element, new: etree._Element, entry: str) -> None:
    """Every item of a list that grew is still there, apart from what counts sheets by their place."""
    counting = {"count", "size"}
    strip = ("localSheetId", "activeTab", "firstSheet")
    assert {k: v for k, v in old.attrib.items() if k not in counting} == {
        k: v for k, v in new.attrib.items() if k not in counting
    }
    kept = iter(list(new))
    for item in old:
        for element in [item, *new]:
            for attribute in strip:
                element.attrib.pop(attribute, None)
        if entry.endswith("app.xml"):
            assert len(list(new)) == len(list(old))
            continue
        assert any(canonical(item) == canonical(other) for other in kept), (entry, etree.tostring(item))


OPENPYXL_CANNOT_FIND_PARTS = {"by hand: odd spelling"}


@pytest.mark.parametrize("name", [name for name in HOSTS if name not in OPENPYXL_CANNOT_FIND_PARTS])
def test_other_sheets_read_the_same(name):
    before, after = each_sheet(host(name)), each_sheet(inserted(name))
    assert next(iter(after)) == "Data"
    assert {title: cells for title, cells in after.items() if title != TITLE} == before
    assert after[TITLE][0][0] == "Do the errors grow with the size?"
    assert after[TITLE][1][0] == "evidence against it "
    assert after[TITLE][17][1] == "=not a formula <&> ☃"
    assert after[TITLE][5][3] == "=C6/SUM($C$6:$C$17)"


@pytest.mark.parametrize("name", HOSTS)
def test_the_sheet_stands_right_after_the_data_and_the_book_opens_where_it_did(name):
    before, after = workbook_part(host(name)), workbook_part(inserted(name))
    space = {"m": MAIN}
    old = [sheet.get("name") for sheet in before.iterfind("m:sheets/m:sheet", space)]
    new = [sheet.get("name") for sheet in after.iterfind("m:sheets/m:sheet", space)]
    assert new == [*old[:1], TITLE, *old[1:]]
    ids = [sheet.get("sheetId") for sheet in after.iterfind("m:sheets/m:sheet", space)]
    assert len(set(ids)) == len(ids)
    for attribute in ("activeTab", "firstSheet"):
        shown = [old[int(view.get(attribute, 0))] for view in before.iterfind(".//m:workbookView", space)]
        assert [new[int(view.get(attribute, 0))] for view in after.iterfind(".//m:workbookView", space)] == shown
    ours = {(name, TITLE) for name in ("_sheetfuncs_settings", "span", "_xlnm.Print_Area")}
    assert names_by_sheet(after, new) == names_by_sheet(before, old) | ours


def names_by_sheet(workbook: etree._Element, titles: list[str]) -> set[tuple[str, str]]:
    local = workbook.iterfind(".//m:definedName[@localSheetId]", {"m": MAIN})
    return {(name.get("name"), titles[int(name.get("localSheetId"))]) for name in local}


@pytest.mark.parametrize("name", HOSTS)
def test_the_audit_finds_nothing_that_the_host_did_not_have(name, tmp_path):
    new = findings(inserted(name), tmp_path) - findings(host(name), tmp_path)
    with zipfile.ZipFile(io.BytesIO(host(name))) as archive:
        strings = [archive.read(entry) for entry in archive.namelist() if entry == "xl/sharedStrings.xml"]
    has_strings = any(b"<si>" in text for text in strings)
    expected = [finding for finding in new if finding[0] == FORECAST]
    assert len(expected) == (0 if has_strings else 1)
    assert [finding for finding in new if finding not in expected] == []


@pytest.mark.parametrize("name", HOSTS)
def test_replacing_again_and_again_adds_nothing(name):
    first = inserted(name)
    tenth = inserted(name, 11)
    assert len(tenth) == len(first)
    before, after = raw_entries(first), raw_entries(tenth)
    assert {entry: value[3] for entry, value in after.items()} == {entry: value[3] for entry, value in before.items()}
