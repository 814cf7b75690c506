"""Names of our functions in a file's formulas: written plainly, and nothing else in the file changes by a byte."""

from __future__ import annotations

import os
import re
from pathlib import Path
from xml.sax.saxutils import escape

import pytest
from test_insert_lossless import raw_entries
from workbook_build import DECLARATION, MAIN, RELATIONSHIPS, SHEET_ML, Parts, unzipped, zipped
from workbook_handmade import base, sheet, workbook
from workbook_hosts import HOSTS

from sheetfuncs.errors import WorkbookBusyError, WorkbookError, WorkbookFormatError
from sheetfuncs.functions.registry import REGISTRY
from sheetfuncs.workbook.formula_names import write_plain_names

CALC = "ORG.SHEETFUNCS.CALC.FUNCTIONS."
OUR_ADDIN = "file:///C:\\Users\\Ida\\AppData\\Roaming\\Microsoft\\Excel\\XLSTART\\sheetfuncs.xlam"
SHEET = "xl/worksheets/sheet1.xml"


def with_formulas(*formulas: str, after: str = "", head: str = "") -> Parts:
    """The workbook of two sheets with these formulas as they stand in XML, in column D of its first sheet."""
    parts = base()
    rows = "".join(f'<row r="{r}"><c r="D{r}"><f>{f}</f><v>{r}.5</v></c></row>' for r, f in enumerate(formulas, 11))
    parts.add(SHEET, sheet(rows, after=after, head=head))
    return parts


def linked(parts: Parts, *targets: str) -> Parts:
    """With external links to these files, in this order."""
    lines = ""
    for number, target in enumerate(targets, 1):
        name = f"xl/externalLinks/externalLink{number}.xml"
        lines += f'<externalReference r:id="{parts.relate("xl/workbook.xml", "externalLink", f"/{name}")}"/>'
        arrow = parts.relate(name, "externalLinkPath", escape(target), outside=True)
        body = f'<externalBook xmlns:r="{RELATIONSHIPS}" r:id="{arrow}"><definedNames><definedName name="FIT_VIF"/>'
        body = f'<externalLink xmlns="{MAIN}">{body}</definedNames></externalBook></externalLink>'
        parts.add(name, DECLARATION + body, SHEET_ML + "externalLink+xml")
    after = f"<externalReferences>{lines}</externalReferences>"
    parts.add("xl/workbook.xml", workbook([("Data", "rId1"), ("Notes", "rId2")], after=after))
    return parts


def saved(folder: Path, parts: Parts, name: str = "book.xlsx") -> Path:
    path = folder / name
    path.write_bytes(zipped(parts.files(), comment=b"kept"))
    return path


def formulas_in(path: Path, part: str = SHEET) -> list[str]:
    return re.findall(r"<f>([^<]*)</f>", unzipped(path.read_bytes())[part].decode())


def rewritten(folder: Path, parts: Parts) -> tuple[list[str], int]:
    path = saved(folder, parts)
    count = write_plain_names(path)
    return formulas_in(path), count


def test_every_function_by_the_name_that_calc_saves(tmp_path):
    calls = [f"{CALC}{name.replace('_', '')}(A1:B4)" for name in REGISTRY]
    found, count = rewritten(tmp_path, with_formulas(*calls))
    assert found == [f"{name}(A1:B4)" for name in REGISTRY]
    assert count == len(REGISTRY)


def test_prefixes_texts_and_entities(tmp_path):
    given = (
        "_xlfn.FIT_VIF(A1:B4)", "1+_xludf.FIT_VIF(A1:B4)&gt;_xll.FIT_VIF(B1:B4)", "fit_vif(A1)",
        '"_xlfn.FIT_VIF("&amp;_xlfn.FIT_VIF(A1)&amp;")"', "&quot;_xlfn.FIT_VIF(&quot;&amp;_xll.FIT_VIF(A1)",
        "&#34;_xlfn.FIT_VIF(&#x22;&amp;_xll.FIT_VIF(A1)",
        "&apos;_xll.FIT_VIF(&apos;!A1+_xll.FIT_VIF('_xll.FIT_VIF('!A1)",
        "é_xll.FIT_VIF(A1)+日_xll.FIT_VIF(A1)", "SUM(A1:A4)", "_xlfn.XLOOKUP(1,A:A,B:B)",
    )  # fmt: skip
    found, count = rewritten(tmp_path, with_formulas(*given))
    assert found == [
        "FIT_VIF(A1:B4)", "1+FIT_VIF(A1:B4)&gt;FIT_VIF(B1:B4)", "FIT_VIF(A1)",
        '"_xlfn.FIT_VIF("&amp;FIT_VIF(A1)&amp;")"', "&quot;_xlfn.FIT_VIF(&quot;&amp;FIT_VIF(A1)",
        "&#34;_xlfn.FIT_VIF(&#x22;&amp;FIT_VIF(A1)", "&apos;_xll.FIT_VIF(&apos;!A1+FIT_VIF('_xll.FIT_VIF('!A1)",
        "é_xll.FIT_VIF(A1)+日_xll.FIT_VIF(A1)", "SUM(A1:A4)", "_xlfn.XLOOKUP(1,A:A,B:B)",
    ]  # fmt: skip
    assert count == 8


@pytest.mark.parametrize(
    ("targets", "plain"),
    [
        ((OUR_ADDIN,), [1, 2]), (("/Add-ins/SheetFuncs-signed.xlam",), [1, 2]), (("other.xlam",), [2]),
        (("other.xlam", OUR_ADDIN), [2]), ((OUR_ADDIN, "costs.xlsm"), [1]), ((), [1, 2]), (("costs.xlsx",), [1, 2]),
    ],
)  # fmt: skip
def test_a_link_is_left_out_where_it_leads_to_our_addin(tmp_path, targets, plain):
    parts = linked(with_formulas("[1]!FIT_VIF(A1:B4)", "[2]!FIT_VIF(A1:B4)", "[1]!OTHER(A1)", "[1]Data!A1"), *targets)
    found, _ = rewritten(tmp_path, parts)
    expected = [("" if link in plain else f"[{link}]!") + "FIT_VIF(A1:B4)" for link in (1, 2)]
    assert found == [*expected, "[1]!OTHER(A1)", "[1]Data!A1"]


def test_every_place_where_formulas_stand(tmp_path):
    call = f"{CALC}FITVIF($A$1:$B$4)"
    rules = (
        f'<conditionalFormatting sqref="A1"><cfRule type="expression" priority="1"><formula>{call}&gt;3</formula>'
        f'</cfRule></conditionalFormatting><dataValidations count="1"><dataValidation type="custom" sqref="F1">'
        f"<formula1>{call}</formula1><formula2 >{call}</formula2></dataValidation></dataValidations>"
        f'<extLst><ext uri="x"><xm:f xmlns:xm="y">{call}</xm:f><xm:sqref xmlns:xm="y">{call}</xm:sqref></ext></extLst>'
        f'<x:f t="array" ref="A>1" xmlns:x="{MAIN}">{call}</x:f>'
    )
    parts = with_formulas(after=rules)
    name = f'<definedName name="Spread" comment="{call} a>b">{call}</definedName>'
    parts.add("xl/workbook.xml", workbook([("Data", "rId1"), ("Notes", "rId2")],
                                          after=f"<definedNames>{name}</definedNames>"))  # fmt: skip
    parts.relate(SHEET, "table", "../tables/table1.xml")
    column = f'<tableColumn id="1" name="{call}"><calculatedColumnFormula>{call}</calculatedColumnFormula>'
    table = f'<table xmlns="{MAIN}"><tableColumns>{column}</tableColumn></tableColumns></table>'
    parts.add("xl/tables/table1.xml", table, SHEET_ML + "table+xml")
    path = saved(tmp_path, parts)
    assert write_plain_names(path) == 7
    files = unzipped(path.read_bytes())
    assert files[SHEET].decode() == sheet(after=rules.replace(call, "FIT_VIF($A$1:$B$4)")).replace(
        '<xm:sqref xmlns:xm="y">FIT_VIF($A$1:$B$4)<', f'<xm:sqref xmlns:xm="y">{call}<'
    )
    assert f'comment="{call} a>b">FIT_VIF(' in files["xl/workbook.xml"].decode()
    assert f'name="{call}"><calculatedColumnFormula>FIT_VIF(' in files["xl/tables/table1.xml"].decode()


def test_texts_in_cells_and_comments_in_the_xml_stay(tmp_path):
    parts = base()
    inside = (
        f'<row r="11"><c r="D11" t="inlineStr"><is><t>{CALC}FITVIF(A1) _xll.FIT_VIF(A1)</t></is></c>'
        f"<c r=\"E11\"><f><!-- why -->1</f><v>1</v></c></row><!-- {CALC}FITVIF(A1) -->"
    )
    parts.add(SHEET, sheet(inside))
    path = saved(tmp_path, parts)
    before = path.read_bytes()
    assert write_plain_names(path) == 0
    assert path.read_bytes() == before


@pytest.mark.parametrize("encoding", ["utf-16-le", "utf-16-be", "utf-8-sig"])
def test_other_encodings_of_a_part_are_kept(tmp_path, encoding):
    parts = with_formulas("_xlfn.FIT_VIF(A1:B4)", '"ü日"&amp;_xlfn.FIT_VIF(A1:B4)')
    text = parts.content[SHEET].decode().replace("UTF-8", "UTF-8" if "8" in encoding else "UTF-16")
    mark = "" if encoding == "utf-8-sig" else "\ufeff"
    parts.add(SHEET, (mark + text).encode(encoding))
    path = saved(tmp_path, parts)
    assert write_plain_names(path) == 2
    assert unzipped(path.read_bytes())[SHEET] == (mark + text.replace("_xlfn.", "")).encode(encoding)


def test_other_parts_are_carried_as_the_bytes_they_were(tmp_path):
    parts = linked(with_formulas("_xlfn.FIT_VIF(A1:B4)"), "costs.xlsx")
    parts.add("xl/media/picture.bin", os.urandom(2_000))
    path = saved(tmp_path, parts)
    old = raw_entries(path.read_bytes())
    assert write_plain_names(path) == 1
    new = raw_entries(path.read_bytes())
    assert list(new) == list(old)
    assert [name for name in old if old[name] != new[name]] == [SHEET]
    assert path.read_bytes().endswith(b"kept")


@pytest.mark.parametrize("name", HOSTS)
def test_a_file_without_such_names_is_not_written(tmp_path, name):
    path = tmp_path / "book.xlsx"
    path.write_bytes(HOSTS[name]())
    before, stamp = path.read_bytes(), os.stat(path)
    assert write_plain_names(path) == 0
    after = os.stat(path)
    assert (after.st_ino, after.st_mtime_ns) == (stamp.st_ino, stamp.st_mtime_ns)
    assert path.read_bytes() == before


def test_a_second_time_changes_nothing(tmp_path):
    path = saved(tmp_path, with_formulas(f"{CALC}FITVIF(A1:B4)+_xlfn.FIT_PRESS(A1:A4,B1:B4)", "SUM(fit_vif(A1))"))
    assert write_plain_names(path) == 3
    before, stamp = path.read_bytes(), os.stat(path).st_ino
    assert write_plain_names(path) == 0
    assert (path.read_bytes(), os.stat(path).st_ino) == (before, stamp)


def test_the_time_of_the_last_change_is_kept_when_asked(tmp_path):
    for keep in (True, False):
        path = saved(tmp_path, with_formulas("_xlfn.FIT_VIF(A1)"))
        os.utime(path, ns=(10**18, 10**18 + 123_456_789))
        assert write_plain_names(path, keep_time=keep) == 1
        assert (os.stat(path).st_mtime_ns == 10**18 + 123_456_789) is keep


def test_a_large_sheet_is_read_in_pieces_that_cut_a_name_anywhere(tmp_path):
    for filler in range(1, 1 << 20, 99_991):
        parts = base()
        inside = f'<row r="9"><c r="A9" t="str"><v>{"x" * filler}</v></c><c r="B9"><f>_xlfn.FIT_VIF(A1)</f></c></row>'
        parts.add(SHEET, sheet(inside * 2))
        path = saved(tmp_path, parts)
        assert write_plain_names(path) == 2


def test_a_file_that_cannot_be_replaced_stays_as_it_was(tmp_path, monkeypatch):
    path = saved(tmp_path, with_formulas("_xlfn.FIT_VIF(A1)"))
    before = path.read_bytes()

    def held(*_):
        raise PermissionError(13, "held")

    monkeypatch.setattr(os, "replace", held)
    with pytest.raises(WorkbookBusyError, match="another program holds it open"):
        write_plain_names(path)
    assert path.read_bytes() == before
    assert [other.name for other in tmp_path.iterdir()] == ["book.xlsx"]


def test_what_is_no_workbook_is_refused_with_a_sentence(tmp_path):
    with pytest.raises(WorkbookError, match="There is no file"):
        write_plain_names(tmp_path / "absent.xlsx")
    torn = tmp_path / "torn.xlsx"
    torn.write_bytes(zipped(with_formulas("_xlfn.FIT_VIF(A1)").files())[:-40])
    with pytest.raises(WorkbookFormatError, match="damaged"):
        write_plain_names(torn)


def test_names_of_our_sheets_that_calc_shows_are_hidden_again(tmp_path):
    def names(shown: str) -> str:
        return (
            f'<definedNames><definedName function="false" hidden="{shown}" localSheetId="1" '
            f'name="_sheetfuncs_decision_1" vbProcedure="false">Data!$E$5</definedName>'
            f'<definedName hidden="{shown}" name="_sheetfuncs_settings_1">"x=_sheetfuncs_"</definedName>'
            '<definedName hidden="false" name="Area">Data!$A$1</definedName></definedNames>'
        )

    parts = base()
    parts.add("xl/workbook.xml", workbook([("Data", "rId1"), ("Notes", "rId2")], after=names("false")))
    path = saved(tmp_path, parts)
    before = unzipped(path.read_bytes())
    assert write_plain_names(path) == 2
    after = unzipped(path.read_bytes())
    assert after.pop("xl/workbook.xml").decode() == before.pop("xl/workbook.xml").decode().replace(
        names("false"), names("true"))
    assert after == before
    assert write_plain_names(path) == 0
