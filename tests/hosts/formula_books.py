"""Workbooks with functions of ours in cells, written as Excel writes them. All names and numbers are invented.

How Excel spells a function depends on where it knows it from: plain from the workbook's own project, [1]! and a link
from an add-in, _xll. from a compiled add-in, _xlfn. or _xludf. where it did not know it when it saved (ISO/IEC 29500-1
18.14 for links, MS-XLSX 2.2.2 for prefixes; _xll. and _xludf. common practice, no source).
"""

from __future__ import annotations

import zipfile
from dataclasses import dataclass
from pathlib import Path
from xml.etree import ElementTree
from xml.sax.saxutils import escape

import sheetfuncs

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
PACKAGE = "http://schemas.openxmlformats.org/package/2006"
TYPE = "application/vnd.openxmlformats-officedocument.spreadsheetml."
DECLARATION = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'
ADDIN = r"file:///C:\Users\Ida\AppData\Roaming\Microsoft\Excel\XLSTART\sheetfuncs.xlam"
SPELLINGS = {
    "plain": "{}", "future": "_xlfn.{}", "unknown": "_xludf.{}", "compiled": "_xll.{}", "linked": "[1]!{}",
}  # fmt: skip
STORED = 77.5
"""What every formula's cell has stored: no right value, so that a recalculation shows."""

COUNT = 24
LAST = COUNT + 1
HOURS = [[4.0 + 0.9 * i + (i * 7 % 5) * 0.6 - (i % 3) * 0.35] for i in range(COUNT)]
PANELS = [[2.0 + i + (i * 5 % 7) * 0.25, float(i * 11 % 6)] for i in range(COUNT)]
RESPONSE, PREDICTORS = f"A2:A{LAST}", f"B2:C{LAST}"


@dataclass(frozen=True)
class Formula:
    """text: with NAME{...} around each function of ours; area: the cells of an array or shared formula, else one."""

    area: str
    text: str
    kind: str = "cell"

    @property
    def first(self) -> str:
        return self.area.split(":")[0]

    def spelled(self, pattern: str) -> str:
        text = self.text
        for name in ("FIT_DURBIN_WATSON_P", "FIT_DURBIN_WATSON", "FIT_RESIDUALS", "FIT_VIF"):
            text = text.replace(f"{{{name}}}", pattern.format(name))
        return text


SINGLE = Formula("E2", f"{{FIT_DURBIN_WATSON}}({RESPONSE},{PREDICTORS})")
INSIDE = Formula("E3", f"1+ROUND({{FIT_DURBIN_WATSON_P}}({RESPONSE},{PREDICTORS},\"two-sided\"),9)")
TEXT = Formula("E4", f'IF({{FIT_VIF}}({PREDICTORS},1)>0,"_xlfn.FIT_VIF(A1) ""as text""","none")')
ARRAY = Formula(f"G2:G{LAST}", f"{{FIT_RESIDUALS}}({RESPONSE},{PREDICTORS})", "array")
DYNAMIC = Formula(f"H2:H{LAST}", f"{{FIT_RESIDUALS}}({RESPONSE},{PREDICTORS},\"leave-one-out\")", "dynamic")
SHARED = Formula("E6:E8", f"{{FIT_DURBIN_WATSON}}(A2:A${LAST},B2:C${LAST})", "shared")
NAMED = Formula("E10", "Spread*2")
OTHER = Formula("E11", "_xlfn.NOBODYS(A2)+1")
FORMULAS = (SINGLE, INSIDE, TEXT, ARRAY, DYNAMIC, SHARED, NAMED, OTHER)
NAME = Formula("Spread", f"{{FIT_VIF}}(Orders!$B$2:$C${LAST},1)")
RULE = Formula("A2:A9", f"{{FIT_DURBIN_WATSON}}($A$2:$A${LAST},$B$2:$C${LAST})>9")


def expected() -> dict[str, object]:
    """The right value of each cell with a formula of ours, by its address."""
    single = sheetfuncs.evaluate("FIT_DURBIN_WATSON", HOURS, PANELS)
    values: dict[str, object] = {
        "E2": single,
        "E3": 1 + round(sheetfuncs.evaluate("FIT_DURBIN_WATSON_P", HOURS, PANELS, "two-sided"), 9),
        "E4": '_xlfn.FIT_VIF(A1) "as text"',
    }
    for row, left in zip((6, 7, 8), range(3), strict=True):
        values[f"E{row}"] = sheetfuncs.evaluate("FIT_DURBIN_WATSON", HOURS[left:], PANELS[left:])
    for column, kind in (("G", "plain"), ("H", "leave-one-out")):
        residuals = sheetfuncs.evaluate("FIT_RESIDUALS", HOURS, PANELS, kind)
        values |= {f"{column}{row}": value for row, (value,) in enumerate(residuals, 2)}
    return values


def write_book(
    path: Path, spelling: str, *, link: str = ADDIN, protected: bool = False, filtered: bool = False,
    without: tuple[Formula, ...] = (),
) -> Path:
    """A workbook whose formulas spell our functions in one way; `spelling` is a key of SPELLINGS.

    filtered: a filter hides all rows but the first ones.
    """
    pattern = SPELLINGS[spelling]
    formulas = [formula for formula in FORMULAS if formula not in without]
    parts = {**_parts(pattern, link), "xl/worksheets/sheet1.xml": _sheet(formulas, pattern, protected, filtered)}
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as package:
        for name, text in parts.items():
            package.writestr(name, DECLARATION + text)
    return path


def cells_in(path: Path, part: str = "xl/worksheets/sheet1.xml") -> dict[str, tuple[str | None, str | None]]:
    """Formula and stored value of each cell, as they stand in the file."""
    with zipfile.ZipFile(path) as package:
        root = ElementTree.fromstring(package.read(part))
    found = {}
    for cell in root.iter(f"{{{MAIN}}}c"):
        found[cell.get("r", "")] = cell.findtext(f"{{{MAIN}}}f"), cell.findtext(f"{{{MAIN}}}v")
    return found


def names_in(path: Path) -> dict[str, str]:
    """Defined names and what they stand for, as they stand in the file."""
    with zipfile.ZipFile(path) as package:
        root = ElementTree.fromstring(package.read("xl/workbook.xml"))
    return {name.get("name", ""): name.text or "" for name in root.iter(f"{{{MAIN}}}definedName")}


def _parts(pattern: str, link: str) -> dict[str, str]:
    types = {
        "xl/workbook.xml": "sheet.main", "xl/worksheets/sheet1.xml": "worksheet", "xl/metadata.xml": "sheetMetadata",
        "xl/externalLinks/externalLink1.xml": "externalLink",
    }  # fmt: skip
    overrides = "".join(
        f'<Override PartName="/{name}" ContentType="{TYPE}{kind}+xml"/>' for name, kind in types.items()
    )
    names = "".join(f'<definedName name="{name}"/>' for name in ("FIT_DURBIN_WATSON", "FIT_RESIDUALS", "FIT_VIF"))
    return {
        "[Content_Types].xml": f'<Types xmlns="{PACKAGE}/content-types"><Default Extension="rels" ContentType="applicat'
        'ion/vnd.openxmlformats-package.relationships+xml"/><Default Extension="xml" ContentType="application/xml"/>'
        f"{overrides}</Types>",
        "_rels/.rels": _relationships(("officeDocument", "xl/workbook.xml")),
        "xl/workbook.xml": f'<workbook xmlns="{MAIN}" xmlns:r="{OFFICE}"><sheets><sheet name="Orders" sheetId="1" '
        'r:id="rId1"/></sheets><externalReferences><externalReference r:id="rId2"/></externalReferences><definedNames>'
        f'<definedName name="_xlnm._FilterDatabase" localSheetId="0" hidden="1">Orders!$A$1:$C${LAST}</definedName>'
        f'<definedName name="Spread">{escape(NAME.spelled(pattern))}</definedName></definedNames>'
        '<calcPr calcId="191029"/></workbook>',
        "xl/_rels/workbook.xml.rels": _relationships(
            ("worksheet", "worksheets/sheet1.xml"), ("externalLink", "externalLinks/externalLink1.xml"),
            ("sheetMetadata", "metadata.xml"),
        ),
        "xl/metadata.xml": METADATA,
        "xl/externalLinks/externalLink1.xml": f'<externalLink xmlns="{MAIN}"><externalBook xmlns:r="{OFFICE}" '
        f'r:id="rId1"><definedNames>{names}</definedNames></externalBook></externalLink>',
        "xl/externalLinks/_rels/externalLink1.xml.rels": _relationships(("externalLinkPath", link)).replace(
            '"/></', '" TargetMode="External"/></'
        ),
    }


def _relationships(*arrows: tuple[str, str]) -> str:
    lines = "".join(
        f'<Relationship Id="rId{number}" Type="{OFFICE}/{kind}" Target="{escape(target)}"/>'
        for number, (kind, target) in enumerate(arrows, 1)
    )
    return f'<Relationships xmlns="{PACKAGE}/relationships">{lines}</Relationships>'


def _sheet(formulas: list[Formula], pattern: str, protected: bool, filtered: bool) -> str:
    cells = {f"{column}1": _text_cell(f"{column}1", text) for column, text in zip("ABC", HEADERS, strict=True)}
    for row, (hours, panels) in enumerate(zip(HOURS, PANELS, strict=True), 2):
        for column, value in zip("ABC", hours + panels, strict=True):
            cells[f"{column}{row}"] = f'<c r="{column}{row}"><v>{value!r}</v></c>'
    for formula in formulas:
        cells |= _formula_cells(formula, escape(formula.spelled(pattern)))
    rows = ""
    for row in range(1, LAST + 1):
        inside = "".join(cells.get(f"{column}{row}", "") for column in "ABCDEFGH")
        hidden = ' hidden="1"' if filtered and row > 3 else ""
        rows += f'<row r="{row}"{hidden}>{inside}</row>'
    after = '<sheetProtection sheet="1" objects="1" scenarios="1"/>' if protected else ""
    if filtered:
        shown = '<customFilters><customFilter operator="lessThan" val="6"/></customFilters>'
        after += f'<autoFilter ref="A1:C{LAST}"><filterColumn colId="0">{shown}</filterColumn></autoFilter>'
    rule = f'<cfRule type="expression" priority="1"><formula>{escape(RULE.spelled(pattern))}</formula></cfRule>'
    rules = f'<conditionalFormatting sqref="{RULE.area}">{rule}</conditionalFormatting>'
    return f'<worksheet xmlns="{MAIN}"><sheetData>{rows}</sheetData>{after}{rules}</worksheet>'


HEADERS = ("Work time (h)", "Panel area (m²)", "Glaze colours")
METADATA = (
    f'<metadata xmlns="{MAIN}" xmlns:xda="http://schemas.microsoft.com/office/spreadsheetml/2017/dynamicarray">'
    '<metadataTypes count="1"><metadataType name="XLDAPR" minSupportedVersion="120000" copy="1" pasteAll="1" '
    'pasteValues="1" merge="1" splitFirst="1" rowColShift="1" clearFormats="1" clearComments="1" assign="1" coerce="1" '
    'cellMeta="1"/></metadataTypes><futureMetadata name="XLDAPR" count="1"><bk><extLst><ext '
    'uri="{bdbb8cdc-fa1e-496e-a857-3c3f30c029c3}"><xda:dynamicArrayProperties fDynamic="1" fCollapsed="0"/></ext>'
    '</extLst></bk></futureMetadata><cellMetadata count="1"><bk><rc t="1" v="0"/></bk></cellMetadata></metadata>'
)


def _text_cell(address: str, text: str) -> str:
    return f'<c r="{address}" t="inlineStr"><is><t>{escape(text)}</t></is></c>'


def _formula_cells(formula: Formula, text: str) -> dict[str, str]:
    value = f"<v>{STORED}</v>"
    if formula.kind == "cell":
        return {formula.first: f'<c r="{formula.first}"><f>{text}</f>{value}</c>'}
    first, last = formula.area.split(":")
    others = [f"{first[0]}{row}" for row in range(int(first[1:]) + 1, int(last[1:]) + 1)]
    kind = 't="shared" si="0"' if formula.kind == "shared" else 't="array"'
    mark = ' cm="1"' if formula.kind == "dynamic" else ""
    follow = '<f t="shared" si="0"/>' if formula.kind == "shared" else ""
    cells = {first: f'<c r="{first}"{mark}><f {kind} ref="{formula.area}">{text}</f>{value}</c>'}
    return cells | {address: f'<c r="{address}">{follow}{value}</c>' for address in others}
