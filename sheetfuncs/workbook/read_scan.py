"""Cells of a worksheet part, thousands at a time: array steps over the bytes for the forms that programs write.

A value cell as programs write it is <c r="B7" s="2" t="s"><v>12</v></c>, with a formula before the value or not. Such
cells are taken together; every other form of cell, row or text goes, as bytes, to the XML parser of read_cells, which
knows what the standard allows. In well-formed XML "<" is always markup outside comments and CDATA (whose presence
sends everything to the parser), so that the tags around a value can be told by the places of "<" alone.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import chain

import numpy as np

from sheetfuncs.cells.address import MAX_COLUMNS, MAX_ROWS
from sheetfuncs.cells.block import Kind
from sheetfuncs.workbook.read_attributes import ERROR, INLINE, OTHER, TEXT, CellAttributes
from sheetfuncs.workbook.read_cells import CellReader
from sheetfuncs.workbook.read_digits import digits_before_quote, parse_decimals, parse_whole, words_of
from sheetfuncs.workbook.read_gather import Gathering
from sheetfuncs.workbook.read_strings import plain_text
from sheetfuncs.workbook.xml import MAIN

SEGMENT = 1 << 20
_MOST_WITHOUT_ROW = 32 << 20
_MOST_HEAD = 1 << 20
_PAD = b" " * 64
_MASKS = np.array([(1 << 8 * size) - 1 for size in range(9)], np.uint64)
_ROOT = re.compile(rb"<worksheet\s[^>]*>")
_DATA = re.compile(rb"<sheetData\s*>")
_ENCODING = re.compile(rb"encoding=[\"']([^\"']+)")
_ZERO_HEIGHT = re.compile(rb"zeroHeight=[\"'](?:1|t|on)")
_HIDDEN_ROW = re.compile(rb"<row\s[^>]*?\bhidden=[\"'](?:1|true|on)[\"']")
_ROW_NUMBER = re.compile(rb"\sr=\"([0-9]{1,7})\"")


def scan_cells(chunks: Iterator[bytes], reader: CellReader) -> None:
    """Read a worksheet part into reader.gathering, by array steps where possible."""
    head, match = b"", None
    for chunk in chunks:
        head += chunk
        match = _DATA.search(head)
        if match is not None or len(head) > _MOST_HEAD:
            break
    root = _ROOT.search(head)
    if match is None or root is None or not _is_plain(head[: match.end()], root[0]):
        reader.read_part(chain([head], chunks))
    else:
        _Scan(reader, root[0]).read_rows(head[match.end() :], chunks)


def _is_plain(head: bytes, root: bytes) -> bool:
    """Whether the part is UTF-8, in the usual namespace without a prefix, and free of what the scan cannot tell."""
    declared = _ENCODING.search(head[:200])
    utf8 = declared is None or declared[1].lower() in (b"utf-8", b"us-ascii", b"ascii")
    usual = f'xmlns="{MAIN}"'.encode() in root
    return utf8 and usual and b"<!" not in head and _ZERO_HEIGHT.search(head) is None


class _Scan:
    """Cuts the stream of rows into segments of whole rows, and reads each by the fastest way it allows."""

    def __init__(self, reader: CellReader, root: bytes):
        self.reader = reader
        self.opening, self.closing = root + b"<sheetData>", b"</sheetData></worksheet>"
        self.attributes = CellAttributes(reader.date_formats)

    def read_rows(self, data: bytes, chunks: Iterator[bytes]) -> None:
        """Read from behind <sheetData> to the part's end."""
        while True:
            data, ended = _filled_up(data, chunks)
            end = data.find(b"</sheetData")
            if b"<!" in data or b"<?" in data or (ended and end < 0):
                self.reader.read_part(chain([self.opening, data], chunks))
                return
            cut = end if end >= 0 else data.rfind(b"</row>") + 6
            if cut > 5 or end >= 0:
                self.read_segment(data[:cut])
                data = data[cut:]
            elif len(data) > _MOST_WITHOUT_ROW:
                self.reader.read_part(chain([self.opening, data], chunks))
                return
            if end >= 0:
                for _ in chunks:  # to its end, where the check sum is compared
                    pass
                return

    def read_segment(self, data: bytes) -> None:
        found = _Marks.find(data + _PAD)
        if found is None:
            if data.strip():
                self.reader.read_part([self.opening, data, self.closing])
            return
        if b"hidden=" in data:
            for match in _HIDDEN_ROW.finditer(data):
                number = _ROW_NUMBER.search(data, match.start(), data.index(b">", match.start()))
                if number is not None:
                    self.reader.gathering.hide(int(number[1]))
        others = _Cells(found, self.attributes).put_into(self.reader.gathering)
        if others:
            self.reader.read_part([self.opening, b"<row>", *others, b"</row>", self.closing])
        self.reader.row = found.last_row


def _filled_up(data: bytes, chunks: Iterator[bytes]) -> tuple[bytes, bool]:
    """The data with more of the stream behind it, and whether the stream has ended."""
    pieces, size = [data], len(data)
    wanted = size + SEGMENT
    for chunk in chunks:
        pieces.append(chunk)
        size += len(chunk)
        if size >= wanted:
            return b"".join(pieces), False
    return b"".join(pieces), True


def _starts_with(words: np.ndarray, text: bytes) -> np.ndarray:
    return (words & _MASKS[len(text)]) == np.uint64(int.from_bytes(text, "little"))


@dataclass(frozen=True, eq=False)
class _Marks:
    """The places of "<" in a segment, the eight bytes there, and which of them begin cells.

    cells: int64 (n,), for each cell its place among `tags`; next_marks: the place of the cell, row or end of row that
    follows. last_row: the number of the segment's last row.
    """

    data: bytes
    words: np.ndarray
    tags: np.ndarray
    tag_words: np.ndarray
    cells: np.ndarray
    next_marks: np.ndarray
    last_row: int

    @classmethod
    def find(cls, data: bytes) -> _Marks | None:
        """None where something other than rows with numbers and cells with references stands in the segment."""
        words = words_of(data)
        tags = np.flatnonzero(np.frombuffer(data, np.uint8) == ord("<"))
        tag_words = words[tags]
        is_cell, is_row = _starts_with(tag_words, b"<c "), _starts_with(tag_words, b"<row ")
        marks = np.flatnonzero(is_cell | is_row | _starts_with(tag_words, b"</row>"))
        if not len(marks) or marks[0] != 0:
            return None
        following = np.append(marks[1:], len(tags))
        cell_marks = is_cell[marks]
        if (following[~cell_marks] - marks[~cell_marks] != 1).any():
            return None  # something else stands between rows, or a cell in another form begins a row
        if cell_marks[-1] or (cell_marks[:-1] & is_row[marks[1:]]).any():
            return None  # a row is not closed
        rows, cells = tags[is_row], marks[cell_marks]
        if not len(rows) or not _starts_with(words[rows + 4], b' r="').all():
            return None
        if not _starts_with(words[tags[cells] + 2], b' r="').all():
            return None
        last = rows[-1:] + 8
        number, good = parse_whole(words, last, digits_before_quote(words[last]))
        if not good[0]:
            return None
        return cls(data, words, tags, tag_words, cells, following[cell_marks], int(number[0]))


class _Cells:
    """The cells of a segment as arrays (n,): where they are, of what kind, and where their values stand."""

    def __init__(self, marks: _Marks, attributes: CellAttributes):
        self.marks = marks
        data, words, tags, tag_words = marks.data, marks.words, marks.tags, marks.tag_words
        starts, last = tags[marks.cells], marks.next_marks - 1
        count = marks.next_marks - marks.cells
        self.row, self.column, tail, good = _references(words, starts + 6)
        closed = _starts_with(tag_words[last], b"</c>")
        self.blank = good & ((count == 1) | ((count == 2) & closed))
        at = [tag_words[np.clip(last - back, 0, None)] for back in range(5)]  # from </c> backwards
        second = tag_words[np.minimum(marks.cells + 1, len(tags) - 1)]
        formula = _starts_with(second, b"<f ") | _starts_with(second, b"<f>") | _starts_with(second, b"<f/")
        formula &= (count == 5) | ((count == 6) & _starts_with(at[3], b"</f>"))
        value = ((count == 4) | formula) & _starts_with(at[2], b"<v>") & _starts_with(at[1], b"</v>")
        inline = (count == 6) & _starts_with(at[4], b"<is>") & _starts_with(at[3], b"<t>")
        inline &= _starts_with(at[2], b"</t>") & _starts_with(at[1], b"</is>")
        tag_end = tags[np.minimum(marks.cells + 1, len(tags) - 1)] - 1
        known = good & closed & (value | inline) & (np.frombuffer(data, np.uint8)[tag_end] == ord(">"))
        self.value_start = tags[np.clip(last - 2 - inline, 0, None)] + 3
        self.value_end = tags[np.clip(last - 1 - inline, 0, None)]
        self.kind, self.is_date = attributes.classify(data, words, tail, np.where(known, tag_end - tail, -1))
        known &= (self.kind != OTHER) & ((self.kind == INLINE) == inline)
        empty = self.value_start == self.value_end
        self.formula = known & formula
        self.stored = ~empty | (self.kind == TEXT)
        self.blank |= known & empty
        self.valued = known & ~empty

    def put_into(self, gathering: Gathering) -> list[bytes]:
        """Store the cells; returns the bytes of those that the scan cannot read."""
        filled = np.flatnonzero(self.valued)
        other = ~(self.valued | self.blank)
        used = np.flatnonzero(self.valued | self.formula)
        if len(used):
            gathering.touch(int(self.row[used].max()), int(self.column[used].max()))
        row, column = self.row - gathering.first_row, self.column - gathering.first_column
        inside = (self.row >= gathering.first_row) & (self.row <= gathering.last_row)
        inside &= (self.column >= gathering.first_column) & (self.column <= gathering.last_column)
        chosen = filled[inside[filled]]
        noted = used[(inside & self.formula)[used]]
        needed = used[inside[used]]
        if len(needed):
            gathering.reserve(int(row[needed].max()) + 1, int(column[needed].max()) + 1)
        group = np.minimum(self.kind[chosen], TEXT)
        for kind, put in enumerate((self._numbers, self._strings, self._booleans, self._texts)):
            picked = chosen[group == kind]
            if len(picked):
                good = put(gathering, picked, row[picked], column[picked])
                other[picked[~good]] = True
        noted = noted[~other[noted]]  # the parser marks the formulas that it reads
        gathering.mark_formulas(row[noted], column[noted], self.stored[noted])
        tags, cells, following = self.marks.tags, self.marks.cells, np.append(self.marks.tags, len(self.marks.data))
        odd = np.flatnonzero(other)
        bounds = zip(tags[cells[odd]].tolist(), following[self.marks.next_marks[odd]].tolist(), strict=True)
        return [self.marks.data[start:end] for start, end in bounds]

    def _numbers(self, gathering: Gathering, picked: np.ndarray, row: np.ndarray, column: np.ndarray) -> np.ndarray:
        marks = self.marks
        number, good = parse_decimals(marks.data, marks.words, self.value_start[picked], self.value_end[picked])
        good &= np.isfinite(number)
        kinds = np.where(self.is_date[picked], Kind.DATE, Kind.NUMBER).astype(np.uint8)
        gathering.put_many(row[good], column[good], kinds[good], number[good])
        return good

    def _strings(self, gathering: Gathering, picked: np.ndarray, row: np.ndarray, column: np.ndarray) -> np.ndarray:
        start = self.value_start[picked]
        number, good = parse_whole(self.marks.words, start, self.value_end[picked] - start)
        good &= number < np.uint64(1 << 31)
        gathering.put_many_shared(row[good], column[good], number[good].astype(np.int64))
        return good

    def _booleans(self, gathering: Gathering, picked: np.ndarray, row: np.ndarray, column: np.ndarray) -> np.ndarray:
        start = self.value_start[picked]
        text = self.marks.words[start] & np.uint64(0xFF)
        good = (self.value_end[picked] - start == 1) & ((text == ord("0")) | (text == ord("1")))
        gathering.put_many(row[good], column[good], Kind.BOOLEAN, (text[good] == ord("1")).astype(np.float64))
        return good

    def _texts(self, gathering: Gathering, picked: np.ndarray, row: np.ndarray, column: np.ndarray) -> np.ndarray:
        data = self.marks.data
        bounds = zip(self.value_start[picked].tolist(), self.value_end[picked].tolist(), strict=True)
        pieces = [data[start:end] for start, end in bounds]
        known = {piece: plain_text(piece) for piece in set(pieces)}
        texts = np.array([*(known[piece] for piece in pieces), None], object)[:-1]
        good = np.array([known[piece] is not None for piece in pieces])
        error = self.kind[picked] == ERROR
        texts[error] = [text and text.strip() for text in texts[error]]
        kinds = np.where(error, Kind.ERROR, Kind.TEXT).astype(np.uint8)
        gathering.put_many_texts(row[good], column[good], kinds[good], texts[good])
        return good


def _references(words: np.ndarray, starts: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Rows, columns, the places behind the closing quote, and whether the references such as B7 are well formed."""
    word = words[starts]
    letters = [((word >> np.uint64(8 * place)) & np.uint64(0xFF)) - np.uint64(ord("A")) for place in range(3)]
    one, two, three = (letter < 26 for letter in letters)
    two &= one
    three &= two
    number = [(letter + np.uint64(1)).astype(np.int64) for letter in letters]
    column = np.where(two, number[0] * 26 + number[1], number[0])
    column = np.where(three, column * 26 + number[2], column)
    digits = starts + one.astype(np.int64) + two + three
    count = digits_before_quote(words[digits])
    row, good = parse_whole(words, digits, np.where(count == 8, 0, count))
    good &= one & (row >= 1) & (row <= MAX_ROWS) & (column <= MAX_COLUMNS)
    return row.astype(np.int64), column, digits + count + 1, good
