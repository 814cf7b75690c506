"""A workbook of one sheet around hand-written rows, and both ways to read it."""

from __future__ import annotations

import io

import pytest
from workbook_build import MAIN, SHEET_ML, Parts, zipped

from sheetfuncs.cells.address import Area
from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.workbook import read
from sheetfuncs.workbook.read import Book, open_book
from sheetfuncs.workbook.read_gather import SheetCells

STYLES = (
    f'<styleSheet xmlns="{MAIN}"><numFmts count="1"><numFmt numFmtId="164" formatCode="[h]:mm"/></numFmts>'
    '<fonts count="1"><font/></fonts><fills count="1"><fill/></fills><borders count="1"><border/></borders>'
    '<cellStyleXfs count="1"><xf/></cellStyleXfs><cellXfs count="4"><xf numFmtId="0"/><xf numFmtId="14"/>'
    '<xf numFmtId="2"/><xf numFmtId="164"/></cellXfs></styleSheet>'
)
STRINGS = (
    f'<sst xmlns="{MAIN}"><si><t>north</t></si><si><t xml:space="preserve"> </t></si><si><t/></si>'
    '<si><r><t>so</t></r><r><rPr><b/></rPr><t>uth</t></r><rPh sb="0" eb="2"><t>hint</t></rPh></si>'
    "<si><t>a &amp; b_x000A_c &lt;</t></si></sst>"
)
NORTH, SPACE, EMPTY, SOUTH, ESCAPED = range(5)
TEXTS = {NORTH: "north", SPACE: " ", EMPTY: None, SOUTH: "south", ESCAPED: "a & b\nc <"}


def book_with(
    rows: str, *, before: str = "", after: str = "", workbook: str = "", names: str = "", part: bytes | None = None,
    strings: str | None = STRINGS, styles: str | None = STYLES,
) -> bytes:  # fmt: skip
    """A workbook whose only sheet "Data" holds these rows; `part` replaces the sheet's whole part."""
    parts = Parts()
    parts.relate("", "officeDocument", "xl/workbook.xml")
    parts.add(
        "xl/workbook.xml",
        f'<workbook xmlns="{MAIN}" xmlns:r="http://schemas.openxmlformats.org/officeDocument/2006/relationships">'
        f'{workbook}<sheets><sheet name="Data" sheetId="1" r:id="rId1"/></sheets>{names}</workbook>',
        SHEET_ML + "sheet.main+xml",
    )
    parts.relate("xl/workbook.xml", "worksheet", "worksheets/sheet1.xml")
    text = f'<?xml version="1.0" encoding="UTF-8"?>\n<worksheet xmlns="{MAIN}">{before}<sheetData>{rows}</sheetData>'
    parts.add("xl/worksheets/sheet1.xml", part or f"{text}{after}</worksheet>", SHEET_ML + "worksheet+xml")
    for kind, content in (("styles", styles), ("sharedStrings", strings)):
        if content is not None:
            parts.relate("xl/workbook.xml", kind, f"{kind}.xml")
            parts.add(f"xl/{kind}.xml", content, f"{SHEET_ML}{kind}+xml")
    return zipped(parts.files())


def opened_with(rows: str, **more) -> Book:
    return open_book(io.BytesIO(book_with(rows, **more)))


def cells_of(book: bytes, area: Area | None = None, *, parser_only: bool = False) -> SheetCells:
    """The cells of sheet Data; parser_only reads each with the XML parser."""
    with pytest.MonkeyPatch.context() as patch, open_book(io.BytesIO(book)) as opened:
        if parser_only:
            patch.setattr(read, "scan_cells", lambda chunks, reader: reader.read_part(chunks))
        return opened.read_sheet("Data") if area is None else opened.read_cells(area)


def values(block: Block) -> list[list[object]]:
    return [[block.value(row, column) for column in range(block.column_count)] for row in range(block.row_count)]


def kinds(block: Block) -> list[list[str]]:
    return [[Kind(kind).name for kind in row] for row in block.kinds.tolist()]


def assert_same(one: SheetCells, other: SheetCells) -> None:
    """Both hold the same, texts and counts included."""
    assert one.block.kinds.shape == other.block.kinds.shape
    assert kinds(one.block) == kinds(other.block)
    assert values(one.block) == values(other.block)
    for column in range(one.block.column_count):
        texts, others = (b.texts.get(column) for b in (one.block, other.block))
        assert (texts is None) == (others is None)
        assert texts is None or texts.tolist() == others.tolist()
    assert one.block.hidden.tolist() == other.block.hidden.tolist()
    assert one.formulas.tolist() == other.formulas.tolist()
    assert one.unstored.tolist() == other.unstored.tolist()
    assert (one.last_row, one.last_column) == (other.last_row, other.last_column)
