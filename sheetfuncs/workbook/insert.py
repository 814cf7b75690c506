"""One sheet of one workbook put into another, with everything else carried as it was."""

from __future__ import annotations

import os
import re
from dataclasses import dataclass
from typing import BinaryIO

from sheetfuncs.errors import ArgumentError, SheetNameError, WorkbookFormatError
from sheetfuncs.workbook.archive import ArchiveWriter
from sheetfuncs.workbook.book import WorkbookXml
from sheetfuncs.workbook.formats import EXTENSIONS, Book, extension_of, open_package
from sheetfuncs.workbook.guest import Guest, renumber_tables
from sheetfuncs.workbook.package import Package
from sheetfuncs.workbook.properties import list_sheet
from sheetfuncs.workbook.saving import written_beside
from sheetfuncs.workbook.styles import StyleMerge, minimal_styles
from sheetfuncs.workbook.titles import check_title
from sheetfuncs.workbook.xml import integer, main

_RELATIONSHIP_TYPE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships/"
_STYLES_TYPE = "application/vnd.openxmlformats-officedocument.spreadsheetml.styles+xml"
_ANY_SHEET = re.compile(rb"\si\s*=")
_FORMULA = re.compile(rb"<(?:[\w.-]+:)?f[\s/>]")


@dataclass(frozen=True)
class Insertion:
    """What `insert_sheet` did: the sheet's name in the host, sentences worth reading, and parts added and removed."""

    name: str
    warnings: tuple[str, ...]
    added: int
    removed: int


def insert_sheet(
    book: Book,
    sheet_book: Book,
    *,
    after: str | None = None,
    replace: str | None = None,
    out: str | os.PathLike[str] | BinaryIO,
) -> Insertion:
    """Put the only sheet of `sheet_book` into `book` and write the result to `out`.

    The sheet goes right after the sheet named `after`, or last; with `replace` it takes that sheet's name, id and
    place, and parts that only the old sheet needed go. The workbook opens on the sheet it opened on before. Every zip
    entry that need not change is carried as the bytes it was. `out` may be the path of `book` itself: a path is
    written atomically, and a file object receives nothing before everything is checked.

    Raises WorkbookFormatError, WorkbookUnsafeError, WorkbookBusyError and SheetNameError, each with its sentence.
    """
    if isinstance(out, str | os.PathLike):
        with written_beside(out) as file:
            return _insert(book, sheet_book, after, replace, file, os.fspath(out))
    if out is book or out is sheet_book:
        raise ArgumentError("The output is the file object that is read; give another one, or a path.")
    return _insert(book, sheet_book, after, replace, out, "")


def _insert(
    book: Book, sheet_book: Book, after: str | None, replace: str | None, out: BinaryIO, out_name: str
) -> Insertion:
    with open_package(book) as host, open_package(sheet_book) as other:
        _refuse_other_extension(host, out_name)
        book_xml, guest = WorkbookXml(host), Guest(other)
        warnings = _warnings(host, book_xml)
        if replace is None:
            name, index = guest.name, _place(book_xml, after)
            _refuse_taken_name(book_xml, name)
        else:
            index = book_xml.index(replace)
            name = book_xml.names[index]
            _take_out(host, book_xml, index)
        _merge(host, book_xml, guest, name)
        names = guest.transfer(host, name)
        _list(host, book_xml, names[guest.part], index, name, new=replace is None)
        book_xml.define(guest.defined_names(index, name))
        writer = ArchiveWriter(out)
        host.save(writer)
        return Insertion(name, warnings, len(host.added), len(host.removed))


def _place(book: WorkbookXml, after: str | None) -> int:
    return len(book.sheets) if after is None else book.index(after) + 1


def _refuse_taken_name(book: WorkbookXml, name: str) -> None:
    check_title(name)
    if name.casefold() in {other.casefold() for other in book.names}:
        raise SheetNameError(
            f"{book.package.label} already has a sheet {name!r}. Replace that sheet, or give the new one another name."
        )


def _take_out(host: Package, book: WorkbookXml, index: int) -> None:
    """Remove a sheet's part and what only it needs; its line in the list of sheets stays for the new one."""
    part = book.sheet_part(index)
    arrow = next(arrow for arrow in host.relationships(book.part) if arrow.id == book.relationship_id(index))
    kept = host.reachable("", without=[arrow])
    gone = ({part} | host.reachable(part)) - kept
    if _holds_formulas(host, part):
        _drop_calculation_chain(host, book, book.sheets[index].get("sheetId", ""))
    for name in sorted(gone):
        host.remove(name)
    book.drop_names_of(index)


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
    listed = re.compile(rb"\si\s*=\s*[\"']" + sheet_id.encode() + rb"[\"']")
    for arrow in host.relationships(book.part):
        if arrow.kind == "calcChain" and (part := host.find(arrow.part)):
            chain = host.read(part)
            if listed.search(chain) or not _ANY_SHEET.search(chain):
                host.unrelate(book.part, arrow.id)
                host.remove(part)


def _merge(host: Package, book: WorkbookXml, guest: Guest, name: str) -> None:
    """Adapt the guest to the host's styles and tables."""
    part = _styles_part(host, book)
    styles = StyleMerge(host.document(part), guest.shared("styles") or minimal_styles())
    guest.adapt(name, styles)
    if styles.changed:
        host.mark_changed(part)
    tables = guest.own_tables()
    if tables:
        ids, names = _taken_by_tables(host, book)
        renumber_tables(tables, ids, names)


def _styles_part(host: Package, book: WorkbookXml) -> str:
    for arrow in host.relationships(book.part):
        if arrow.kind == "styles" and (name := host.find(arrow.part)):
            return name
    part = "xl/styles.xml" if host.is_free("xl/styles.xml") else "xl/styles_1.xml"
    host.add(part, minimal_styles(), _STYLES_TYPE)
    host.relate(book.part, _RELATIONSHIP_TYPE + "styles", part)
    return part


def _taken_by_tables(host: Package, book: WorkbookXml) -> tuple[set[int], set[str]]:
    parts = [part for part in host.reachable(book.part) if "/tables/" in part or host.content_type(part) == _TABLE_TYPE]
    roots = [host.document(part).root for part in parts if part.endswith(".xml")]
    tables = [root for root in roots if root.tag == main("table")]
    names = {table.get(key, "").casefold() for table in tables for key in ("name", "displayName")}
    names |= {name.name.casefold() for name in book.defined_names() if name.sheet is None}
    return {integer(table, "id") for table in tables}, names


_TABLE_TYPE = "application/vnd.openxmlformats-officedocument.spreadsheetml.table+xml"


def _list(host: Package, book: WorkbookXml, part: str, index: int, name: str, *, new: bool) -> None:
    if new:
        id_ = host.relate(book.part, _RELATIONSHIP_TYPE + "worksheet", part)
        book.insert(index, name, id_)
        list_sheet(host, book.names, index)
        return
    host.relate(book.part, _RELATIONSHIP_TYPE + "worksheet", part, id_=book.relationship_id(index))
    if index in book.active():
        # It was the sheet the workbook opened on, and the workbook opens where it did.
        for view in host.document(part).root.iter(main("sheetView")):
            view.set("tabSelected", "1")


def _warnings(host: Package, book: WorkbookXml) -> tuple[str, ...]:
    found = []
    kinds = {arrow.kind for arrow in host.relationships("")}
    if "origin" in kinds:
        found.append(
            f"{host.label} carries a digital signature. It stays in the file, but is not valid after this change; "
            f"sign the workbook again."
        )
    if book.has_locked_structure():
        found.append(f"The structure of {host.label} is protected; the sheet was added, and the protection stays.")
    if any(arrow.kind == "revisionHeaders" for arrow in host.relationships(book.part)):
        found.append(f"{host.label} is a shared workbook with a change history; the new sheet is not in that history.")
    return tuple(found)


def _refuse_other_extension(host: Package, out_name: str) -> None:
    extension, wanted = extension_of(host), os.path.splitext(out_name)[1].lower()
    if wanted in EXTENSIONS.values() and wanted != extension:
        raise WorkbookFormatError(
            f"{host.label} is a {extension} workbook; under a name ending in {wanted} it would not open. Choose an "
            f"output name ending in {extension}."
        )
