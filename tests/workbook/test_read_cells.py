"""Every form a cell may take in a sheet's XML (ISO/IEC 29500-1, 18.3.1.4), by the scan and by the parser alone."""

from __future__ import annotations

import contextlib

import pytest
from hypothesis import given
from hypothesis import strategies as st
from sheet_xml import EMPTY, ESCAPED, NORTH, SOUTH, SPACE, TEXTS, assert_same, book_with, cells_of, kinds, values
from workbook_build import MAIN

from sheetfuncs.cells.address import parse_area
from sheetfuncs.errors import SheetfuncsError, WorkbookFormatError, WorkbookUnsafeError
from sheetfuncs.workbook import read_scan


@pytest.fixture(params=["scan", "parser"])
def read(request):
    return lambda book, area=None: cells_of(book, area and parse_area(area), parser_only=request.param == "parser")


def one_row(cells: str) -> bytes:
    return book_with(f'<row r="1">{cells}</row>')


@pytest.mark.parametrize(
    ("cell", "kind", "value"),
    [
        ('<c r="A1"><v>12.5</v></c>', "NUMBER", 12.5),
        ('<c r="A1" t="n"><v>-3</v></c>', "NUMBER", -3.0),
        ('<c r="A1" s="2"><v>1.5E-7</v></c>', "NUMBER", 1.5e-7),
        ('<c r="A1" s="1"><v>45000</v></c>', "DATE", 45000.0),
        ('<c r="A1" s="3"><v>1.5</v></c>', "DATE", 1.5),
        ('<c t="n" s="1" r="A1"><v>45000</v></c>', "DATE", 45000.0),
        ('<c r="A1" s="99"><v>45000</v></c>', "NUMBER", 45000.0),
        ('<c r="A1" s="1" t="s"><v>0</v></c>', "TEXT", TEXTS[NORTH]),
        ('<c r="A1" t="s"><v>1</v></c>', "TEXT", TEXTS[SPACE]),
        ('<c r="A1" t="s"><v>3</v></c>', "TEXT", TEXTS[SOUTH]),
        ('<c r="A1" t="s"><v>4</v></c>', "TEXT", TEXTS[ESCAPED]),
        ('<c r="A1" t="b"><v>1</v></c>', "BOOLEAN", True),
        ('<c r="A1" t="b"><v>0</v></c>', "BOOLEAN", False),
        ('<c r="A1" t="b"><v>true</v></c>', "BOOLEAN", True),
        ('<c r="A1" t="e"><v>#DIV/0!</v></c>', "ERROR", "#DIV/0!"),
        ('<c r="A1" t="e"><f>NA()</f><v>#N/A</v></c>', "ERROR", "#N/A"),
        ('<c r="A1" t="str"><f>B1&amp;""</f><v>text</v></c>', "TEXT", "text"),
        ('<c r="A1" t="str"><v>a &lt; b</v></c>', "TEXT", "a < b"),
        ('<c r="A1" t="inlineStr"><is><t>here</t></is></c>', "TEXT", "here"),
        ('<c r="A1" t="inlineStr"><is><t xml:space="preserve"> a </t></is></c>', "TEXT", " a "),
        ('<c r="A1" s="1" t="inlineStr"><is><t>größer &gt; _x0041_ &amp;</t></is></c>', "TEXT", "größer > A &"),
        ('<c r="A1" t="inlineStr"><is><t>&#252;&#x1F600;&amp;lt;&#10;</t></is></c>', "TEXT", "ü😀&lt;\n"),
        ('<c r="A1" t="inlineStr"><is><t>a\r\nb _x0041_</t></is></c>', "TEXT", "a\nb A"),
        ('<c r="A1" t="inlineStr"><v>none</v></c>', "TEXT", "none"),
        ('<c r="A1" t="str"><f>B1</f><v>é_x000A_</v></c>', "TEXT", "é\n"),
        ('<c r="A1" t="e"><v> #REF! </v></c>', "ERROR", "#REF!"),
        ('<c r="A1" t="inlineStr"><is><r><t>he</t></r><r><t>re</t></r><rPh sb="0" eb="1"><t>no</t></rPh></is></c>',
         "TEXT", "here"),
        ('<c r="A1" t="d"><v>2024-03-01</v></c>', "DATE", 45352.0),
        ('<c r="A1" t="d"><v>2024-03-01T12:00:00Z</v></c>', "DATE", 45352.5),
        ('<c r="A1"><f t="shared" ref="A1:A3" si="0">B1+1</f><v>7</v></c>', "NUMBER", 7.0),
        ('<c r="A1"><f t="shared" si="0"/><v>7</v></c>', "NUMBER", 7.0),
        ('<c r="A1"><f>IF(B1>2,"a>b",3)</f><v>3</v></c>', "NUMBER", 3.0),
        ('<c r="A1" cm="1"><f t="array" ref="A1">B1</f><v>3</v></c>', "NUMBER", 3.0),
        ('<c r="A1"><v>1e999</v></c>', "ERROR", "#NUM!"),
        ('<c r="A1"><v> 12 </v></c>', "NUMBER", 12.0),
        ('<c r="A1"><v>&#49;2</v></c>', "NUMBER", 12.0),
        ('<c r="A1"><v xml:space="preserve">12</v></c>', "NUMBER", 12.0),
        ('<c r="A1"><!-- a < b --><v>12</v></c>', "NUMBER", 12.0),
        ('<c r="A1" t="str"><v><![CDATA[<v>1</v></c></row>]]></v></c>', "TEXT", "<v>1</v></c></row>"),
        ('<c r="A1"\n s="1"\t><v\n>45000</v ></c >', "DATE", 45000.0),
        ("<c r='A1' s='1'><v>45000</v></c>", "DATE", 45000.0),
        ("<c><v>5</v></c>", "NUMBER", 5.0),
        ('<c t="b"><v>1</v></c>', "BOOLEAN", True),
        ('<c r="A1"><v>12</v><extLst><ext uri="x"><v xmlns="other">9</v></ext></extLst></c>', "NUMBER", 12.0),
    ],
)  # fmt: skip
def test_forms_of_a_filled_cell(read, cell, kind, value):
    block = read(one_row(cell)).block
    assert kinds(block) == [[kind]]
    assert values(block) == [[value]]
    assert type(values(block)[0][0]) is type(value)


@pytest.mark.parametrize(
    "cell",
    [
        '<c r="A1"/>', '<c r="A1" s="2"/>', '<c r="A1"></c>', '<c r="A1"><v/></c>', '<c r="A1"><v></v></c>',
        '<c r="A1" t="s"><v>2</v></c>', '<c r="A1" t="str"><f>""</f><v></v></c>', '<c r="A1" t="str"><v/></c>',
        '<c r="A1" t="inlineStr"><is><t/></is></c>', '<c r="A1" t="inlineStr"><is/></c>', "<c/>",
    ],
)  # fmt: skip
def test_forms_of_a_blank(read, cell):
    cells = read(book_with(f'<row r="1">{cell}<c r="B1"><v>1</v></c></row>'))
    assert kinds(cells.block) == [["BLANK", "NUMBER"]]
    assert EMPTY == 2


@pytest.mark.parametrize(
    ("cell", "unstored"),
    [
        ("<f>B1+1</f>", 1), ("<f>B1+1</f><v/>", 1), ("<f>B1+1</f><v></v>", 1), ("<f>B1+1</f><v>0</v>", 0),
        ('<f t="shared" si="0"/>', 1), ('<f t="shared" si="0"/><v></v>', 1), ("<f/><v>3</v>", 0),
    ],
)  # fmt: skip
def test_formulas_without_a_stored_value_are_counted(read, cell, unstored):
    rows = "".join(f'<row r="{r}"><c r="A{r}">{cell}</c><c r="C{r}"><v>1</v></c></row>' for r in (1, 2, 3))
    cells = read(book_with(rows))
    assert cells.formulas.tolist() == [3, 0, 0]
    assert cells.unstored.tolist() == [3 * unstored, 0, 0]
    assert read(book_with(rows), "Data!B1:C3").formulas.tolist() == [0, 0]


def test_a_formula_that_gives_empty_text_is_stored(read):
    cells = read(one_row('<c r="A1" t="str"><f>""</f><v></v></c><c r="B1"><v>1</v></c>'))
    assert (cells.formulas.tolist(), cells.unstored.tolist()) == ([1, 0], [0, 0])


def test_rows_and_cells_without_references_count_on(read):
    rows = "<row><c><v>1</v></c><c><v>2</v></c></row><row><c/><c r='D2'><v>4</v></c><c><v>5</v></c></row>"
    rows += '<row r="5"><c><v>6</v></c></row><row><c><v>7</v></c></row>'
    assert values(read(book_with(rows)).block) == [
        [1.0, 2.0, None, None, None], [None, None, None, 4.0, 5.0], [None] * 5, [None] * 5,
        [6.0, *[None] * 4], [7.0, *[None] * 4],
    ]  # fmt: skip


def test_cells_and_rows_out_of_order(read):
    rows = '<row r="3"><c r="B3"><v>32</v></c><c r="A3"><v>31</v></c></row><row r="1"><c r="A1"><v>11</v></c></row>'
    assert values(read(book_with(rows)).block) == [[11.0, None], [None, None], [31.0, 32.0]]


def test_an_area_is_cut_out(read):
    rows = "".join(
        f'<row r="{r}">' + "".join(f'<c r="{c}{r}"><v>{10 * r + i}</v></c>' for i, c in enumerate("ABCD")) + "</row>"
        for r in range(1, 6)
    )
    book = book_with(rows)
    assert values(read(book, "Data!B2:C3").block) == [[21.0, 22.0], [31.0, 32.0]]
    assert values(read(book, "B2:B2").block) == [[21.0]]
    assert read(book, "Data!C:D").block.kinds.shape == (5, 2)
    assert values(read(book, "Data!D5:E7").block) == [[53.0, None], [None, None], [None, None]]
    block = read(book, "Data!B2:C3").block
    assert (block.sheet, block.first_row, block.first_column, block.date1904) == ("Data", 2, 2, False)


def test_whole_columns_of_a_sheet_are_equally_high(read):
    book = book_with(
        '<row r="2"><c r="A2"><v>1</v></c></row><row r="9"><c r="C9" t="inlineStr"><is><t>x</t></is></c></row>'
    )
    assert [read(book, f"Data!{c}:{c}").block.row_count for c in "ABCD"] == [9, 9, 9, 9]


def test_an_empty_sheet(read):
    for rows in ("", '<row r="4"/>', '<row r="4"><c r="B4" s="1"/></row>'):
        cells = read(book_with(rows))
        assert cells.block.kinds.shape == (0, 0)
        assert read(book_with(rows), "Data!A:B").block.kinds.shape == (0, 2)
    assert read(book_with("", part=f'<worksheet xmlns="{MAIN}"><sheetData/></worksheet>'.encode())).last_row == 0


def test_hidden_rows(read):
    rows = '<row r="1" hidden="1"><c r="A1"><v>1</v></c></row><row r="2" ht="3" hidden="true" customHeight="1">'
    rows += '<c r="A2"><v>2</v></c></row><row r="3" hidden="0"><c r="A3"><v>3</v></c></row><row r="5" hidden="1"/>'
    rows += '<row r="6"><c r="A6"><v>6</v></c></row>'
    after = '<autoFilter ref="A1:A6"/>'
    assert read(book_with(rows, after=after)).block.hidden.tolist() == [True, True, False, False, True, False]
    assert read(book_with(rows, after=after), "A2:A7").block.hidden.tolist() == [True, False, False, True, False, False]


def test_rows_hidden_by_default(read):
    rows = '<row r="2"><c r="A2"><v>2</v></c></row><row r="4" hidden="1"><c r="A4"><v>4</v></c></row>'
    before = '<sheetFormatPr defaultRowHeight="15" zeroHeight="{}"/>'
    assert read(book_with(rows, before=before.format(1))).block.hidden.tolist() == [True, False, True, True]
    assert read(book_with(rows, before=before.format("false"))).block.hidden.tolist() == [False, False, False, True]


def test_only_the_first_of_merged_cells_has_the_value(read):
    rows = '<row r="1"><c r="A1"><v>1</v></c><c r="B1"/></row><row r="2"><c r="A2"/>'
    rows += '<c r="B2"/><c r="C2"><v>2</v></c></row>'
    block = read(book_with(rows, after='<mergeCells count="1"><mergeCell ref="A1:B2"/></mergeCells>')).block
    assert values(block) == [[1.0, None, None], [None, None, 2.0]]


def test_the_1904_date_system(read):
    book = book_with('<row r="1"><c r="A1" t="d"><v>1904-01-02</v></c></row>', workbook='<workbookPr date1904="1"/>')
    block = read(book).block
    assert (values(block), block.date1904) == ([[1.0]], True)


OPENING = f'<worksheet xmlns="{MAIN}">'
ROW = '<row r="1"><c r="A1"><v>5</v></c></row>'
CLOSING = "</sheetData></worksheet>"
SPELLINGS = {
    "utf-16": f"{OPENING}<sheetData>{ROW}{CLOSING}".encode("utf-16"),
    "byte order mark": f"{OPENING}<sheetData>{ROW}{CLOSING}".encode("utf-8-sig"),
    "prefix": (
        f'<x:worksheet xmlns:x="{MAIN}"><x:sheetData><x:row r="1"><x:c r="A1"><x:v>5</x:v></x:c></x:row></x:sheetData>'
        "</x:worksheet>"
    ).encode(),
    "prefix and none": (
        f'<worksheet xmlns="{MAIN}" xmlns:x="{MAIN}"><sheetData>'
        f'<row r="1"><x:c r="A1"><x:v>5</x:v></x:c></row>{CLOSING}'
    ).encode(),
    "indented": f"{OPENING}\n<sheetData>\n <row r='1'>\n  <c r='A1'>\n   <v>5</v>\n  </c>\n </row>\n{CLOSING}".encode(),
    "comment": f"{OPENING}<!-- <sheetData> --><sheetData>{ROW}{CLOSING}".encode(),
    "instruction": f"{OPENING}<sheetData><?x <row?>{ROW}{CLOSING}".encode(),
}


@pytest.mark.parametrize("part", SPELLINGS.values(), ids=SPELLINGS)
def test_spellings_of_the_part(read, part):
    assert values(read(book_with("", part=part)).block) == [[5.0]]


@pytest.mark.parametrize(
    "rows",
    [
        '<row r="1"><c r="A1"><v>1,5</v></c></row>', '<row r="1"><c r="A1"><v>1_0</v></c></row>',
        '<row r="1"><c r="A1" t="s"><v>5</v></c></row>', '<row r="1"><c r="A1" t="s"><v>-1</v></c></row>',
        '<row r="1"><c r="A1" t="s"><v>99999999999</v></c></row>', '<row r="1"><c r="1A"><v>1</v></c></row>',
        '<row r="1"><c r="AAAA1"><v>1</v></c></row>', '<row r="1"><c r="XFE1"><v>1</v></c></row>',
        '<row r="0"><c r="A0"><v>1</v></c></row>', '<row r="1048577"><c r="A1048577"><v>1</v></c></row>',
        '<row r="x"><c r="A1"><v>1</v></c></row>', '<row r="1"><c r="A1" t="odd"><v>1</v></c></row>',
        '<row r="1"><c r="A1" t="d"><v>soon</v></c></row>', '<row r="1"><c r="A1" s="one"><v>1</v></c></row>',
        '<row r="1"><c r="A1" t="str"><v>a&#0;</v></c></row>',
        '<row r="1"><c r="A1" t="str"><v>a&#xD800;</v></c></row>',
        '<row r="1"><c r="A1" t="str"><v>a&b;</v></c></row>', '<row r="1"><c r="A1" t="str"><v>a]]></v></c></row>',
        '<row r="1"><c r="A1" t="str"><v>\x01</v></c></row>',
        '<row r="1"><c r="A1" t="str"><v>&#99999999;</v></c></row>',
        '<row r="1"><c r="A1"><v>1</v></row>', '<row r="1"><c r="A1"><v>1</v></c>', "<row", '<row r="1" hidden="1"/><x',
    ],
)  # fmt: skip
def test_damage_is_named(read, rows):
    with pytest.raises(WorkbookFormatError, match="damaged") as refused:
        read(book_with(rows))
    assert "Data" in str(refused.value)


def test_a_doctype_is_refused(read):
    part = (
        f'<!DOCTYPE x [<!ENTITY e "1">]><worksheet xmlns="{MAIN}"><sheetData><row r="1"><c r="A1"><v>&e;</v></c></row>'
    )
    with pytest.raises(WorkbookUnsafeError, match="DOCTYPE"):
        read(book_with("", part=f"{part}</sheetData></worksheet>".encode()))


def test_a_block_beyond_all_bounds_is_refused(read):
    book = book_with('<row r="1048576"><c r="A1048576"><v>1</v></c><c r="XFD1048576"><v>1</v></c></row>')
    for area in ("Data!A1:XFD1048576", "Data!A:XFD", None):
        with pytest.raises(SheetfuncsError, match="at most"):
            read(book, area)
    assert values(read(book, "XFD1048575:XFD1048576").block) == [[None], [1.0]]


cell_texts = st.sampled_from(
    [
        "<v>{n}</v>", "<v>{n}</v>", "<v>{n}</v>", "<f>A1+1</f><v>{n}</v>", '<f t="shared" si="1"/><v>{n}</v>', "",
        "<v/>", "<f>A1</f>", "<v></v>", "<f>A1</f><v></v>", "\n<v>{n}</v>\n", "<v>{n}</v><extLst/>", "<f/><v>{n}</v>",
    ]
)  # fmt: skip
numbers = (
    st.floats(allow_nan=False, allow_infinity=False).map(repr)
    | st.integers(-(10**20), 10**20).map(str)
    | st.decimals(allow_nan=False, allow_infinity=False, places=3).map(str)
    | st.sampled_from(["0", "-0", "5.", ".5", "+1", "1E5", "1e-400", "0001.5000", "123456789012345678901234567890"])
)
attributes = st.sampled_from(
    ["", "", ' s="1"', ' s="2"', ' t="n"', ' s="1" t="n"', ' t="n" s="3"', ' cm="1"', ' s="77"']
)
text_cells = st.sampled_from(
    [
        ' t="s"><v>0</v></c>', ' t="s" s="1"><v>2</v></c>', ' t="b"><v>1</v></c>', ' t="b"><v>yes</v></c>',
        ' t="e"><v>#N/A</v></c>', ' t="str"><f>A1</f><v>t</v></c>', ' t="str"><v></v></c>', "/>", "></c>",
        ' t="inlineStr"><is><t>&lt;v>1&lt;/v></t></is></c>', ' t="inlineStr"><is><t>plain</t></is></c>',
        ' t="str"><f>A1</f><v></v></c>', ' t="inlineStr"><v>odd</v></c>', ' t="e"><v>#NUM!</v></c>',
        ' t="s"><f>A1</f><v>3</v></c>', ' t="e"><f>A1</f><v/></c>',
    ]
)  # fmt: skip


@st.composite
def sheet_rows(draw) -> str:
    """Rows in order, cells in order; all spellings mixed."""
    rows, number = [], 0
    for _ in range(draw(st.integers(0, 6))):
        number += draw(st.integers(1, 3))
        cells = []
        for column in sorted(draw(st.sets(st.sampled_from(["A", "B", "C", "Z"]), max_size=4))):
            reference = f'<c r="{column}{number}"'
            if draw(st.booleans()):
                inside = draw(cell_texts).format(n=draw(numbers))
                cells.append(f"{reference}{draw(attributes)}>{inside}</c>")
            else:
                cells.append(reference + draw(text_cells))
        extra = draw(st.sampled_from(["", "", ' hidden="1"', ' spans="1:3"', ' ht="0" hidden="0"']))
        between = draw(st.sampled_from(["", "", "", "\n", "<!-- -->"]))
        rows.append(f'<row r="{number}"{extra}>{"".join(cells)}</row>{between}')
    return "".join(rows)


@given(sheet_rows(), st.sampled_from([None, "A:B", "B2:C5", "Z:Z"]), st.sampled_from([1, 200, 1 << 20]))
def test_the_scan_reads_what_the_parser_reads(rows, area, segment):
    book, area = book_with(rows), area and parse_area(f"Data!{area}")
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(read_scan, "SEGMENT", segment)
        assert_same(cells_of(book, area), cells_of(book, area, parser_only=True))


@given(st.binary(max_size=60) | st.text(alphabet='<>/crvf="1 A\n&!?-[]', max_size=60).map(str.encode))
def test_whatever_stands_in_the_rows_gives_cells_or_a_refusal(piece):
    part = f"{OPENING}<sheetData>{ROW}".encode() + piece + f"{ROW}{CLOSING}".encode()
    with contextlib.suppress(SheetfuncsError):
        assert cells_of(book_with("", part=part)).block.kinds.size
