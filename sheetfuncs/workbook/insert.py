"""One sheet of one workbook put into another, with everything else carried as it was."""

from __future__ import annotations

import os
from dataclasses import dataclass
from typing import BinaryIO

from sheetfuncs.errors import ArgumentError, SheetNameError, WorkbookFormatError
from sheetfuncs.workbook.archive import ArchiveWriter
from sheetfuncs.workbook.book import WorkbookXml
from sheetfuncs.workbook.formats import EXTENSIONS, Book, extension_of, open_package
from sheetfuncs.workbook.guest import Guest, renumber_tables
from sheetfuncs.workbook.package import Package
from sheetfuncs.workbook.properties import list_sheet
from sheetfuncs.workbook.removal import take_out
from sheetfuncs.workbook.saving import written_beside
from sheetfuncs.workbook.styles import StyleMerge, default_font, minimal_styles
from sheetfuncs.workbook.titles import check_title
from sheetfuncs.workbook.widths import fit_widths
from sheetfuncs.workbook.xml import integer, main

_RELATIONSHIP_TYPE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships/"
_STYLES_TYPE = "application/vnd.openxmlformats-officedocument.spreadsheetml.styles+xml"


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

    Raises WorkbookFormatError, WorkbookUnsafeError, WorkbookBusyError and SheetNameError, and WorkbookError where the
    sheet to replace holds something that others may depend on (a pivot table, a slicer, a table), each with a sentence.
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
            own_tables = {table.get("displayName", "").casefold() for table in guest.own_tables()}
            warnings += take_out(host, book_xml, index, own_tables)
        _merge(host, book_xml, guest, name)
        names = guest.transfer(host, name)
        _list(host, book_xml, names[guest.part], index, name, new=replace is None)
        book_xml.define(guest.defined_names(index, name))
        writer = ArchiveWriter(out)
        host.save(writer)
        return Insertion(name, tuple(warnings), len(host.added), len(host.removed))


def _place(book: WorkbookXml, after: str | None) -> int:
    return len(book.sheets) if after is None else book.index(after) + 1


def _refuse_taken_name(book: WorkbookXml, name: str) -> None:
    check_title(name)
    if name.casefold() in {other.casefold() for other in book.names}:
        raise SheetNameError(
            f"{book.package.label} already has a sheet {name!r}. Replace that sheet, or give the new one another name."
        )


def _merge(host: Package, book: WorkbookXml, guest: Guest, name: str) -> None:
    """Adapt the guest to the host's styles and tables."""
    part = _styles_part(host, book)
    host_styles, guest_styles = host.document(part), guest.shared("styles") or minimal_styles()
    fit_widths(guest.sheet, default_font(guest_styles.root), default_font(host_styles.root))
    styles = StyleMerge(host_styles, guest_styles)
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


def _warnings(host: Package, book: WorkbookXml) -> list[str]:
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
    return found


def _refuse_other_extension(host: Package, out_name: str) -> None:
    extension, wanted = extension_of(host), os.path.splitext(out_name)[1].lower()
    if wanted in EXTENSIONS.values() and wanted != extension:
        raise WorkbookFormatError(
            f"{host.label} is a {extension} workbook; under a name ending in {wanted} it would not open. Choose an "
            f"output name ending in {extension}."
        )
