"""A workbook as Excel itself would have saved it: macro-enabled, its values counted as calculated, errors as errors."""

from io import BytesIO
from zipfile import ZipFile

from lxml import etree

from sheetfuncs.cells.block import ERROR_TEXTS
from sheetfuncs.hosts.excel.addin import packed

_MAIN = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}"
_PLAIN = b"application/vnd.openxmlformats-officedocument.spreadsheetml.sheet.main+xml"
_MACRO_ENABLED = b"application/vnd.ms-excel.sheet.macroEnabled.main+xml"
# The calculation engine of Excel 2019 and newer (as such files state it): an older one would make Excel calculate all
# cells anew on opening, and show #NAME? where the add-in is missing.
_ENGINE = "191029"


def as_saved_by_excel(book: bytes) -> bytes:
    """A book of XlsxWriter's, with what has to differ for stored values to stay until a cell is computed anew."""
    with ZipFile(BytesIO(book)) as package:
        parts = {name: package.read(name) for name in package.namelist()}
    parts["[Content_Types].xml"] = parts["[Content_Types].xml"].replace(_PLAIN, _MACRO_ENABLED)
    texts = ["".join(item.itertext()) for item in etree.fromstring(parts["xl/sharedStrings.xml"])]
    for name, content in parts.items():
        if name == "xl/workbook.xml":
            parts[name] = _calculated(content)
        elif name.startswith("xl/worksheets/sheet"):
            parts[name] = _true_errors(content, texts)
    return packed(parts)


def _calculated(workbook: bytes) -> bytes:
    root = etree.fromstring(workbook)
    settings = root.find(f"{_MAIN}calcPr")
    del settings.attrib["fullCalcOnLoad"]
    settings.set("calcId", _ENGINE)
    return _written(root)


def _true_errors(sheet: bytes, texts: list[str]) -> bytes:
    """Cells whose text is that of an error become error values."""
    root = etree.fromstring(sheet)
    for cell in root.iter(f"{_MAIN}c"):
        if cell.get("t") == "s" and texts[int(cell[0].text)] in ERROR_TEXTS:
            cell[0].text = texts[int(cell[0].text)]
            cell.set("t", "e")
    return _written(root)


def _written(root: etree._Element) -> bytes:
    return etree.tostring(root, xml_declaration=True, encoding="UTF-8", standalone=True)
