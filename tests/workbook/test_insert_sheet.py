"""What insertion and replacement do to the host: places, names, parts, warnings, refusals."""

from __future__ import annotations

import io
import posixpath

import pytest
import xlsxwriter
from lxml import etree
from openxml_audit import FileFormat, OpenXmlValidator
from workbook_build import MAIN, SHEET_ML, Parts, opened, sheet_to_insert, unzipped, zipped
from workbook_handmade import base, calculation_chain, old_macro_sheets, pivot_and_slicer, signed, two_windows
from workbook_hosts import HOSTS

from sheetfuncs.errors import ArgumentError, SheetNameError, WorkbookError, WorkbookFormatError
from sheetfuncs.workbook import Insertion, insert_sheet

TITLE = "Check of Data"


def insert(book: bytes, guest: bytes | None = None, **options) -> tuple[bytes, Insertion]:
    out = io.BytesIO()
    done = insert_sheet(io.BytesIO(book), io.BytesIO(guest or sheet_to_insert(TITLE)), out=out, **options)
    return out.getvalue(), done


def packed(parts: Parts) -> bytes:
    return zipped(parts.files())


def tabs(book: bytes) -> list[str]:
    root = etree.fromstring(unzipped(book)["xl/workbook.xml"])
    return [sheet.get("name") for sheet in root.iterfind(f"{{{MAIN}}}sheets/{{{MAIN}}}sheet")]


def plain() -> bytes:
    return HOSTS["xlsxwriter: plain"]()


def test_without_a_place_the_sheet_comes_last():
    book, done = insert(plain())
    assert tabs(book) == ["Data", "Other", TITLE]
    assert (done.name, done.warnings, done.removed) == (TITLE, (), 0)


def test_a_place_is_found_whatever_its_case():
    assert tabs(insert(plain(), after="DATA")[0]) == ["Data", TITLE, "Other"]


@pytest.mark.parametrize("options", [{"after": "Nowhere"}, {"replace": "Nowhere"}])
def test_a_sheet_that_is_not_there_is_refused_with_those_that_are(options):
    with pytest.raises(SheetNameError, match=r"has no sheet 'Nowhere'; its sheets are 'Data', 'Other'\."):
        insert(plain(), **options)


def test_a_name_that_is_taken_is_refused_whatever_its_case():
    with pytest.raises(SheetNameError, match="already has a sheet 'OTHER'"):
        insert(plain(), sheet_to_insert("OTHER"))


def test_a_sheet_of_a_workbook_with_two_is_refused():
    with pytest.raises(WorkbookFormatError, match="has 2 sheets; exactly one is allowed"):
        insert(plain(), plain())


def test_a_sheet_with_a_pivot_table_is_refused():
    guest = unzipped(sheet_to_insert(TITLE))
    rels = "xl/worksheets/_rels/sheet1.xml.rels"
    guest[rels] = guest[rels].replace(b"relationships/drawing", b"relationships/pivotTable")
    with pytest.raises(WorkbookFormatError, match="holds a pivotTable"):
        insert(plain(), zipped(guest))


def test_replacing_keeps_name_id_and_place_and_turns_references():
    first, _ = insert(plain(), sheet_to_insert("Other name"), after="Data")
    files = unzipped(first)
    files["xl/workbook.xml"] = files["xl/workbook.xml"].replace(
        b'name="Other name" sheetId="3"', b'name="It\'s &quot;mine&quot;" state="hidden" sheetId="7"'
    )
    book, done = insert(zipped(files), replace='it\'s "mine"')
    title = 'It\'s "mine"'
    assert done.name == title
    root = etree.fromstring(unzipped(book)["xl/workbook.xml"])
    own = root.find(f"{{{MAIN}}}sheets/{{{MAIN}}}sheet[2]")
    assert dict(own.attrib)["sheetId"] == "7"
    assert own.get("state") == "hidden"
    text = b"".join(data for name, data in unzipped(book).items() if name.startswith(("xl/charts", "xl/workbook")))
    assert TITLE.encode() not in text
    assert b"'It''s \"mine\"'!$B$6:$B$17" in text
    page = opened(book)[title]
    assert page["A4"].hyperlink.location == "'It''s \"mine\"'!B6"
    assert page["A3"].hyperlink.location == "'Data'!A2"


def test_names_of_the_replaced_sheet_are_those_of_the_new_one():
    first, _ = insert(plain(), after="Data")
    book, _ = insert(first, sheet_to_insert(TITLE, rows=30), replace=TITLE)
    page = opened(book)[TITLE]
    assert page.defined_names["span"].attr_text == f"'{TITLE}'!$B$6:$B$35"
    assert page.defined_names["_sheetfuncs_settings"].hidden


def test_parts_that_only_the_old_sheet_needs_go_and_shared_ones_stay():
    parts = base()
    parts.defaults["bin"] = SHEET_ML + "printerSettings"
    for number in (1, 2):
        parts.relate(f"xl/worksheets/sheet{number}.xml", "printerSettings", "../printerSettings/both.bin")
    parts.add("xl/printerSettings/both.bin", b"shared")
    parts.relate("xl/worksheets/sheet2.xml", "printerSettings", "../printerSettings/own.bin")
    parts.add("xl/printerSettings/own.bin", b"own")
    parts.add("xl/lonely.bin", b"not reachable from anywhere")
    book, done = insert(packed(parts), replace="Notes")
    files = unzipped(book)
    assert files["xl/printerSettings/both.bin"] == b"shared"
    assert files["xl/lonely.bin"] == b"not reachable from anywhere"
    assert "xl/printerSettings/own.bin" not in files
    assert done.removed == 3  # the sheet, its relationships, its own settings
    assert tabs(book) == ["Data", "Notes"]


def test_a_relationship_list_has_no_arrow_to_a_part_that_is_gone():
    book, _ = insert(insert(plain(), after="Data")[0], sheet_to_insert(TITLE, plain=True), replace=TITLE)
    files = unzipped(book)
    assert not [name for name in files if name.startswith(("xl/charts", "xl/drawings"))]
    assert b"drawing" not in files["[Content_Types].xml"]
    for name, data in files.items():
        if name.endswith(".rels"):
            folder = posixpath.dirname(posixpath.dirname(name))
            for arrow in etree.fromstring(data):
                if arrow.get("TargetMode") != "External":
                    target = posixpath.normpath(posixpath.join("/", folder, arrow.get("Target")))
                    assert target[1:] in files


def test_the_calculation_chain_goes_only_with_formulas_of_the_replaced_sheet():
    host = packed(calculation_chain())
    assert "xl/calcChain.xml" in unzipped(insert(host, replace="Data")[0])
    files = unzipped(insert(host, replace="Notes")[0])
    assert "xl/calcChain.xml" not in files
    assert b"calcChain" not in files["[Content_Types].xml"] + files["xl/_rels/workbook.xml.rels"]


def test_recalculation_is_never_forced_and_results_stand_as_drawn():
    book, _ = insert(packed(calculation_chain()), after="Data")
    assert b"fullCalcOnLoad" not in unzipped(book)["xl/workbook.xml"]
    page = opened(book, data_only=True)[TITLE]
    assert page["D6"].value == pytest.approx(5**0.5 / 30, abs=1e-12)


@pytest.mark.parametrize(("active", "selected"), [("0", False), ("1", True)])
def test_the_new_sheet_is_selected_only_if_the_book_opened_on_the_old_one(active, selected):
    views = f'<bookViews><workbookView activeTab="{active}"/></bookViews>'
    files = unzipped(insert(packed(base(before=views)), replace="Notes")[0])
    sheets = [data for name, data in files.items() if name.startswith("xl/worksheets/sheet") and b"Do the" in data]
    assert (b'tabSelected="1"' in sheets[0]) is selected


def test_an_inserted_sheet_is_never_selected():
    book = opened(insert(plain(), after="Data")[0])
    assert not book[TITLE].sheet_view.tabSelected
    assert book.active.title == "Data"


def test_a_replaced_chart_sheet_becomes_a_worksheet():
    host = HOSTS["xlsxwriter: charts_and_pictures"]()
    book, _ = insert(host, replace="Chart page")
    assert opened(book)["Chart page"]["A1"].value.startswith("Do the errors")
    assert "xl/chartsheets/sheet1.xml" not in unzipped(book)


def test_every_window_keeps_its_sheet():
    root = etree.fromstring(unzipped(insert(packed(two_windows()), after="Data")[0])["xl/workbook.xml"])
    assert [dict(view.attrib) for view in root.iter(f"{{{MAIN}}}workbookView")] == [
        {"activeTab": "0"},
        {"activeTab": "2", "firstSheet": "2"},
    ]
    assert root.find(f".//{{{MAIN}}}customWorkbookView").get("activeSheetId") == "6"


def test_a_place_between_sheets_of_other_kinds():
    book, _ = insert(packed(old_macro_sheets()), after="Dialog1")
    assert tabs(book) == ["Data", "Dialog1", TITLE, "Macro1", "Notes"]
    assert b'localSheetId="4">Notes!' in unzipped(book)["xl/workbook.xml"]


def test_warnings_say_what_a_change_means():
    assert "digital signature" in insert(packed(signed()))[1].warnings[0]
    assert "_xmlsignatures/sig1.xml" in unzipped(insert(packed(signed()))[0])
    assert "protected" in insert(packed(two_windows()))[1].warnings[0]
    assert "change history" in insert(HOSTS["by hand: shared workbook"]())[1].warnings[0]


def test_titles_in_the_properties_follow_only_where_they_are_plainly_the_sheets():
    simple, _ = insert(plain(), after="Data")
    listed = b"<vt:lpstr>Data</vt:lpstr><vt:lpstr>Check of Data</vt:lpstr><vt:lpstr>Other"
    assert listed in unzipped(simple)["docProps/app.xml"]
    host = HOSTS["xlsxwriter: charts_and_pictures"]()
    assert unzipped(insert(host)[0])["docProps/app.xml"] == unzipped(host)["docProps/app.xml"]


def rich_guest() -> bytes:
    """A sheet with everything that can hang on one: table, comment, picture, header picture, sparkline, rule."""
    files = unzipped(HOSTS["xlsxwriter: dressed"]())
    buffer = io.BytesIO()
    book = xlsxwriter.Workbook(buffer)
    page = book.add_worksheet(TITLE)
    page.add_table("A1:B4", {"name": "Figures", "columns": [{"header": "a"}, {"header": "b"}]})
    page.add_table("D1:E4", {"name": "More", "columns": [{"format": book.add_format({"bold": True})}, {}]})
    page.write_comment("A2", "a remark")
    picture = io.BytesIO(next(data for name, data in files.items() if name.endswith(".png")))
    page.insert_image("G1", "dot.png", {"image_data": picture})
    page.set_header("&L&G", {"image_left": "dot.png", "image_data_left": picture})
    page.data_validation("A2", {"validate": "list", "source": f"='{TITLE}'!$B$2:$B$4"})
    page.add_sparkline("F2", {"range": f"'{TITLE}'!A2:B2"})
    book.close()
    return buffer.getvalue()


@pytest.mark.parametrize("name", [f"xlsxwriter: {kind}" for kind in ("plain", "notes_and_rules", "dressed", "tables")])
def test_whatever_hangs_on_a_sheet_comes_along(name, tmp_path):
    host = HOSTS[name]()
    book, _ = insert(host, rich_guest(), after="Data")
    again, _ = insert(book, rich_guest(), replace=TITLE)
    assert len(again) == len(book)
    found = []
    for data in (host, book):
        (tmp_path / "book.xlsx").write_bytes(data)
        audit = OpenXmlValidator(file_format=FileFormat.MICROSOFT_365, max_errors=0)
        found.append({(error.part_uri, error.description) for error in audit.validate(tmp_path / "book.xlsx").errors})
    assert found[1] <= found[0]
    read = opened(book)
    assert list(read[TITLE].tables) == ["Figures", "More"]
    assert read[TITLE]["A2"].comment.text == "a remark"
    pictures = [sum(entry.startswith("xl/media/") for entry in unzipped(data)) for data in (host, book)]
    assert pictures[1] > pictures[0]
    ids = [table.id for page in read for table in page.tables.values()]
    assert len(set(ids)) == len(ids)


def test_a_table_name_that_is_taken_is_refused():
    files = {name: data.replace(b"Figures", b"LOADS") for name, data in unzipped(rich_guest()).items()}
    with pytest.raises(SheetNameError, match="already has a table or name 'LOADS'"):
        insert(HOSTS["xlsxwriter: tables"](), zipped(files))


def test_what_others_depend_on_is_never_replaced_away():
    with pytest.raises(WorkbookError, match="'Notes' holds a pivot table, which would be lost"):
        insert(packed(pivot_and_slicer()), replace="Notes")
    with pytest.raises(WorkbookError, match="holds the table 'Second'"):
        insert(HOSTS["xlsxwriter: tables"](), replace="It's a name")


def test_remarks_on_the_replaced_sheet_are_said_to_be_gone():
    done = insert(HOSTS["xlsxwriter: notes_and_rules"](), replace="Data")[1]
    assert "held notes; they are not on the sheet written anew" in done.warnings[0]
    done = insert(HOSTS["by hand: threaded comments"](), replace="Data")[1]
    assert "held comments" in done.warnings[0]


def test_a_picture_that_leads_to_a_cell_follows_the_new_name():
    buffer = io.BytesIO()
    book = xlsxwriter.Workbook(buffer)
    picture = next(data for name, data in unzipped(HOSTS["xlsxwriter: dressed"]()).items() if name.endswith(".png"))
    options = {"image_data": io.BytesIO(picture), "url": "internal:Check!A1"}
    book.add_worksheet("Check").insert_image(0, 0, "dot.png", options)
    book.close()
    book, _ = insert(plain(), buffer.getvalue(), replace="Other")
    assert b"Target=\"#'Other'!A1\"" in unzipped(book)["xl/drawings/_rels/drawing1.xml.rels"]


def test_the_file_object_that_is_read_cannot_be_the_output():
    book = io.BytesIO(plain())
    with pytest.raises(ArgumentError, match="give another one"):
        insert_sheet(book, io.BytesIO(sheet_to_insert(TITLE)), out=book)
    assert book.getvalue() == plain()


@pytest.mark.parametrize("inline", [False, True])
def test_shared_and_inline_strings_arrive_as_inline_ones(inline):
    host = HOSTS["xlsxwriter: plain"]()
    book, _ = insert(host, sheet_to_insert(TITLE, inline=inline))
    assert unzipped(book)["xl/sharedStrings.xml"] == unzipped(host)["xl/sharedStrings.xml"]
    page = next(data for data in unzipped(book).values() if b"Do the errors" in data and b"<worksheet" in data)
    assert b't="s"' not in page
    assert page.count(b"<is>") == 6
    rich = opened(book, rich_text=True)[TITLE]["A2"].value
    assert [str(piece) for piece in rich] == ["evidence ", "against", " it "]


def test_text_that_looks_like_a_formula_stays_text():
    book, _ = insert(plain())
    cell = opened(book)[TITLE]["B18"]
    assert (cell.value, cell.data_type) == ("=not a formula <&> ☃", "s")


def test_the_same_input_gives_the_same_bytes():
    assert insert(plain())[0] == insert(plain())[0]
