"""Zip entries carried as the bytes they were.

The standard library reads and writes zip entries only through their content; a workbook that must lose nothing needs
its entries copied as compressed streams. This module alone knows the record layout (PKWARE APPNOTE 6.3.10, sections
4.3 and 4.5). It bounds what it reads, refuses what a workbook never needs (encryption, other compression methods,
names that differ only by case, overlapping entries), and never uses an entry's name as a path.
"""

from __future__ import annotations

import io
import struct
import zlib
from collections.abc import Iterator
from dataclasses import dataclass
from typing import BinaryIO

from sheetfuncs.errors import WorkbookFormatError, WorkbookUnsafeError

MAX_ENTRIES = 20_000
MAX_DIRECTORY = 16 << 20
MAX_ENTRY = 2 << 30
MAX_TOTAL = 6 << 30
MAX_READ = 512 << 20
"""Most bytes of one part that are ever held in memory at once."""
MAX_RATIO = 400
"""Worksheet XML shrinks 5 to 60 times; deflate cannot exceed 1,032. Small entries are exempt."""
RATIO_FROM = 4 << 20

STORED, DEFLATED = 0, 8
_ENCRYPTED = 1 << 0 | 1 << 6 | 1 << 13
_DESCRIPTOR = 1 << 3
_UTF8 = 1 << 11
_ZIP64 = 0x0001
_NO_VALUE = 0xFFFFFFFF
_CHUNK = 1 << 20
_FIRST_DAY = 1 << 5 | 1  # 1980-01-01 in the DOS form: entries of ours carry no clock, so equal input gives equal bytes

_LOCAL = struct.Struct("<4s5H3L2H")
_CENTRAL = struct.Struct("<4s6H3L5H2L")
_END = struct.Struct("<4s4H2LH")
_END64 = struct.Struct("<4sQ2H2L4Q")
_END64_LOCATOR = struct.Struct("<4sLQL")


@dataclass(frozen=True, slots=True)
class Entry:
    """One entry as the archive's directory describes it; `packed` and `size` are bytes before and after inflating."""

    name: str
    raw_name: bytes
    made_by: int
    needed: int
    flags: int
    method: int
    time: int
    date: int
    crc: int
    packed: int
    size: int
    internal: int
    external: int
    offset: int
    extra: bytes
    comment: bytes


class Archive:
    """The entries of one zip file, in the order of its directory. The file stays the caller's to close."""

    def __init__(self, file: BinaryIO, label: str):
        self.file, self.label = file, label
        start, count, size, self.comment = _find_directory(file, label)
        if count > MAX_ENTRIES or size > MAX_DIRECTORY:
            raise WorkbookUnsafeError(
                f"{label} lists {count:,} zip entries; a workbook has at most {MAX_ENTRIES:,}. Save it again from the "
                f"spreadsheet program it came from."
            )
        file.seek(start)
        self.entries = tuple(_read_directory(file.read(size), count, label))
        _refuse_unsafe(self.entries, start, label)
        self._by_name = {entry.name: entry for entry in self.entries}

    def __contains__(self, name: str) -> bool:
        return name in self._by_name

    def entry(self, name: str) -> Entry:
        return self._by_name[name]

    def locate(self, entry: Entry) -> tuple[int, bytes]:
        """Where the compressed stream begins, and the local header's extra field."""
        self.file.seek(entry.offset)
        head = self.file.read(_LOCAL.size)
        if len(head) < _LOCAL.size or head[:4] != b"PK\3\4":
            raise _damaged(self.label, f"the zip entry {entry.name!r} is not where the directory says")
        name_length, extra_length = _LOCAL.unpack(head)[-2:]
        name, extra = self.file.read(name_length), self.file.read(extra_length)
        if name != entry.raw_name:
            raise WorkbookUnsafeError(
                f"{self.label} names one zip entry in two ways ({entry.name!r} in its directory, {name!r} before the "
                f"data); which one counts cannot be told. Save it again from the spreadsheet program it came from."
            )
        return entry.offset + _LOCAL.size + name_length + extra_length, extra

    def raw_chunks(self, entry: Entry) -> Iterator[bytes]:
        """The compressed stream as it stands in the file."""
        start, _ = self.locate(entry)
        self.file.seek(start)
        left = entry.packed
        while left:
            chunk = self.file.read(min(left, _CHUNK))
            if not chunk:
                raise _damaged(self.label, f"it ends inside the zip entry {entry.name!r}")
            left -= len(chunk)
            yield chunk

    def chunks(self, name: str) -> Iterator[bytes]:
        """The content of an entry, inflated piece by piece, never more than the directory promised."""
        entry = self.entry(name)
        inflate = zlib.decompressobj(-zlib.MAX_WBITS)
        crc = total = 0
        for raw in self.raw_chunks(entry):
            while raw:
                try:
                    piece = raw if entry.method == STORED else inflate.decompress(raw, _CHUNK)
                except zlib.error as error:
                    raise _damaged(self.label, f"the zip entry {name!r} cannot be inflated") from error
                raw = b"" if entry.method == STORED else inflate.unconsumed_tail
                total, crc = total + len(piece), zlib.crc32(piece, crc)
                if total > entry.size:
                    raise WorkbookUnsafeError(
                        f"The zip entry {name!r} of {self.label} inflates to more than the {entry.size:,} bytes it "
                        f"declares. Save the workbook again from the spreadsheet program it came from."
                    )
                if piece:
                    yield piece
        if total != entry.size or crc != entry.crc:
            raise _damaged(self.label, f"the check sum of the zip entry {name!r} does not agree with its content")

    def read(self, name: str) -> bytes:
        """The whole content of an entry."""
        if self.entry(name).size > MAX_READ:
            raise WorkbookUnsafeError(
                f"The zip entry {name!r} of {self.label} holds {self.entry(name).size:,} bytes; at most {MAX_READ:,} "
                f"are read at once."
            )
        return b"".join(self.chunks(name))


class ArchiveWriter:
    """Writes an archive front to back; the target needs only `write`."""

    def __init__(self, file: BinaryIO):
        self._file = file
        self._offset = 0
        self._directory: list[bytes] = []

    def copy(self, archive: Archive, entry: Entry) -> None:
        """Carry an entry over: the same compressed bytes, with sizes in the header and no zip64 or descriptor."""
        _, local_extra = archive.locate(entry)
        local, central = _without_zip64(local_extra), _without_zip64(entry.extra)
        needed = 20 if entry.needed >= 45 else entry.needed
        self._begin(entry, needed, local, central)
        for chunk in archive.raw_chunks(entry):
            self._put(chunk)

    def write(self, name: str, data: bytes, *, like: Entry | None = None) -> None:
        """Add an entry with new content; `like` is the entry it takes the place of."""
        deflate = zlib.compressobj(6, zlib.DEFLATED, -zlib.MAX_WBITS)
        packed = deflate.compress(data) + deflate.flush()
        raw_name = like.raw_name if like else name.encode()
        flags = like.flags & _UTF8 if like else (0 if name.isascii() else _UTF8)
        external = like.external if like else 0
        entry = Entry(
            name, raw_name, 20, 20, flags, DEFLATED, 0, _FIRST_DAY, zlib.crc32(data), len(packed), len(data),
            0, external, 0, b"", b"",
        )  # fmt: skip
        self._begin(entry, 20, b"", b"")
        self._put(packed)

    def close(self, comment: bytes = b"") -> None:
        """Write the directory; the archive is complete only after this."""
        start, size = self._offset, sum(map(len, self._directory))
        for record in self._directory:
            self._put(record)
        count = len(self._directory)
        self._put(_END.pack(b"PK\5\6", 0, 0, count, count, size, start, len(comment)) + comment)

    def _begin(self, entry: Entry, needed: int, local: bytes, central: bytes) -> None:
        flags = entry.flags & ~_DESCRIPTOR
        sizes = (entry.crc, entry.packed, entry.size)
        name = entry.raw_name
        clock = (entry.time, entry.date)
        self._directory.append(
            _CENTRAL.pack(
                b"PK\1\2", entry.made_by, needed, flags, entry.method, *clock, *sizes, len(name), len(central),
                len(entry.comment), 0, entry.internal, entry.external, self._offset,
            ) + name + central + entry.comment
        )  # fmt: skip
        self._put(_LOCAL.pack(b"PK\3\4", needed, flags, entry.method, *clock, *sizes, len(name), len(local)))
        self._put(name + local)

    def _put(self, data: bytes) -> None:
        self._file.write(data)
        self._offset += len(data)
        if self._offset > _NO_VALUE - MAX_DIRECTORY:
            raise WorkbookFormatError("The workbook would exceed 4 GiB, the most that a plain zip file can hold.")


def _find_directory(file: BinaryIO, label: str) -> tuple[int, int, int, bytes]:
    """Start, entry count and size of the central directory, and the archive's comment."""
    length = file.seek(0, io.SEEK_END)
    tail_start = max(0, length - _END.size - 0xFFFF)
    file.seek(tail_start)
    tail = file.read()
    at = tail.rfind(b"PK\5\6")
    if at < 0 or len(tail) - at < _END.size:
        raise _damaged(label, "its zip directory is missing, as after an interrupted download")
    _, disk, first_disk, _, count, size, start, comment_length = _END.unpack_from(tail, at)
    comment = tail[at + _END.size :][:comment_length]
    end = tail_start + at
    if at >= _END64_LOCATOR.size and tail[at - _END64_LOCATOR.size :].startswith(b"PK\6\7"):
        end = _END64_LOCATOR.unpack_from(tail, at - _END64_LOCATOR.size)[2]
        file.seek(min(end, length))
        record = file.read(_END64.size)
        if len(record) < _END64.size or record[:4] != b"PK\6\6":
            raise _damaged(label, "its zip64 directory is missing")
        *_, disk, first_disk, _, count, size, start = _END64.unpack(record)
    if disk or first_disk or start + size != end or len(comment) != comment_length:
        raise _damaged(label, "its zip directory does not describe this file")
    return start, count, size, comment


def _read_directory(data: bytes, count: int, label: str) -> Iterator[Entry]:
    at = 0
    for _ in range(count):
        if data[at : at + 4] != b"PK\1\2" or len(data) - at < _CENTRAL.size:
            raise _damaged(label, "its zip directory is cut short")
        fields = _CENTRAL.unpack_from(data, at)
        _, made_by, needed, flags, method, time, date, crc, packed, size = fields[:10]
        name_length, extra_length, comment_length, _, internal, external, offset = fields[10:]
        at += _CENTRAL.size
        raw_name = data[at : at + name_length]
        extra = data[at + name_length : at + name_length + extra_length]
        at += name_length + extra_length
        comment = data[at : at + comment_length]
        at += comment_length
        size, packed, offset = _from_zip64(extra, (size, packed, offset), label)
        name = raw_name.decode("utf-8" if flags & _UTF8 else "cp437", "replace")
        yield Entry(
            name, raw_name, made_by, needed, flags, method, time, date, crc, packed, size,
            internal, external, offset, extra, comment,
        )  # fmt: skip


def _extra_fields(extra: bytes) -> Iterator[tuple[int, bytes]]:
    at = 0
    while at + 4 <= len(extra):
        kind, length = struct.unpack_from("<HH", extra, at)
        yield kind, extra[at + 4 : at + 4 + length]
        at += 4 + length


def _from_zip64(extra: bytes, values: tuple[int, int, int], label: str) -> Iterator[int]:
    """Sizes and offset, taken from the zip64 field where the plain record has no room (APPNOTE 4.5.3)."""
    wide = io.BytesIO(next((body for kind, body in _extra_fields(extra) if kind == _ZIP64), b""))
    for value in values:
        if value == _NO_VALUE:
            body = wide.read(8)
            if len(body) < 8:
                raise _damaged(label, "a zip64 entry lacks its sizes")
            value = int.from_bytes(body, "little")
        yield value


def _without_zip64(extra: bytes) -> bytes:
    fields = list(_extra_fields(extra))
    if all(kind != _ZIP64 for kind, _ in fields):
        return extra
    return b"".join(struct.pack("<HH", kind, len(body)) + body for kind, body in fields if kind != _ZIP64)


def _refuse_unsafe(entries: tuple[Entry, ...], directory_start: int, label: str) -> None:
    seen: set[str] = set()
    for entry in entries:
        _refuse_entry(entry, label)
        if entry.name.casefold() in seen:
            raise WorkbookUnsafeError(
                f"{label} holds {entry.name!r} twice (or names that differ only by case); which one counts cannot be "
                f"told. Save it again from the spreadsheet program it came from."
            )
        seen.add(entry.name.casefold())
    total = sum(entry.size for entry in entries)
    if total > MAX_TOTAL:
        raise WorkbookUnsafeError(f"{label} inflates to {total:,} bytes; at most {MAX_TOTAL:,} are opened.")
    end = 0
    for entry in sorted(entries, key=lambda entry: entry.offset):
        if entry.offset < end:
            raise WorkbookUnsafeError(f"{label} holds zip entries that overlap, which no spreadsheet program writes.")
        end = entry.offset + _LOCAL.size + len(entry.raw_name) + entry.packed
    if end > directory_start:
        raise _damaged(label, "a zip entry reaches beyond the data")


def _refuse_entry(entry: Entry, label: str) -> None:
    name = entry.name
    if entry.flags & _ENCRYPTED:
        raise WorkbookFormatError(
            f"The zip entry {name!r} of {label} is encrypted. Remove the password in the spreadsheet program and save."
        )
    if entry.method not in (STORED, DEFLATED):
        raise WorkbookFormatError(
            f"The zip entry {name!r} of {label} is packed with method {entry.method}; workbooks are stored or deflated."
        )
    if name[:1] in ("", "/") or ".." in name.split("/") or min(name) < " " or set(name) & set("\\:\ufffd"):
        raise WorkbookUnsafeError(
            f"{label} holds a zip entry named {name!r}, which is no part of a workbook and could point outside it. "
            f"Save it again from the spreadsheet program."
        )
    # A picture of one colour may shrink 1,000 times; it is copied and never inflated. Text is what may be read.
    text = name.casefold().endswith((".xml", ".rels", ".vml"))
    unpacked_limit = MAX_RATIO * max(entry.packed, RATIO_FROM // MAX_RATIO) if text else MAX_ENTRY
    if entry.size > min(unpacked_limit, MAX_ENTRY):
        raise WorkbookUnsafeError(
            f"The zip entry {name!r} of {label} inflates from {entry.packed:,} to {entry.size:,} bytes; more than "
            f"{MAX_RATIO} times or {MAX_ENTRY:,} bytes is not opened."
        )
    if entry.method == STORED and entry.packed != entry.size:
        raise _damaged(label, f"the stored zip entry {name!r} has two sizes")


def _damaged(label: str, what: str) -> WorkbookFormatError:
    return WorkbookFormatError(
        f"{label} is damaged: {what}. Open it in the spreadsheet program, let it repair the file, and save it again."
    )
