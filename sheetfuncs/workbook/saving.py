"""Files written beside and swapped in: an interrupted run leaves the old file as it was, and nothing else behind."""

from __future__ import annotations

import contextlib
import os
import secrets
import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from typing import BinaryIO, cast

from sheetfuncs.errors import WorkbookBusyError, WorkbookError


@contextmanager
def written_beside(path: str | os.PathLike[str]) -> Iterator[BinaryIO]:
    """A new file that takes the place of `path` when the block ends well, and disappears when it does not.

    Written under a random name in the same folder, fsynced, given the old file's permissions, then swapped in by one
    atomic rename. A symbolic link keeps pointing where it points; the file behind it is replaced.
    Raises WorkbookError, or WorkbookBusyError where another program holds the file.
    """
    target = os.path.realpath(path)
    folder, name = os.path.split(target)
    temporary = os.path.join(folder, f".{name[:100]}.{secrets.token_hex(8)}.tmp")
    file = _create(temporary, target)
    try:
        with file:
            yield file
            file.flush()
            os.fsync(file.fileno())
        _keep_permissions(target, temporary)
        os.replace(temporary, target)
    except BaseException as error:
        with contextlib.suppress(OSError):
            os.unlink(temporary)
        if isinstance(error, OSError):
            raise _refusal(target, error) from error
        raise
    _sync_folder(folder)


def _create(temporary: str, target: str) -> BinaryIO:
    try:
        flags = os.O_CREAT | os.O_EXCL | os.O_RDWR | getattr(os, "O_BINARY", 0)
        return cast(BinaryIO, os.fdopen(os.open(temporary, flags, 0o666), "w+b"))
    except OSError as error:
        raise _refusal(target, error) from error


def _keep_permissions(target: str, temporary: str) -> None:
    if not os.path.exists(target):
        return
    shutil.copymode(target, temporary)
    if hasattr(os, "chown"):
        owner = os.stat(target)
        with contextlib.suppress(PermissionError):
            os.chown(temporary, owner.st_uid, owner.st_gid)


def _refusal(target: str, error: OSError) -> WorkbookError:
    if isinstance(error, PermissionError) and os.path.isfile(target):
        return WorkbookBusyError(
            f"{target} cannot be replaced: another program holds it open, or you may not write to its folder. Close it "
            f"there, or choose another place."
        )
    return WorkbookError(
        f"{target} cannot be written: {error.strerror or error}. Choose a folder that is there, that you may write to, "
        f"and that has room."
    )


def _sync_folder(folder: str) -> None:
    """Make the rename itself durable, where the system lets a folder be opened."""
    if os.name != "posix":
        return
    with contextlib.suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)
