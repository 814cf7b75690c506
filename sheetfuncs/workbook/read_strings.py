"""The workbook's shared strings, and the text of one string item."""

from __future__ import annotations

import re
from collections.abc import Iterable
from xml.parsers import expat

from sheetfuncs.errors import WorkbookFormatError, WorkbookUnsafeError
from sheetfuncs.workbook.archive import MAX_READ
from sheetfuncs.workbook.package import Package
from sheetfuncs.workbook.xml import MAIN

_ESCAPE = re.compile("_x([0-9A-Fa-f]{4})_")
_NAMED = {"lt": "<", "gt": ">", "quot": '"', "apos": "'", "amp": "&"}
_REFERENCE = re.compile("&(lt|gt|quot|apos|amp|#[0-9]{1,8}|#x[0-9A-Fa-f]{1,8});")
_CHARACTERS = (0x20, 0xD7FF), (0xE000, 0xFFFD), (0x10000, 0x10FFFF)  # XML 1.0, production 2
_UNUSUAL = re.compile(f"]]>|&(?!{_REFERENCE.pattern[1:]})|[\x00-\x08\x0b-\x1f\ud800-\udfff\ufffe\uffff]")
_SI, _T, _PHONETIC = f"{MAIN} si", f"{MAIN} t", f"{MAIN} rPh"


def shared_strings(package: Package, workbook_part: str) -> list[str]:
    """Every shared string in order; rich text as plain text, phonetic hints left out."""
    for relationship in package.relationships(workbook_part):
        if relationship.kind == "sharedStrings" and not relationship.external:
            name = package.find(relationship.part)
            if name is not None:
                if package.archive.entry(name).size > MAX_READ:
                    raise WorkbookUnsafeError(
                        f"The texts of {package.label} take {package.archive.entry(name).size:,} bytes; at most "
                        f"{MAX_READ:,} are read."
                    )
                return _Strings(f"The part {name} of {package.label}").parse(package.archive.chunks(name))
    return []


def unescape(text: str) -> str:
    """Text as the cell shows it: _x000D_ stands for a character that XML cannot hold (18.18.97, ST_Xstring)."""
    if "_x" not in text:
        return text
    text = _ESCAPE.sub(lambda match: chr(int(match[1], 16)), text)
    return text.encode("utf-16", "surrogatepass").decode("utf-16", "replace")


def plain_text(piece: bytes) -> str | None:
    """The text of bytes that hold nothing XML would change or refuse; else None."""
    try:
        text = piece.decode()
    except UnicodeDecodeError:
        return None
    if _UNUSUAL.search(text) is not None:
        return None
    if "&" in text:
        text = _REFERENCE.sub(_referenced, text)
        if "\0" in text:
            return None
    return unescape(text)


def _referenced(match: re.Match[str]) -> str:
    """The character that a reference stands for; "\\0", which no XML can hold, where there is none."""
    name = match[1]
    if name in _NAMED:
        return _NAMED[name]
    code = int(name[2:], 16) if name[1] == "x" else int(name[1:])
    return chr(code) if code in (9, 10, 13) or any(first <= code <= last for first, last in _CHARACTERS) else "\0"


def feed(parser: expat.XMLParserType, chunks: Iterable[bytes], where: str) -> None:
    """Parse a part piece by piece. Raises WorkbookUnsafeError for a DOCTYPE, WorkbookFormatError for damaged XML."""

    def refuse(*_: object) -> None:
        raise WorkbookUnsafeError(f"{where} holds a DOCTYPE, which no workbook part may and which could pull in files.")

    parser.StartDoctypeDeclHandler = refuse
    parser.buffer_text = True
    try:
        for chunk in chunks:
            parser.Parse(chunk, False)
        parser.Parse(b"", True)
    except (expat.ExpatError, ValueError, LookupError) as error:
        raise WorkbookFormatError(f"{where} is damaged: {error}. Let the spreadsheet program repair it.") from error


class _Strings:
    def __init__(self, where: str):
        self.where = where
        self.found: list[str] = []
        self._pieces: list[str] = []
        self._phonetic = 0
        self._in_text = False

    def parse(self, chunks: Iterable[bytes]) -> list[str]:
        parser = expat.ParserCreate(namespace_separator=" ")
        parser.StartElementHandler, parser.EndElementHandler = self._start, self._end
        parser.CharacterDataHandler = self._text
        feed(parser, chunks, self.where)
        return self.found

    def _start(self, name: str, _attributes: dict[str, str]) -> None:
        if name == _T:
            self._in_text = not self._phonetic
        elif name == _SI:
            self._pieces.clear()
        elif name == _PHONETIC:
            self._phonetic += 1

    def _end(self, name: str) -> None:
        if name == _T:
            self._in_text = False
        elif name == _SI:
            self.found.append(unescape("".join(self._pieces)))
        elif name == _PHONETIC:
            self._phonetic -= 1

    def _text(self, text: str) -> None:
        if self._in_text:
            self._pieces.append(text)
