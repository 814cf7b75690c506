"""Formats taken over into a host's styles: they look as they were drawn, and equal ones are used again."""

from __future__ import annotations

import io
import re
from copy import copy
from functools import cache

import pytest
from lxml import etree
from workbook_build import MAIN, SHEET_ML, Parts, opened, sheet_to_insert, unzipped, zipped
from workbook_handmade import bare, base, one_fill, own_styles_with_gaps, scant_styles
from workbook_hosts import HOSTS

from sheetfuncs.errors import WorkbookFormatError
from sheetfuncs.workbook import insert_sheet
from sheetfuncs.workbook.styles import StyleMerge
from sheetfuncs.workbook.xml import parse

TITLE = "Check of Data"
READ_BY_OPENPYXL = [name for name in HOSTS if name != "by hand: odd spelling"]


@cache
def guest() -> bytes:
    return sheet_to_insert(TITLE)


@cache
def inserted(book: bytes) -> bytes:
    out = io.BytesIO()
    insert_sheet(io.BytesIO(book), io.BytesIO(guest()), after="Data", out=out)
    return out.getvalue()


def packed(parts: Parts) -> bytes:
    return zipped(parts.files())


def styles(book: bytes) -> etree._Element:
    return etree.fromstring(unzipped(book)["xl/styles.xml"])


def look(cell) -> tuple:
    """Everything that shows, apart from the tie to a theme's font, which insertion cuts."""
    font = copy(cell.font)
    font.scheme = None
    shown = (font, cell.fill, cell.border, cell.alignment, cell.protection)
    return cell.number_format, *map(repr, shown)


@pytest.mark.parametrize("name", READ_BY_OPENPYXL)
def test_the_sheet_looks_as_it_was_drawn(name):
    drawn, there = opened(guest())[TITLE], opened(inserted(HOSTS[name]()))[TITLE]
    for row in drawn.iter_rows():
        for cell in row:
            if cell.has_style:
                assert look(there[cell.coordinate]) == look(cell), cell.coordinate
    for column, dimension in drawn.column_dimensions.items():
        assert there.column_dimensions[column].width == dimension.width
    rules = [[rule.dxf for rules in sheet.conditional_formatting for rule in rules.rules] for sheet in (drawn, there)]
    formats = [[repr((dxf.font, dxf.fill, dxf.numFmt and dxf.numFmt.formatCode)) for dxf in f if dxf] for f in rules]
    assert formats[0] == formats[1] != []


WITHOUT_DEFAULT = {"by hand: bare", "by hand: scant styles"}
"""Nothing in these files says how a cell looks, so there is no look to keep: each program has a default of its own."""


@pytest.mark.parametrize("name", [name for name in READ_BY_OPENPYXL if name not in WITHOUT_DEFAULT])
def test_the_other_sheets_look_as_before(name):
    before, after = opened(HOSTS[name]()), opened(inserted(HOSTS[name]()))
    for sheet in before.worksheets:
        for row in sheet.iter_rows():
            for cell in row:
                twin = after[sheet.title][cell.coordinate]
                assert (look(twin), twin.style) == (look(cell), cell.style), (sheet.title, cell.coordinate)


@pytest.mark.parametrize(("font", "size", "factor"), [("Calibri", 11, 1), ("Arial", 10, 1), ("Calibri", 8, 7 / 5),
                                                      ("Verdana", 12, 7 / 10)])  # fmt: skip
def test_columns_take_the_pixels_they_were_drawn_for(font, size, factor):
    """Widths count digits of the host's default font: 7 pixels in Calibri 11 at 96 dpi (ISO/IEC 29500-1, 18.3.1.13)."""
    parts = base()
    own = f'<sz val="{size}"/><name val="{font}"/>'.encode()
    parts.content["xl/styles.xml"] = parts.content["xl/styles.xml"].replace(b'<sz val="11"/><name val="Calibri"/>', own)
    drawn, there = opened(guest())[TITLE], opened(inserted(packed(parts)))[TITLE]
    for letter in ("A", "B"):
        width = drawn.column_dimensions[letter].width
        assert there.column_dimensions[letter].width == pytest.approx(width * factor, rel=1e-5)


def test_lists_count_what_they_hold():
    for name in HOSTS:
        if name.startswith("xlsxwriter"):
            for container in styles(inserted(HOSTS[name]())):
                if container.get("count") is not None:
                    assert int(container.get("count")) == len(container), (name, container.tag)


def test_every_index_points_into_its_list():
    for build in (bare, scant_styles, one_fill, own_styles_with_gaps):
        root = styles(inserted(packed(build())))
        sizes = {name: len(root.find(f"{{{MAIN}}}{name}")) for name in ("fonts", "fills", "borders", "cellStyleXfs")}
        listed = {number.get("numFmtId") for number in root.iter(f"{{{MAIN}}}numFmt")}
        for xf in root.iterfind(f"{{{MAIN}}}cellXfs/{{{MAIN}}}xf"):
            assert int(xf.get("fontId")) < sizes["fonts"]
            assert int(xf.get("fillId")) < sizes["fills"]
            assert int(xf.get("borderId")) < sizes["borders"]
            assert int(xf.get("xfId")) < sizes["cellStyleXfs"]
            assert int(xf.get("numFmtId")) < 164 or xf.get("numFmtId") in listed


def test_lists_stand_in_the_order_of_the_schema():
    """ISO/IEC 29500-1, 18.8.39 (styleSheet)."""
    order = ["numFmts", "fonts", "fills", "borders", "cellStyleXfs", "cellXfs", "cellStyles", "dxfs", "tableStyles",
             "colors", "extLst"]  # fmt: skip
    for name, build in HOSTS.items():
        files = unzipped(inserted(build()))
        part = "look/deep.xml" if name == "by hand: odd spelling" else "xl/styles.xml"
        found = [order.index(etree.QName(e).localname) for e in etree.fromstring(files[part]) if isinstance(e.tag, str)]
        assert found == sorted(found), name


def test_our_fill_never_takes_the_place_that_means_gray():
    fills = styles(inserted(packed(one_fill()))).find(f"{{{MAIN}}}fills")
    assert fills[1][0].get("patternType") == "gray125"


def test_number_formats_get_ids_that_nothing_in_the_host_uses():
    root = styles(inserted(packed(own_styles_with_gaps())))
    ids = [int(number.get("numFmtId")) for number in root.iterfind(f"{{{MAIN}}}numFmts/{{{MAIN}}}numFmt")]
    assert ids == [900, 901]
    assert {xf.get("xfId") for xf in root.iterfind(f"{{{MAIN}}}cellXfs/{{{MAIN}}}xf")} == {"0", "1"}


def test_a_number_format_that_the_host_has_is_used_again():
    code = '0.000 "kWh"'
    number = "<numFmts count='1'><numFmt numFmtId='170' formatCode='0.000 &quot;kWh&quot;'/></numFmts><fonts"
    parts = base()
    parts.content["xl/styles.xml"] = parts.content["xl/styles.xml"].replace(b"<fonts", number.encode(), 1)
    numbers = list(styles(inserted(packed(parts))).iterfind(f"{{{MAIN}}}numFmts/{{{MAIN}}}numFmt"))
    assert [(n.get("numFmtId"), n.get("formatCode")) for n in numbers] == [("170", code), ("171", "0.0%")]


def test_a_workbook_without_styles_gets_the_least_there_is():
    files = unzipped(inserted(packed(bare())))
    assert f'PartName="/xl/styles.xml" ContentType="{SHEET_ML}styles+xml"'.encode() in files["[Content_Types].xml"]
    assert b'Target="styles.xml"' in files["xl/_rels/workbook.xml.rels"]


def test_unknown_parts_of_the_styles_stay_as_they_were():
    host = HOSTS["by hand: newest program"]()
    text = unzipped(inserted(host))["xl/styles.xml"]
    for kept in (b"<!-- kept -->", b'x14ac:knownFonts="1"', b"x14:slicerStyles", b'mc:Ignorable="x14ac x15 xr xr6"'):
        assert kept in text
    assert text.startswith(b'<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\r\n<styleSheet')


def test_prefixes_stay_as_they_were():
    files = unzipped(inserted(HOSTS["by hand: prefixed"]()))
    assert b"<font" not in files["xl/styles.xml"]
    assert b"<x:font>" in files["xl/styles.xml"]
    assert re.search(rb'<x:sheet [^<]*name="Check of Data"', files["xl/workbook.xml"])


def test_a_workbook_that_is_full_of_formats_is_refused():
    full = parse(
        b'<styleSheet xmlns="%s"><cellXfs>' % MAIN.encode() + b"<xf/>" * 65_430 + b"</cellXfs></styleSheet>", "x"
    )
    source = parse(unzipped(guest())["xl/styles.xml"], "y")
    with pytest.raises(WorkbookFormatError, match="65,430 cell formats"):
        StyleMerge(full, source).cell_format(1)
