"""Our functions' names in a workbook's formulas, written plainly, as every spreadsheet program reads them.

LibreOffice Calc saves names of its own, other programs put prefixes before functions that they did not know; see
`functions.spellings`. Calc 7.4 also shows the names that our sheets hide. Only the bytes of those names change:
everything else in the parts that hold them stays as it is, every other part is carried as the bytes it was, and a file
without such names is not written at all.
"""

from __future__ import annotations

import codecs
import heapq
import html
import os
import re
from collections.abc import Iterator
from functools import cached_property

from sheetfuncs.functions.registry import REGISTRY
from sheetfuncs.functions.spellings import Spellings, leads_to_our_addin
from sheetfuncs.workbook.archive import ArchiveWriter
from sheetfuncs.workbook.formats import open_package, workbook_part
from sheetfuncs.workbook.package import Package
from sheetfuncs.workbook.saving import written_beside
from sheetfuncs.workbook.xml import OFFICE_RELATIONSHIPS, children, main

# Where formulas stand in parts of a workbook, a sheet and a table; x14 rules have them in xm:f (MS-XLSX 2.5).
_OPENING = re.compile(
    rb"""<(?:[\w.-]+:)?(?:f|formula[12]?|definedName|calculatedColumnFormula|totalsRowFormula)
    (?:\s+[\w.:-]+\s*=\s*(?:"[^"<]*"|'[^'<]*'))*\s*>""",
    re.VERBOSE,
)
# Defined names of our sheets, which Calc 7.4 cannot hide and so writes with hidden="false", before the name.
_SHOWN = re.compile(rb"""<definedName\s[^<>]*?\bhidden="(false|0)"[^<>]*?\sname="_sheetfuncs_[^<>]*>""")
_ENTITY = re.compile(r"&(?:#\d{1,7}|#x[0-9a-fA-F]{1,6}|quot|apos|amp|lt|gt);")
_SIGNS = (b"fit_", b".fit")
"""One of them, in lower case, stands wherever a function of ours is named."""
_OUR_NAMES = b"_sheetfuncs_"
_ONE_A_BYTE = bytes(range(128)) + b"\xe9" * 128
"""Every byte of a letter beyond ASCII as a letter of latin-1: all that counts is that no name begins or ends there."""
_WIDE = {codecs.BOM_UTF16_LE: "utf-16-le", codecs.BOM_UTF16_BE: "utf-16-be"}


def write_plain_names(book: str | os.PathLike[str], *, keep_time: bool = False) -> int:
    """Spell our functions plainly in all formulas of a workbook file, and hide the names of our sheets again; returns
    how many names changed.

    With 0 the file was not touched. Else it is written beside and swapped in atomically. keep_time: it keeps the time
    of its last change, for a program that has it open and would take the change for someone else's.
    Raises WorkbookError and its kinds for a file that cannot be read or replaced; it is then as it was.
    """
    with open_package(book) as package:
        names = FormulaNames(package)
        looked_into = {part: names.patched(part) for part in names.parts() if names.may_name_ours(part)}
        patched = {part: data for part, data in looked_into.items() if data is not None}
    if not patched:
        return 0
    before = os.stat(book)
    with written_beside(book) as file, open_package(book) as package:
        writer = ArchiveWriter(file)
        for entry in package.archive.entries:
            if entry.name in patched:
                writer.write(entry.name, patched[entry.name], like=entry)
            else:
                writer.copy(package.archive, entry)
        writer.close(package.archive.comment)
    if keep_time:
        os.utime(book, ns=(before.st_atime_ns, before.st_mtime_ns))
    return names.count


class FormulaNames:
    """Names of our functions in the formulas of a package; count: how many `patched` has changed so far."""

    def __init__(self, package: Package):
        self.package = package
        self.count = 0
        self._spellings = Spellings(REGISTRY)

    def parts(self) -> Iterator[str]:
        """The parts where formulas stand: the workbook, its worksheets, their tables."""
        book = workbook_part(self.package)
        yield book
        for sheet in self._related(book, "worksheet"):
            yield sheet
            yield from self._related(sheet, "table")

    def may_name_ours(self, part: str) -> bool:
        """A quick look, without holding the part in memory: False is certain, True is not."""
        overlap = b""
        for chunk in self.package.archive.chunks(part):
            if not overlap and chunk[:2] in _WIDE:
                return True
            lowered = overlap + chunk.lower()
            if any(sign in lowered for sign in (*_SIGNS, _OUR_NAMES)):
                return True
            overlap = lowered[-len(_OUR_NAMES):]
        return False

    def patched(self, part: str) -> bytes | None:
        """The part with plain names, or None where all are plain."""
        data = self.package.read(part)
        wide = _WIDE.get(data[:2])
        if wide is None:
            return self._with_plain_names(data)
        narrow = self._with_plain_names(data[2:].decode(wide).encode())
        return None if narrow is None else data[:2] + narrow.decode().encode(wide)

    def _with_plain_names(self, data: bytes) -> bytes | None:
        hidden, shown = self._with_hidden_names(data)
        plain = self._with_plain_functions(hidden)
        return hidden if plain is None and shown else plain

    def _with_hidden_names(self, data: bytes) -> tuple[bytes, int]:
        """The part with the names of our sheets hidden, and how many were shown."""
        if _OUR_NAMES not in data:
            return data, 0
        pieces, done = [], 0
        for match in _SHOWN.finditer(data):
            pieces += [data[done : match.start(1)], b"true" if match[1] == b"false" else b"1"]
            done = match.end(1)
        shown = len(pieces) // 2
        self.count += shown
        return b"".join([*pieces, data[done:]]), shown

    def _with_plain_functions(self, data: bytes) -> bytes | None:
        pieces, done = [], 0
        for start, end in _formula_texts(data):
            for first, last, name in self._changes(data[start:end]):
                pieces += [data[done : start + first], name.encode()]
                done = start + last
                self.count += 1
        return b"".join([*pieces, data[done:]]) if pieces else None

    def _changes(self, formula: bytes) -> list[tuple[int, int, str]]:
        """As of `Spellings.changes`, for a formula as it stands in XML; places count bytes."""
        # One character a byte, and an entity as its character and NULs: so places in the text are those in the file.
        text = formula.translate(_ONE_A_BYTE).decode("latin-1")
        text = _ENTITY.sub(lambda match: html.unescape(match[0]).ljust(len(match[0]), "\0"), text)
        return self._spellings.changes(text, self._is_ours)

    def _is_ours(self, link: int) -> bool:
        # Calc drops links to add-ins from the list and leaves the numbers in the formulas.
        return link > len(self._links) or all(leads_to_our_addin(target) for target in self._links[link - 1])

    @cached_property
    def _links(self) -> list[list[str]]:
        """For each external link in its order, the files that it leads to."""
        book = workbook_part(self.package)
        listed = self.package.document(book).root.find(main("externalReferences"))
        by_id = {arrow.id: arrow for arrow in self.package.relationships(book)}
        found = []
        for reference in children(listed, "externalReference"):
            arrow = by_id.get(reference.get(f"{{{OFFICE_RELATIONSHIPS}}}id", ""))
            part = None if arrow is None else self.package.find(arrow.part)
            arrows = [] if part is None else self.package.relationships(part)
            found.append([arrow.target for arrow in arrows if arrow.external])
        return found

    def _related(self, part: str, kind: str) -> Iterator[str]:
        for arrow in self.package.relationships(part):
            name = self.package.find(arrow.part) if arrow.kind == kind and not arrow.external else None
            if name is not None:
                yield name


def _formula_texts(data: bytes) -> Iterator[tuple[int, int]]:
    """Where the texts of formulas stand that may name a function of ours, in order."""
    lowered = data.lower()
    done = 0
    for place in heapq.merge(*(_places(lowered, sign) for sign in _SIGNS)):
        if place < done:
            continue
        opening = _OPENING.match(data, data.rfind(b"<", done, place))
        done = data.find(b"<", place)
        if done < 0:
            return
        if opening is not None:
            yield opening.end(), done


def _places(data: bytes, wanted: bytes) -> Iterator[int]:
    place = data.find(wanted)
    while place >= 0:
        yield place
        place = data.find(wanted, place + 1)
