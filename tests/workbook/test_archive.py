"""Archives and XML that are not safe or not whole: each refused by name, none of them opened half."""

from __future__ import annotations

import contextlib
import io
import struct
import warnings
import zipfile
import zlib

import pytest
from workbook_build import sheet_to_insert, unzipped, zipped, zipped_by_hand
from workbook_hosts import HOSTS

from sheetfuncs.errors import WorkbookError, WorkbookFormatError, WorkbookUnsafeError
from sheetfuncs.workbook import insert_sheet
from sheetfuncs.workbook.archive import Archive, ArchiveWriter
from sheetfuncs.workbook.xml import parse


def files() -> dict[str, bytes]:
    return unzipped(HOSTS["xlsxwriter: plain"]())


def insert_into(book: bytes) -> bytes:
    out = io.BytesIO()
    insert_sheet(io.BytesIO(book), io.BytesIO(sheet_to_insert()), out=out)
    return out.getvalue()


def refused(book: bytes, error: type[WorkbookError], words: str) -> None:
    out = io.BytesIO()
    with pytest.raises(error, match=words) as caught:
        insert_sheet(io.BytesIO(book), io.BytesIO(sheet_to_insert()), out=out)
    assert type(caught.value) is error
    assert out.getvalue() == b""


@pytest.mark.parametrize("name", ["../evil.xml", "/etc/x", "a/../../b", "C:/x", "a\\b", "xl/../../x", "bell\x07.xml"])
def test_names_that_could_leave_the_package_are_refused(name):
    refused(zipped({**files(), name: b"<x/>"}), WorkbookUnsafeError, "could point outside")


@pytest.mark.parametrize("twin", ["xl/workbook.xml", "XL/Workbook.xml", "a"])
def test_a_name_that_is_there_twice_is_refused(twin):
    buffer = io.BytesIO(zipped({**files(), "a": b"1"}))
    with warnings.catch_warnings(), zipfile.ZipFile(buffer, "a") as archive:
        warnings.simplefilter("ignore")
        archive.writestr(twin, b"<other/>")
    refused(buffer.getvalue(), WorkbookUnsafeError, "twice")


@pytest.mark.parametrize("bit", [0, 6, 13])
def test_encrypted_entries_are_refused(bit):
    book = bytearray(zipped(files()))
    at = book.rfind(b"PK\1\2")
    book[at + 8 : at + 10] = struct.pack("<H", 1 << bit)
    refused(bytes(book), WorkbookFormatError, "is encrypted")


@pytest.mark.parametrize("method", [zipfile.ZIP_BZIP2, zipfile.ZIP_LZMA])
def test_other_compression_methods_are_refused(method):
    refused(zipped(files(), method=method), WorkbookFormatError, f"packed with method {method}")


def test_an_entry_that_inflates_beyond_reason_is_refused():
    refused(zipped({**files(), "xl/big.xml": bytes(30 << 20)}), WorkbookUnsafeError, "more than 400 times")


def test_a_picture_of_one_colour_is_carried_however_small_it_packs():
    book = zipped({**files(), "xl/media/image1.bmp": bytes(30 << 20)})
    assert len(unzipped(insert_into(book))["xl/media/image1.bmp"]) == 30 << 20


def test_an_entry_that_inflates_beyond_what_it_declares_is_refused():
    """A small size in the directory, a large stream behind it: only as much as declared is ever inflated."""
    book = zipped({**files(), "xl/workbook.xml": bytes(3 << 20)})
    declared, claimed = struct.pack("<L", 3 << 20), struct.pack("<L", 2000)
    refused(book.replace(declared, claimed), WorkbookUnsafeError, "more than the 2,000 bytes it declares")


def test_entries_that_overlap_are_refused():
    """Overlapping entries make one stream count many times (Fifield 2019, "A better zip bomb", section 2)."""
    book = bytearray(zipped(files()))
    last = book.rfind(b"PK\1\2")
    first = book.find(b"PK\1\2")
    book[last + 42 : last + 46] = book[first + 42 : first + 46]
    refused(bytes(book), WorkbookUnsafeError, "overlap")


def test_too_many_entries_are_refused():
    refused(zipped({f"e{n}": b"" for n in range(20_001)}), WorkbookUnsafeError, "20,001 zip entries")


def test_a_local_header_with_another_name_is_refused():
    book = zipped(files())
    at = book.find(b"xl/workbook.xml")
    refused(book[:at] + b"xl/wOrkbook.xml" + book[at + 15 :], WorkbookUnsafeError, "in two ways")


def test_a_truncated_file_is_damaged():
    book = zipped(files())
    for length in (40, len(book) // 2, len(book) - 30):
        refused(book[:length], WorkbookFormatError, "is damaged")


def test_a_changed_byte_in_a_part_that_is_read_is_noticed():
    book = zipped(files(), method=zipfile.ZIP_STORED)
    at = book.find(b"<sheets>")
    refused(book[: at + 1] + b"S" + book[at + 2 :], WorkbookFormatError, "check sum")


def test_rubbish_never_gives_anything_but_a_named_error():
    book = bytearray(zipped_by_hand(files(), zip64=True))
    for at in range(0, len(book), 97):
        damaged = bytes(book[:at]) + bytes([book[at] ^ 0x5A]) + bytes(book[at + 1 :])
        with contextlib.suppress(WorkbookError):
            insert_into(damaged)


@pytest.mark.parametrize("part", ["xl/workbook.xml", "xl/styles.xml", "[Content_Types].xml", "_rels/.rels"])
@pytest.mark.parametrize(
    "doctype",
    [
        '<!DOCTYPE x SYSTEM "file:///etc/hostname">',
        '<!DOCTYPE x [<!ENTITY a "ha"><!ENTITY b "&a;&a;&a;"><!ENTITY c "&b;&b;&b;">]>',
        '<!DOCTYPE x [<!ENTITY % p SYSTEM "http://localhost:9/x"> %p;]>',
    ],
)
def test_a_doctype_is_refused_in_every_part_that_is_read(part, doctype):
    changed = files()
    changed[part] = changed[part].replace(b"?>", b"?>" + doctype.encode(), 1)
    refused(zipped(changed), WorkbookUnsafeError, "DOCTYPE")


def test_a_doctype_in_utf_16_is_refused_too():
    text = '<?xml version="1.0" encoding="UTF-16"?><!DOCTYPE x [<!ENTITY a "b">]><x>&a;</x>'
    with pytest.raises(WorkbookUnsafeError, match="DOCTYPE"):
        parse(text.encode("utf-16"), "A part")


@pytest.mark.parametrize("encoding", ["utf-7", "utf-32", "EBCDIC-CP-US", "ISO-8859-1"])
def test_other_encodings_cannot_hide_anything(encoding):
    with pytest.raises(WorkbookFormatError, match="encoded as"):
        parse(f'<?xml version="1.0" encoding="{encoding}"?><x/>'.encode(), "A part")


def test_deep_nesting_is_refused():
    with pytest.raises(WorkbookFormatError, match="is damaged"):
        parse(b"<a>" * 5000 + b"</a>" * 5000, "A part")


def test_copied_entries_drop_descriptors_and_zip64_and_keep_the_rest():
    content = {"a.xml": b"<a/>" * 500, "b.bin": bytes(range(256)), "ü.txt": b"stored"}
    for options in ({"descriptors": True}, {"zip64": True}):
        source = Archive(io.BytesIO(zipped_by_hand(content, **options)), "test")
        out = io.BytesIO()
        writer = ArchiveWriter(out)
        for entry in source.entries:
            writer.copy(source, entry)
        writer.close()
        with zipfile.ZipFile(out) as archive:
            assert {info.filename: archive.read(info) for info in archive.infolist()} == content
            for info in archive.infolist():
                assert info.flag_bits == 0x0800
                assert info.extract_version == 20
                assert info.extra == struct.pack("<HHBL", 0x5455, 5, 1, 1_700_000_000)
                assert info.date_time == (2025, 0, 0, 12, 0, 0)
                local = struct.unpack_from("<4s5H3L2H", out.getvalue(), info.header_offset)
                assert local[6:9] == (info.CRC, info.compress_size, info.file_size)
                assert local[10] == 9


def test_a_non_seekable_target_is_enough():
    class Pipe(io.RawIOBase):
        def __init__(self):
            self.data = b""

        def write(self, data):
            self.data += bytes(data)
            return len(data)

    pipe = Pipe()
    writer = ArchiveWriter(pipe)  # type: ignore[arg-type]
    writer.write("a.xml", b"<a/>")
    writer.close(b"note")
    with zipfile.ZipFile(io.BytesIO(pipe.data)) as archive:
        assert (archive.read("a.xml"), archive.comment, zlib.crc32(b"<a/>")) == (
            b"<a/>",
            b"note",
            archive.infolist()[0].CRC,
        )
