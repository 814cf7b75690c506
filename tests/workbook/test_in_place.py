"""Changing a workbook in place, and taking that back without losing anything."""

from __future__ import annotations

import io
import os
from pathlib import Path

import pytest
from workbook_build import sheet_to_insert
from workbook_hosts import HOSTS

from sheetfuncs.errors import SheetNameError, WorkbookError
from sheetfuncs.workbook import insert_in_place, keep_for_undo, opened_by, undo


@pytest.fixture
def book(tmp_path: Path) -> Path:
    path = tmp_path / "Loads 2024.xlsx"
    path.write_bytes(HOSTS["xlsxwriter: plain"]())
    return path


def guest(**options) -> io.BytesIO:
    return io.BytesIO(sheet_to_insert(**options))


def test_undo_brings_the_very_bytes_back(book):
    before = book.read_bytes()
    os.chmod(book, 0o640)
    insert_in_place(book, guest())
    assert book.read_bytes() != before
    assert undo(book).edits is None
    assert book.read_bytes() == before
    assert book.stat().st_mode & 0o777 == 0o640
    assert os.listdir(book.parent) == [book.name]


def test_undo_goes_back_to_the_state_before_the_latest_change(book):
    insert_in_place(book, guest())
    middle = book.read_bytes()
    insert_in_place(book, guest(rows=20), replace="Check of Data")
    assert len(os.listdir(book.parent)) == 2
    undo(book)
    assert book.read_bytes() == middle
    with pytest.raises(WorkbookError, match="nothing to undo"):
        undo(book)


def test_the_kept_file_is_hidden_and_opens_by_itself(book):
    before = book.read_bytes()
    insert_in_place(book, guest())
    (kept,) = (other for other in book.parent.iterdir() if other != book)
    assert kept.name.startswith(".")
    assert kept.suffix == ".xlsx"
    assert kept.read_bytes() == before


def test_edits_made_since_are_never_lost(book):
    before = book.read_bytes()
    insert_in_place(book, guest())
    edited = book.read_bytes() + b" "
    book.write_bytes(edited)
    with pytest.raises(WorkbookError, match="has changed since"):
        undo(book)
    assert book.read_bytes() == edited
    done = undo(book, force=True)
    assert book.read_bytes() == before
    assert done.edits is not None
    assert Path(done.edits).read_bytes() == edited


def test_a_change_that_fails_keeps_the_earlier_way_back(book):
    before = book.read_bytes()
    insert_in_place(book, guest())
    after = book.read_bytes()
    with pytest.raises(SheetNameError):
        insert_in_place(book, guest())
    assert book.read_bytes() == after
    assert len(os.listdir(book.parent)) == 2
    undo(book)
    assert book.read_bytes() == before


def test_a_run_killed_between_leaves_a_way_back(book):
    """The process ends after the file was swapped in and before the digest is known."""
    before = book.read_bytes()
    keeping = keep_for_undo(book)
    keeping.__enter__()
    book.write_bytes(b"written by us")
    with pytest.raises(WorkbookError, match="has changed since"):
        undo(book)
    undo(book, force=True)
    assert book.read_bytes() == before


def test_workbooks_with_like_names_do_not_share_what_is_kept(book):
    other = book.with_name("Loads.xlsx")
    other.write_bytes(book.read_bytes())
    insert_in_place(book, guest())
    with pytest.raises(WorkbookError, match="nothing to undo"):
        undo(other)


def test_a_book_that_is_not_there_is_refused_in_a_sentence(tmp_path):
    with pytest.raises(WorkbookError, match="There is no file"):
        insert_in_place(tmp_path / "gone.xlsx", guest())
    assert os.listdir(tmp_path) == []


def test_owner_files_tell_who_has_the_book_open(book):
    assert opened_by(book) is None
    owner = book.with_name("~$" + book.name)
    owner.write_bytes(b"\x08Ann Orme" + b" " * 46 + b"\x08\0" + "Ann Orme".encode("utf-16-le"))
    sentence = opened_by(book)
    assert sentence is not None
    assert "by Ann Orme" in sentence
    assert owner.name in sentence
    owner.unlink()
    book.with_name(f".~lock.{book.name}#").write_text(",ann,desk,01.02.2024 10:00,file:///profile;")
    assert "by ann" in (opened_by(book) or "")


def test_an_owner_file_with_rubbish_still_counts(book):
    book.with_name("~$" + book.name).write_bytes(b"\xff\0\1\2")
    assert (opened_by(book) or "").startswith("Loads 2024.xlsx is open in a spreadsheet program.")
