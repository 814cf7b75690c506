"""workbook.xml: the list of sheets, the windows, and the defined names, and the few changes a new sheet needs there."""

from __future__ import annotations

from dataclasses import dataclass

from lxml import etree

from sheetfuncs.errors import SheetNameError, WorkbookFormatError
from sheetfuncs.workbook.formats import workbook_part
from sheetfuncs.workbook.package import Package
from sheetfuncs.workbook.xml import OFFICE_RELATIONSHIPS, child, children, ensure_child, integer, main

_ORDER = (
    "fileVersion", "fileSharing", "workbookPr", "workbookProtection", "bookViews", "sheets", "functionGroups",
    "externalReferences", "definedNames",
)  # fmt: skip
_RELATIONSHIP_ID = f"{{{OFFICE_RELATIONSHIPS}}}id"
_MOST_ID = 65_534


@dataclass(frozen=True)
class DefinedName:
    """A name of one sheet (`sheet` is its place from 0) or, with sheet None, of the workbook."""

    name: str
    formula: str
    sheet: int | None
    attributes: dict[str, str]


class WorkbookXml:
    """The workbook part of a package, read and edited in place."""

    def __init__(self, package: Package):
        self.package = package
        self.part = workbook_part(package)
        self.root = package.document(self.part).root
        if self.root.tag != main("workbook"):
            raise WorkbookFormatError(
                f"{package.label} is not an ordinary workbook: its main part is {self.root.tag!r}. Save it as 'Excel "
                f"Workbook (.xlsx)' and use that."
            )
        container = child(self.root, "sheets")
        self.sheets = children(container, "sheet")
        if container is None or not self.sheets:
            raise WorkbookFormatError(f"{package.label} has no sheets. Let the spreadsheet program repair it.")
        self._container = container

    @property
    def names(self) -> list[str]:
        return [sheet.get("name", "") for sheet in self.sheets]

    def index(self, name: str) -> int:
        """The place of a sheet, from 0; upper and lower case are the same, as in the host."""
        for index, other in enumerate(self.names):
            if other.casefold() == name.casefold():
                return index
        present = ", ".join(repr(other) for other in self.names[:8]) + (", ..." if len(self.names) > 8 else "")
        raise SheetNameError(f"{self.package.label} has no sheet {name!r}; its sheets are {present}.")

    def relationship_id(self, index: int) -> str:
        return self.sheets[index].get(_RELATIONSHIP_ID, "")

    def sheet_part(self, index: int) -> str:
        """The part that holds a sheet."""
        wanted = self.relationship_id(index)
        for relationship in self.package.relationships(self.part):
            if relationship.id == wanted and not relationship.external:
                name = self.package.find(relationship.part)
                if name is not None:
                    return name
        raise WorkbookFormatError(
            f"{self.package.label} is damaged: the sheet {self.names[index]!r} has no part. Let the spreadsheet "
            f"program repair it."
        )

    def insert(self, index: int, name: str, relationship_id: str) -> None:
        """List a new sheet at a place; whatever counts sheets by place (names, windows) moves along."""
        ids = [integer(sheet, "sheetId") for sheet in self.sheets]
        new_id = max(ids) + 1
        if new_id > _MOST_ID:
            new_id = next(number for number in range(1, _MOST_ID) if number not in set(ids))
        before = self.sheets[index - 1]
        made = etree.SubElement(self._container, main("sheet"), {"name": name, "sheetId": str(new_id)})
        made.set(_RELATIONSHIP_ID, relationship_id)
        self._container.insert(self._container.index(before) + 1, made)
        made.tail, before.tail = before.tail, self._container.text
        self.sheets.insert(index, made)
        for element in children(child(self.root, "definedNames"), "definedName"):
            _shift(element, "localSheetId", index)
        for view in children(child(self.root, "bookViews"), "workbookView"):
            _shift(view, "activeTab", index)
            _shift(view, "firstSheet", index)
        self.changed()

    def active(self) -> set[int]:
        """The sheets that the windows show on opening."""
        views = children(child(self.root, "bookViews"), "workbookView")
        return {integer(view, "activeTab") for view in views} or {0}

    def defined_names(self) -> list[DefinedName]:
        found = []
        for element in children(child(self.root, "definedNames"), "definedName"):
            sheet = None if element.get("localSheetId") is None else integer(element, "localSheetId")
            attributes = {
                str(key): str(value) for key, value in element.attrib.items() if key not in ("name", "localSheetId")
            }
            name = element.get("name", "")
            found.append(DefinedName(name, element.text or "", sheet, attributes))
        return found

    def define(self, names: list[DefinedName]) -> None:
        """Add names behind those that are there."""
        if not names:
            return
        container = ensure_child(self.root, "definedNames", _ORDER)
        for name in names:
            made = etree.SubElement(container, main("definedName"), {"name": name.name, **name.attributes})
            if name.sheet is not None:
                made.set("localSheetId", str(name.sheet))
            made.text = name.formula
        self.changed()

    def drop_names_of(self, index: int) -> None:
        """Remove the names that belong to one sheet."""
        container = child(self.root, "definedNames")
        if container is None:
            return
        for element in children(container, "definedName"):
            if element.get("localSheetId") == str(index):
                container.remove(element)
                self.changed()
        if not len(container):
            self.root.remove(container)

    def has_locked_structure(self) -> bool:
        protection = child(self.root, "workbookProtection")
        return protection is not None and protection.get("lockStructure") in ("1", "true")

    def changed(self) -> None:
        self.package.mark_changed(self.part)


def _shift(element: etree._Element, attribute: str, index: int) -> None:
    if element.get(attribute) is not None and integer(element, attribute) >= index:
        element.set(attribute, str(integer(element, attribute) + 1))
