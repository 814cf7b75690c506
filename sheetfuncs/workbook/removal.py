"""A sheet's part taken out of a package, so that another can stand in its place."""

from __future__ import annotations

import re

from sheetfuncs.errors import WorkbookError
from sheetfuncs.workbook.book import WorkbookXml
from sheetfuncs.workbook.package import Package
from sheetfuncs.workbook.xml import main

_ANY_SHEET = re.compile(rb"\si\s*=")
_FORMULA = re.compile(rb"<(?:[\w.-]+:)?f[\s/>]")
_NEEDED_ELSEWHERE = {"pivotTable": "a pivot table", "slicer": "a slicer", "timeline": "a timeline"}
_REMARKS = {"comments": "notes", "threadedComment": "comments"}


def take_out(host: Package, book: WorkbookXml, index: int, tables_to_come: set[str]) -> list[str]:
    """Remove a sheet's part, its names, and the parts that only it needs; its line in the list of sheets stays.

    `tables_to_come` are the tables (in lower case) that the new sheet brings under the same names. Returns warnings.
    Raises WorkbookError where the old sheet holds something that other parts of the workbook depend on.
    """
    part, title = book.sheet_part(index), book.names[index]
    arrow = next(arrow for arrow in host.relationships(book.part) if arrow.id == book.relationship_id(index))
    kept = host.reachable("", without=[arrow])
    gone = ({part} | host.reachable(part)) - kept
    _refuse_dependencies(host, part, title, tables_to_come)
    warnings = _remarks_lost(host, part, title)
    if _holds_formulas(host, part):
        _drop_calculation_chain(host, book, book.sheets[index].get("sheetId", ""))
    for name in sorted(gone):
        host.remove(name)
    book.drop_names_of(index)
    return warnings


def _refuse_dependencies(host: Package, part: str, title: str, tables_to_come: set[str]) -> None:
    """What a slicer or a formula on another sheet may count on must not disappear under it."""
    for arrow in host.relationships(part):
        what = _NEEDED_ELSEWHERE.get(arrow.kind)
        if arrow.kind == "table" and host.find(arrow.part):
            root = host.document(arrow.part).root
            name = root.get("displayName") or root.get("name") or ""
            if root.tag == main("table") and name.casefold() not in tables_to_come:
                what = f"the table {name!r}"
        if what is not None:
            raise WorkbookError(
                f"The sheet {title!r} holds {what}, which would be lost when the sheet is written anew. Move it to "
                f"another sheet, save, and run again."
            )


def _remarks_lost(host: Package, part: str, title: str) -> list[str]:
    kinds = {arrow.kind for arrow in host.relationships(part)}
    found = [words for kind, words in _REMARKS.items() if kind in kinds]
    if not found:
        return []
    return [
        f"The sheet {title!r} held {' and '.join(found)}; they are not on the sheet written anew. The file as it was "
        f"before still has them."
    ]


def _holds_formulas(host: Package, part: str) -> bool:
    overlap = b""
    for chunk in host.archive.chunks(part):
        if chunk[:2] in (b"\xff\xfe", b"\xfe\xff") and not overlap:
            return True  # UTF-16: rare, and dropping the chain is always safe, for hosts build it again
        if _FORMULA.search(overlap + chunk):
            return True
        overlap = chunk[-80:]
    return False


def _drop_calculation_chain(host: Package, book: WorkbookXml, sheet_id: str) -> None:
    """Remove the order of calculation if it lists the sheet's cells; programs work it out again."""
    listed = re.compile(rb"\si\s*=\s*[\"']" + re.escape(sheet_id.encode()) + rb"[\"']")
    for arrow in host.relationships(book.part):
        if arrow.kind == "calcChain" and (part := host.find(arrow.part)):
            chain = host.read(part)
            if listed.search(chain) or not _ANY_SHEET.search(chain):
                host.unrelate(book.part, arrow.id)
                host.remove(part)
