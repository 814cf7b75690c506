"""A workbook changed in place, and the way back.

The file as it was is kept beside the workbook as ".<stem>.before-check-<digest><ext>", where the digest is that of
the file that we wrote. So undoing needs no record of its own, the kept file opens by itself, and edits made since are
noticed: then undoing is refused, or, when forced, the edited file is kept under another name.
"""

from __future__ import annotations

import contextlib
import hashlib
import os
import re
import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass

from sheetfuncs.errors import WorkbookBusyError, WorkbookError
from sheetfuncs.workbook.formats import Book
from sheetfuncs.workbook.insert import Insertion, insert_sheet
from sheetfuncs.workbook.saving import written_beside

_PENDING = "pending"


@dataclass(frozen=True)
class Undone:
    """What `undo` did: the file brought back, and where later edits were kept (None if there were none)."""

    path: str
    edits: str | None


def insert_in_place(
    book: str | os.PathLike[str], sheet_book: Book, *, after: str | None = None, replace: str | None = None
) -> Insertion:
    """`insert_sheet` into the file itself, with the file as it was kept for `undo`."""
    with keep_for_undo(book):
        return insert_sheet(book, sheet_book, after=after, replace=replace, out=book)


@contextmanager
def keep_for_undo(path: str | os.PathLike[str]) -> Iterator[None]:
    """Keep the file as it is now, for `undo`, while the block changes it; a block that fails keeps nothing.

    What an earlier change kept is given up only when the block has ended well: undo takes back the latest change.
    """
    target = os.path.realpath(path)
    pending = _kept_name(target, _PENDING)
    _copy(target, pending)
    try:
        yield
    except BaseException:
        with contextlib.suppress(OSError):
            os.unlink(pending)
        raise
    kept = _kept_name(target, _digest(target))
    os.replace(pending, kept)
    for other in _kept_files(target):
        if other != kept:
            os.unlink(other)


def undo(path: str | os.PathLike[str], *, force: bool = False) -> Undone:
    """Bring the file back as it was before our latest change in place.

    Raises WorkbookError when nothing was kept, or when the file has changed since and `force` is not given; with
    `force` the changed file is kept as "<stem>-edited<ext>".
    """
    target = os.path.realpath(path)
    kept = _kept_files(target)
    if not kept:
        raise WorkbookError(
            f"There is nothing to undo for {os.path.basename(target)}: it was not changed in place, or that was undone."
        )
    present = os.path.exists(target)
    ours = _kept_name(target, _digest(target)) if present else kept[0]
    edits = None
    if ours not in kept:
        if not force:
            raise WorkbookError(
                f"{os.path.basename(target)} has changed since the sheet was written into it; undoing would take those "
                f"changes out. The file as it was is {kept[0]}. With force it is brought back, and the changed file is "
                f"kept beside it."
            )
        edits, ours = _free_name(target), kept[0]
        _copy(target, edits)
    try:
        os.replace(ours, target)
    except PermissionError as error:
        raise WorkbookBusyError(
            f"{target} cannot be replaced: another program holds it open. Close it there and try again."
        ) from error
    return Undone(target, edits)


def _kept_name(target: str, digest: str) -> str:
    folder, name = os.path.split(target)
    stem, extension = os.path.splitext(name)
    return os.path.join(folder, f".{stem}.before-check-{digest}{extension}")


def _kept_files(target: str) -> list[str]:
    """The kept files of a workbook, the newest first."""
    folder, name = os.path.split(target)
    stem, extension = os.path.splitext(name)
    pattern = re.compile(rf"\.{re.escape(stem)}\.before-check-([0-9a-f]{{16}}|{_PENDING}){re.escape(extension)}")
    found = [os.path.join(folder, other) for other in os.listdir(folder) if pattern.fullmatch(other)]
    return sorted(found, key=lambda other: os.stat(other).st_ctime_ns, reverse=True)


def _digest(path: str) -> str:
    with open(path, "rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()[:16]


def _copy(source: str, target: str) -> None:
    try:
        with open(source, "rb") as file, written_beside(target) as copy:
            shutil.copyfileobj(file, copy, 1 << 20)
        shutil.copystat(source, target)
    except FileNotFoundError:
        raise WorkbookError(f"There is no file {source}. Check the name and the folder.") from None


def _free_name(target: str) -> str:
    stem, extension = os.path.splitext(target)
    number, name = 1, f"{stem}-edited{extension}"
    while os.path.exists(name):
        number += 1
        name = f"{stem}-edited-{number}{extension}"
    return name
