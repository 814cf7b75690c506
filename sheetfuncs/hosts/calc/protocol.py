"""What the bridge inside LibreOffice and the worker process say to each other over the worker's pipes.

A message is a fixed head (magic, version, type, lengths), a small JSON object, and parts of bytes. A request's parts
are packed blocks of cells; an answer has at most one part. Every length is bounded before anything is read.

This file is copied into the extension: standard library only, and nothing newer than Python 3.8.
"""

from __future__ import annotations

import json
import struct
import sys
from array import array
from hashlib import sha256
from itertools import chain
from math import isfinite, nan

VERSION = 1
MAGIC = b"SfC\x1a"
REQUEST, ANSWER, PROGRESS = 1, 2, 3
MOST_PARTS = 64
LONGEST_JSON = 16_000_000
LONGEST_PART = 2_000_000_000

BLANK, NUMBER, BOOLEAN, TEXT, ERROR, DATE = range(6)  # as in sheetfuncs.cells.block.Kind
ERROR_TEXTS = frozenset({"#NULL!", "#DIV/0!", "#VALUE!", "#REF!", "#NAME?", "#NUM!", "#N/A"})

_START = (  # one thread for linear algebra: more of them wait for each other, and LibreOffice wants a core too
    "import os, sys; os.environ.update(dict.fromkeys(('OPENBLAS_NUM_THREADS', 'OMP_NUM_THREADS', 'MKL_NUM_THREADS',"
    " 'VECLIB_MAXIMUM_THREADS'), '1')); sys.path.append(sys.argv[1]);"
    " from sheetfuncs.hosts.calc.worker import main; main()"
)
_HEAD = struct.Struct("<4sBBHI")
_LENGTH = struct.Struct("<Q")
_PLACE = struct.Struct("<IIIIBHI")  # rows, columns, first row, first column, flags, length of the title, of the texts
_KINDS, _HIDDEN, _TITLED, _DATE1904 = 1, 2, 4, 8


def worker_command(settings: dict) -> list:
    """The command that starts a worker: no module is taken from the current folder (-P), which may hold anything.

    settings: as the installer wrote them, with interpreter and package_folder. Raises KeyError where one is missing.
    """
    return [settings["interpreter"], "-P", "-c", _START, settings["package_folder"]]


class ProtocolError(Exception):
    """Bytes that are no message of this version: the two sides do not understand each other."""


class Block:
    """A rectangle of cells, row after row.

    numbers: array('d') of rows * columns; NaN where the cell holds no number. kinds: a byte a cell (BLANK to DATE), or
    None where every cell is a NUMBER. texts: the strings of the TEXT and ERROR cells in the order of the cells.
    first_row, first_column: its place in the sheet, from 1. hidden: a byte a row, or None where nobody says.
    """

    def __init__(self, rows, columns, numbers, kinds=None, texts=(), *, first_row=1, first_column=1, sheet=None,
                 hidden=None, date1904=False):
        self.rows, self.columns = rows, columns
        self.numbers, self.kinds, self.texts = numbers, kinds, texts
        self.first_row, self.first_column, self.sheet = first_row, first_column, sheet
        self.hidden, self.date1904 = hidden, date1904


def block_of_rows(rows, **place) -> Block:
    """A block from rows of equal length; a cell is None or "", a number, a bool, a text, or an error's text."""
    width = len(rows[0]) if rows else 0
    if any(len(row) != width for row in rows):
        raise ProtocolError("The rows of a block must have equal lengths.")
    cells = list(chain.from_iterable(rows))
    odd = [index for index, cell in enumerate(cells) if type(cell) is not float or not isfinite(cell)]
    if not odd:
        return Block(len(rows), width, array("d", cells), **place)
    kinds, texts = bytearray([NUMBER]) * len(cells), []
    for index in odd:
        cell = cells[index]
        cells[index] = nan
        if cell is None or cell == "":
            kinds[index] = BLANK
        elif isinstance(cell, str):
            kinds[index] = ERROR if cell in ERROR_TEXTS else TEXT
            texts.append(cell)
        elif isinstance(cell, bool):
            kinds[index], cells[index] = BOOLEAN, float(cell)
        elif isfinite(cell):
            cells[index] = float(cell)
        else:
            kinds[index] = ERROR
            texts.append("#NUM!")
    return Block(len(rows), width, array("d", cells), bytes(kinds), texts, **place)


def rows_of_block(block: Block) -> list:
    """The cells as rows: None, float, bool or str."""
    cells = list(block.numbers)
    if block.kinds is not None:
        texts = iter(block.texts)
        for index, kind in enumerate(block.kinds):
            if kind in (TEXT, ERROR):
                cells[index] = next(texts)
            elif kind == BLANK:
                cells[index] = None
            elif kind == BOOLEAN:
                cells[index] = bool(cells[index])
    width = block.columns
    return [cells[start:start + width] for start in range(0, len(cells), width)] if width else [[]] * block.rows


def pack(block: Block) -> bytes:
    """The block as bytes."""
    title = b"" if block.sheet is None else block.sheet.encode("utf-8", "surrogatepass")
    texts = json.dumps(list(block.texts)).encode() if block.texts else b""
    flags = (
        (block.kinds is not None) * _KINDS | (block.hidden is not None) * _HIDDEN
        | (block.sheet is not None) * _TITLED | bool(block.date1904) * _DATE1904
    )
    place = _PLACE.pack(block.rows, block.columns, block.first_row, block.first_column, flags, len(title), len(texts))
    parts = [place, title, _little_endian(block.numbers), block.kinds or b"", block.hidden or b"", texts]
    return b"".join(parts)


def unpack(data) -> Block:
    """The block that `pack` made bytes of. Raises ProtocolError where the lengths do not fit."""
    view = memoryview(data)
    if len(view) < _PLACE.size:
        raise ProtocolError("A block of cells is cut short.")
    rows, columns, first_row, first_column, flags, title_length, text_length = _PLACE.unpack_from(view)
    cells = rows * columns
    lengths = (
        title_length, 8 * cells, cells if flags & _KINDS else 0, rows if flags & _HIDDEN else 0, text_length
    )
    if _PLACE.size + sum(lengths) != len(view):
        raise ProtocolError("A block of cells has another length than it says.")
    pieces, start = [], _PLACE.size
    for length in lengths:
        pieces.append(view[start:start + length])
        start += length
    title, numbers, kinds, hidden, texts = pieces
    try:
        sheet = bytes(title).decode("utf-8", "surrogatepass") if flags & _TITLED else None
    except UnicodeDecodeError:
        raise ProtocolError("The title of a block's sheet cannot be read.") from None
    return Block(
        rows, columns, _doubles(numbers), bytes(kinds) if flags & _KINDS else None, _texts(texts),
        first_row=first_row, first_column=first_column,
        sheet=sheet,
        hidden=bytes(hidden) if flags & _HIDDEN else None, date1904=bool(flags & _DATE1904),
    )


def digest(data) -> str:
    """A short name for these bytes, by which both sides call a block that was sent before."""
    return sha256(data).hexdigest()[:32]  # which most processors have a circuit for


def _texts(data) -> list:
    try:
        texts = json.loads(bytes(data)) if len(data) else []
    except ValueError:
        raise ProtocolError("The texts of a block cannot be read.") from None
    if not isinstance(texts, list) or not all(type(text) is str for text in texts):
        raise ProtocolError("The texts of a block are no list of texts.")
    return texts


def _little_endian(numbers):
    if sys.byteorder == "big":
        numbers = numbers[:]
        numbers.byteswap()
    return memoryview(numbers).cast("B")


def _doubles(data) -> array:
    numbers = array("d")
    numbers.frombytes(data)
    if sys.byteorder == "big":
        numbers.byteswap()
    return numbers


def write_message(stream, kind: int, head: dict, parts=()) -> None:
    """Write one message to a binary stream and flush it."""
    text = json.dumps(head).encode()
    if len(parts) > MOST_PARTS or len(text) > LONGEST_JSON or any(len(part) > LONGEST_PART for part in parts):
        raise ProtocolError("A message is longer than the other side accepts.")
    stream.write(_HEAD.pack(MAGIC, VERSION, kind, len(parts), len(text)))
    stream.write(text)
    for part in parts:
        stream.write(_LENGTH.pack(len(part)))
        stream.write(part)
    stream.flush()


def read_message(stream):
    """(kind, head, parts) of the next message, or None at the end of the stream.

    Raises ProtocolError for anything else: other bytes, another version, lengths out of bounds, an end within a
    message.
    """
    start = stream.read(_HEAD.size)
    if not start:
        return None
    if len(start) < _HEAD.size:
        raise ProtocolError("The stream ended within a message.")
    magic, version, kind, part_count, length = _HEAD.unpack(start)
    if magic != MAGIC:
        raise ProtocolError("The other side sent something that is no message.")
    if version != VERSION:
        raise ProtocolError(f"The other side speaks version {version} of the protocol, this one version {VERSION}.")
    if kind not in (REQUEST, ANSWER, PROGRESS) or part_count > MOST_PARTS or length > LONGEST_JSON:
        raise ProtocolError("A message announces a kind or a length that is not allowed.")
    try:
        head = json.loads(_exactly(stream, length))
    except ValueError:
        raise ProtocolError("The head of a message cannot be read.") from None
    if not isinstance(head, dict):
        raise ProtocolError("The head of a message is no object.")
    parts = []
    for _ in range(part_count):
        (length,) = _LENGTH.unpack(_exactly(stream, _LENGTH.size))
        if length > LONGEST_PART:
            raise ProtocolError("A message announces a part that is too long.")
        parts.append(_exactly(stream, length))
    return kind, head, parts


def _exactly(stream, length: int) -> bytes:
    data = stream.read(length)
    if len(data) < length:
        raise ProtocolError("The stream ended within a message.")
    return data
