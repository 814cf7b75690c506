"""The sheet to insert, as it comes from a package of its own, made fit for its host.

Shared strings become inline strings, format numbers become the host's, and references to its own name follow when it
takes another one. What hangs on the sheet (drawings, charts, pictures, tables) comes along under free names.
"""

from __future__ import annotations

import posixpath
import re
from collections.abc import Callable

from lxml import etree

from sheetfuncs.errors import SheetNameError, WorkbookFormatError
from sheetfuncs.workbook.book import DefinedName, WorkbookXml
from sheetfuncs.workbook.package import Package, Relationship, relationships_part, resolve
from sheetfuncs.workbook.references import rename_sheet
from sheetfuncs.workbook.styles import StyleMerge
from sheetfuncs.workbook.xml import PACKAGE_RELATIONSHIPS, Document, child, children, graft, integer, main

_DIFFERENTIAL = (
    "dxfId", "dataDxfId", "headerRowDxfId", "totalsRowDxfId", "headerRowBorderDxfId", "tableBorderDxfId",
    "totalsRowBorderDxfId",
)  # fmt: skip
_SHEET_LEVEL_ONLY = {"worksheet", "chartsheet", "officeDocument", "pivotTable", "pivotCacheDefinition", "slicer"}
_FORMULA_TAGS = {"f", "formula", "formula1", "formula2", "calculatedColumnFormula", "totalsRowFormula"}
OUR_PREFIX = "_sheetfuncs"


class Guest:
    """The only sheet of a package, with everything that belongs to it."""

    def __init__(self, package: Package):
        self.package = package
        self.book = WorkbookXml(package)
        if len(self.book.sheets) != 1:
            raise WorkbookFormatError(
                f"{package.label}, the workbook with the sheet to insert, has {len(self.book.sheets)} sheets; exactly "
                f"one is allowed."
            )
        self.name = self.book.names[0]
        self.part = self.book.sheet_part(0)

    @property
    def sheet(self) -> etree._Element:
        """The root of the sheet's own part."""
        return self.package.document(self.part).root

    def shared(self, kind: str) -> Document | None:
        """A part that the whole package shares, by the last word of its relationship, for instance "styles"."""
        for relationship in self.package.relationships(self.book.part):
            if relationship.kind == kind and self.package.find(relationship.part):
                return self.package.document(relationship.part)
        return None

    def defined_names(self, index: int, name: str) -> list[DefinedName]:
        """Its names as names of the host's sheet at `index`; ours are hidden."""
        made = []
        for own in self.book.defined_names():
            attributes = dict(own.attributes)
            if own.name.startswith(OUR_PREFIX):
                attributes["hidden"] = "1"
            made.append(DefinedName(own.name, rename_sheet(own.formula, self.name, name), index, attributes))
        return made

    def own_tables(self) -> list[etree._Element]:
        parts = sorted(self.package.reachable(self.part))
        roots = [self.package.document(part).root for part in parts if _is_xml(part)]
        return [root for root in roots if root.tag == main("table")]

    def adapt(self, name: str, styles: StyleMerge) -> None:
        """Change its parts in memory so that they are right in the host, under its name there."""
        _inline_strings(self.sheet, self.shared("sharedStrings"))
        _unselect(self.sheet)
        for part in [self.part, *sorted(self.package.reachable(self.part))]:
            if not _is_xml(part):
                continue
            root = self.package.document(part).root
            _map_formats(root, styles)
            if name != self.name:
                _rename_in(root, self.name, name)

    def transfer(self, host: Package, name: str) -> dict[str, str]:
        """Add its parts to the host under free names; returns the old names with the new ones, the sheet first."""
        parts = [self.part, *sorted(self.package.reachable(self.part))]
        self._refuse_foreign_parts(parts)
        names: dict[str, str] = {}
        for part in parts:
            wanted = "xl/worksheets/sheet1.xml" if part == self.part else part
            names[part] = _free_name(wanted, lambda name: host.is_free(name) and name not in names.values())
        for part in parts:
            content = self.package.document(part) if _is_xml(part) else self.package.read(part)
            host.add(names[part], content, self.package.content_type(part))
            self._transfer_relationships(part, names, host, name)
        return names

    def _transfer_relationships(self, part: str, names: dict[str, str], host: Package, name: str) -> None:
        source = self.package.find(relationships_part(part))
        if source is None:
            return
        document = self.package.document(source)
        for element in document.root.iterfind(f"{{{PACKAGE_RELATIONSHIPS}}}Relationship"):
            address = element.get("Target", "")
            target = self.package.find(resolve(part, address))
            if address.startswith("#"):  # a picture that leads to a cell
                element.set("Target", "#" + rename_sheet(address[1:], self.name, name))
            elif element.get("TargetMode") != "External" and target in names:
                folder = posixpath.join("/", posixpath.dirname(names[part]))
                element.set("Target", posixpath.relpath("/" + names[target], folder))
        host.add(relationships_part(names[part]), document, None)

    def _refuse_foreign_parts(self, parts: list[str]) -> None:
        arrows: list[Relationship] = [arrow for part in parts for arrow in self.package.relationships(part)]
        foreign = next((arrow for arrow in arrows if arrow.kind in _SHEET_LEVEL_ONLY), None)
        if foreign is not None:
            raise WorkbookFormatError(
                f"The sheet to insert holds a {foreign.kind}, which cannot be carried into another workbook."
            )


def renumber_tables(tables: list[etree._Element], taken_ids: set[int], taken_names: set[str]) -> None:
    """Give the guest's tables ids that are free in the host; a name that is taken there is refused."""
    following = max(taken_ids, default=0) + 1
    for table in tables:
        for name in {table.get("name", ""), table.get("displayName", "")} - {""}:
            if name.casefold() in taken_names:
                raise SheetNameError(f"The workbook already has a table or name {name!r}; the new sheet needs another.")
        table.set("id", str(following))
        following += 1


def _is_xml(part: str) -> bool:
    return part.endswith(".xml")


def _free_name(wanted: str, is_free: Callable[[str], bool]) -> str:
    """The wanted part name with the first number that is free."""
    stem, extension = posixpath.splitext(wanted)
    stem = re.sub(r"\d+$", "", stem)
    number = 1
    while not is_free(f"{stem}{number}{extension}"):
        number += 1
    return f"{stem}{number}{extension}"


def _inline_strings(sheet: etree._Element, shared: Document | None) -> None:
    items = [] if shared is None else children(shared.root, "si")
    for cell in sheet.iter(main("c")):
        if cell.get("t") != "s":
            continue
        value = child(cell, "v")
        if value is None:
            continue
        inline = graft(cell, _shared_item(items, value.text or ""))
        inline.tag = main("is")
        cell.remove(value)
        cell.set("t", "inlineStr")


def _shared_item(items: list[etree._Element], place: str) -> etree._Element:
    try:
        return items[int(place)]
    except (ValueError, IndexError):
        raise WorkbookFormatError(
            f"The sheet to insert uses a shared string {place[:20]!r} that is not there."
        ) from None


def _unselect(sheet: etree._Element) -> None:
    for view in sheet.iter(main("sheetView")):
        view.attrib.pop("tabSelected", "")
    for properties in children(sheet, "sheetPr"):
        properties.attrib.pop("codeName", "")
    for cell in sheet.iter(main("c")):
        # These point into a metadata part of the guest; without them a dynamic array is an ordinary array formula.
        cell.attrib.pop("cm", "")
        cell.attrib.pop("vm", "")


def _map_formats(root: etree._Element, styles: StyleMerge) -> None:
    for element in root.iter(main("c"), main("row"), main("col")):
        attribute = "style" if element.tag == main("col") else "s"
        if element.get(attribute) is not None:
            element.set(attribute, str(styles.cell_format(integer(element, attribute))))
    for element in root.iter(main("*")):
        for attribute in _DIFFERENTIAL:
            if element.get(attribute) is not None:
                element.set(attribute, str(styles.differential(integer(element, attribute))))


def _rename_in(root: etree._Element, old: str, new: str) -> None:
    for element in root.iter(etree.Element):
        if etree.QName(element).localname in _FORMULA_TAGS and element.text:
            element.text = rename_sheet(element.text, old, new)
        location = element.get("location")
        if location is not None and element.tag == main("hyperlink"):
            element.set("location", rename_sheet(location, old, new))
