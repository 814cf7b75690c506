"""An interrupted run leaves the original as it was, and nothing else behind."""

from __future__ import annotations

import errno
import io
import os
import subprocess
import sys
import textwrap
from pathlib import Path

import pytest
from workbook_build import sheet_to_insert
from workbook_hosts import HOSTS

from sheetfuncs.errors import SheetNameError, WorkbookBusyError, WorkbookError
from sheetfuncs.workbook import insert_sheet
from sheetfuncs.workbook.archive import ArchiveWriter
from sheetfuncs.workbook.saving import written_beside


@pytest.fixture
def book(tmp_path: Path) -> Path:
    path = tmp_path / "loads.xlsx"
    path.write_bytes(HOSTS["xlsxwriter: plain"]())
    return path


def insert(book: Path, out: Path | None = None) -> None:
    insert_sheet(book, io.BytesIO(sheet_to_insert()), out=out or book)


def test_the_book_itself_may_be_the_target(book):
    before = book.stat()
    insert(book)
    assert book.stat().st_size > before.st_size
    assert os.listdir(book.parent) == [book.name]


@pytest.mark.parametrize(
    ("error", "expected"),
    [
        (PermissionError(errno.EACCES, "in use"), WorkbookBusyError),
        (OSError(errno.EIO, "failed"), WorkbookError),
        (KeyboardInterrupt(), KeyboardInterrupt),
    ],
)
def test_a_swap_that_fails_leaves_the_original(book, monkeypatch, error, expected):
    before = book.read_bytes()

    def fail(*_):
        raise error

    monkeypatch.setattr(os, "replace", fail)
    with pytest.raises(expected):
        insert(book)
    assert book.read_bytes() == before
    assert os.listdir(book.parent) == [book.name]


@pytest.mark.parametrize(
    ("error", "expected"),
    [(OSError(errno.ENOSPC, "No space left on device"), WorkbookError), (KeyboardInterrupt(), KeyboardInterrupt)],
)
def test_a_write_that_breaks_off_leaves_the_original(book, monkeypatch, error, expected):
    before, copy, calls = book.read_bytes(), ArchiveWriter.copy, []

    def fail_later(self, *arguments):
        calls.append(arguments)
        if len(calls) > 3:
            raise error
        copy(self, *arguments)

    monkeypatch.setattr(ArchiveWriter, "copy", fail_later)
    with pytest.raises(expected):
        insert(book)
    assert len(calls) > 3
    assert book.read_bytes() == before
    assert os.listdir(book.parent) == [book.name]


def test_a_refusal_leaves_the_original_and_no_other_file(book):
    before = book.read_bytes()
    with pytest.raises(SheetNameError):
        insert_sheet(book, io.BytesIO(sheet_to_insert()), after="Nowhere", out=book.with_name("new.xlsx"))
    assert book.read_bytes() == before
    assert os.listdir(book.parent) == [book.name]


def test_a_process_that_dies_in_the_middle_leaves_the_original(book):
    before = book.read_bytes()
    program = f"""
        import os
        from sheetfuncs.workbook.saving import written_beside
        with written_beside({str(book)!r}) as file:
            file.write(b"half")
            file.flush()
            os._exit(9)
    """
    folder = Path(__file__).parents[2]
    assert subprocess.run([sys.executable, "-c", textwrap.dedent(program)], cwd=folder, check=False).returncode == 9
    assert book.read_bytes() == before


def test_a_file_object_receives_nothing_before_everything_is_checked(book):
    out = io.BytesIO()
    with pytest.raises(SheetNameError):
        insert_sheet(book, io.BytesIO(sheet_to_insert("Other")), out=out)
    assert out.getvalue() == b""


@pytest.mark.skipif(os.name != "posix", reason="permission bits and links of POSIX systems")
def test_permissions_stay_and_a_link_keeps_pointing(book):
    book.chmod(0o604)
    link = book.with_name("link.xlsx")
    link.symlink_to(book.name)
    insert(link)
    assert link.is_symlink()
    assert book.stat().st_mode & 0o777 == 0o604
    new = book.with_name("new.xlsx")
    insert_sheet(io.BytesIO(HOSTS["xlsxwriter: plain"]()), io.BytesIO(sheet_to_insert()), out=new)
    umask = os.umask(0)
    os.umask(umask)
    assert new.stat().st_mode & 0o777 == 0o666 & ~umask


def test_a_folder_that_is_not_there_is_refused_in_a_sentence(book):
    with pytest.raises(WorkbookError, match="cannot be written"):
        insert(book, book.parent / "nowhere" / "out.xlsx")
    (book.parent / "folder.xlsx").mkdir()
    with pytest.raises(WorkbookError, match="cannot be written"):
        insert(book, book.parent / "folder.xlsx")


def test_a_long_name_is_no_obstacle(tmp_path):
    path = tmp_path / ("ü" * 120 + ".xlsx")
    with written_beside(path) as file:
        file.write(b"content")
    assert path.read_bytes() == b"content"
