"""A workbook as a package of parts (ISO/IEC 29500-2): relationships, content types, and what changes on saving.

Parts are named without the leading slash, as their zip entries are. Everything is read on demand; on saving, entries
that nobody touched are carried as the bytes they were, in their old order, and new parts follow.
"""

from __future__ import annotations

import posixpath
import re
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from urllib.parse import unquote

from lxml import etree

from sheetfuncs.errors import WorkbookFormatError
from sheetfuncs.workbook.archive import Archive, ArchiveWriter
from sheetfuncs.workbook.xml import CONTENT_TYPES, PACKAGE_RELATIONSHIPS, Document, parse

TYPES_PART = "[Content_Types].xml"
_DECLARATION = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'


@dataclass(frozen=True)
class Relationship:
    """One arrow from a part (or, with source "", from the package) to another part or an outside address."""

    id: str
    type: str
    target: str
    external: bool
    source: str

    @property
    def kind(self) -> str:
        """The last word of the type, for instance "worksheet"."""
        return self.type.rsplit("/", 1)[-1]

    @property
    def part(self) -> str:
        """The part that an internal relationship points to, whether it is there or not."""
        return resolve(self.source, self.target)


def resolve(source: str, target: str) -> str:
    """The part name that a target means as seen from a source part; it never leaves the package."""
    path = unquote(target.replace("\\", "/").split("#", 1)[0])
    base = "/" if path.startswith("/") else posixpath.join("/", posixpath.dirname(source))
    return posixpath.normpath(posixpath.join(base, path)).lstrip("/")


def relationships_part(part: str) -> str:
    """The name of the part that holds a part's relationships."""
    folder, name = posixpath.split(part)
    return posixpath.join(folder, "_rels", f"{name}.rels")


class Package:
    """Reads parts of an archive and gathers the changes until `save`."""

    def __init__(self, archive: Archive):
        self.archive = archive
        self.label = archive.label
        self.added: dict[str, bytes | Document] = {}
        self.removed: set[str] = set()
        self._changed: set[str] = set()
        self._documents: dict[str, Document] = {}
        self._names = {unquote(entry.name).casefold(): entry.name for entry in archive.entries}

    def find(self, part: str) -> str | None:
        """The name under which a part stands in the archive (part names ignore case), or None."""
        if part in self.added:
            return part
        name = part if part in self.archive else self._names.get(unquote(part).casefold())
        return None if name in self.removed else name

    def is_free(self, part: str) -> bool:
        return self.find(part) is None and part.casefold() not in {name.casefold() for name in self.added}

    def read(self, part: str) -> bytes:
        return self.archive.read(self._require(part))

    def document(self, part: str) -> Document:
        """The parsed part, the same object every time, so that changes gather in it; see `mark_changed`."""
        name = self._require(part)
        if name in self.added:
            content = self.added[name]
            assert isinstance(content, Document)
            return content
        if name not in self._documents:
            self._documents[name] = parse(self.archive.read(name), f"The part {name} of {self.label}")
        return self._documents[name]

    def mark_changed(self, part: str) -> None:
        name = self._require(part)
        if name not in self.added:
            self._changed.add(name)

    def relationships(self, part: str) -> list[Relationship]:
        """The relationships of a part, in order; none if it has no such list."""
        name = self.find(relationships_part(part))
        if name is None:
            return []
        elements = self.document(name).root.iterfind(f"{{{PACKAGE_RELATIONSHIPS}}}Relationship")
        return [
            Relationship(
                element.get("Id", ""), element.get("Type", ""), element.get("Target", ""),
                element.get("TargetMode") == "External", part,
            )
            for element in elements
        ]  # fmt: skip

    def relate(self, source: str, type_: str, part: str, *, id_: str | None = None) -> str:
        """Point from a part to another: a new relationship, or an existing one given another target. Returns its id."""
        name = relationships_part(source)
        if self.find(name) is None:
            self.added[name] = parse(f'{_DECLARATION}<Relationships xmlns="{PACKAGE_RELATIONSHIPS}"/>'.encode(), name)
        root = self.document(name).root
        tag = f"{{{PACKAGE_RELATIONSHIPS}}}Relationship"
        element = next((other for other in root.iterfind(tag) if id_ is not None and other.get("Id") == id_), None)
        if element is None:
            id_ = id_ or _free_id(other.get("Id", "") for other in root.iterfind(tag))
            element = etree.SubElement(root, tag, {"Id": id_})
        element.set("Type", type_)
        element.set("Target", posixpath.relpath("/" + part, posixpath.join("/", posixpath.dirname(source))))
        element.attrib.pop("TargetMode", "")
        self.mark_changed(name)
        return element.get("Id", "")

    def unrelate(self, source: str, id_: str) -> None:
        name = relationships_part(source)
        root = self.document(name).root
        for element in root.iterfind(f"{{{PACKAGE_RELATIONSHIPS}}}Relationship"):
            if element.get("Id") == id_:
                root.remove(element)
                self.mark_changed(name)
                return

    def remove(self, part: str) -> None:
        """Take a part out, with its relationships and its content type."""
        name = self._require(part)
        self.removed.add(name)
        own = self.find(relationships_part(name))
        if own is not None:
            self.removed.add(own)
        root = self.document(TYPES_PART).root
        for element in root.iterfind(f"{{{CONTENT_TYPES}}}Override"):
            if _bare(element.get("PartName", "")) == _bare(name):
                root.remove(element)
                self.mark_changed(TYPES_PART)
                return

    def content_type(self, part: str) -> str | None:
        """The declared type of a part: its own, else that of its extension."""
        root = self.document(TYPES_PART).root
        for element in root.iterfind(f"{{{CONTENT_TYPES}}}Override"):
            if _bare(element.get("PartName", "")) == _bare(part):
                return element.get("ContentType")
        return self._default_type(part)

    def add(self, part: str, content: bytes | Document, type_: str | None) -> None:
        """Add a part; `type_` None for a list of relationships, which every package declares already."""
        self.added[part] = content
        if type_ is None or self._default_type(part) == type_:
            return
        root = self.document(TYPES_PART).root
        extension = posixpath.splitext(part)[1][1:]
        if extension != "xml" and self._default_type(part) is None:
            made = etree.Element(f"{{{CONTENT_TYPES}}}Default", {"Extension": extension, "ContentType": type_})
            root.insert(len(root.findall(f"{{{CONTENT_TYPES}}}Default")), made)
        else:
            etree.SubElement(root, f"{{{CONTENT_TYPES}}}Override", {"PartName": f"/{part}", "ContentType": type_})
        self.mark_changed(TYPES_PART)

    def reachable(self, *starts: str, without: Iterable[Relationship] = ()) -> set[str]:
        """All parts that can be reached from some parts ("" is the package), leaving out some relationships."""
        skipped = set(without)
        found: set[str] = set()
        waiting = list(starts)
        while waiting:
            part = waiting.pop()
            for relationship in self.relationships(part):
                name = None if relationship.external or relationship in skipped else self.find(relationship.part)
                if name is not None and name not in found:
                    found.add(name)
                    waiting.append(name)
        return found

    def save(self, writer: ArchiveWriter) -> None:
        """Write the package: old entries in their order, then the new parts."""
        fresh = {name: self._documents[name].to_bytes() for name in self._changed - self.removed}
        for entry in self.archive.entries:
            if entry.name in fresh:
                writer.write(entry.name, fresh[entry.name], like=entry)
            elif entry.name not in self.removed:
                writer.copy(self.archive, entry)
        for part, content in self.added.items():
            writer.write(part, content.to_bytes() if isinstance(content, Document) else content)
        writer.close(self.archive.comment)

    def _require(self, part: str) -> str:
        name = self.find(part)
        if name is None:
            raise WorkbookFormatError(
                f"{self.label} is damaged: its part {part} is missing. Open it in the spreadsheet program, let it "
                f"repair the file, and save it again."
            )
        return name

    def _default_type(self, part: str) -> str | None:
        extension = posixpath.splitext(part)[1][1:].casefold()
        for element in self.document(TYPES_PART).root.iterfind(f"{{{CONTENT_TYPES}}}Default"):
            if element.get("Extension", "").casefold() == extension:
                return element.get("ContentType")
        return None


def _bare(part: str) -> str:
    return unquote(part).lstrip("/").casefold()


def _free_id(taken: Iterable[str]) -> str:
    numbers: Iterator[int] = (int(match[1]) for id_ in taken if (match := re.fullmatch(r"rId(\d{1,8})", id_)))
    return f"rId{max(numbers, default=0) + 1}"
