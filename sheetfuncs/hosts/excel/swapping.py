"""Several files replaced together: all of them, or none."""

from __future__ import annotations

import contextlib
import os
import secrets
from collections.abc import Callable, Mapping
from pathlib import Path

WAITING = ".sheetfuncs-"
"""What the name of a file that waits to be swapped in begins with."""


def replace_together(contents: Mapping[Path, bytes], waiting_room: Callable[[Path], Path]) -> None:
    """Write every file; when one cannot be written, the others are as they were before and the error is raised.

    Each waits under a random name in the folder `waiting_room` names for it, on the same disk, and is swapped in by one
    atomic rename, in the order of `contents`. The folders must be there.
    """
    waiting: dict[Path, Path] = {}
    before: dict[Path, bytes | None] = {}
    try:
        for path, content in contents.items():
            waiting[path] = waiting_room(path) / f"{WAITING}{secrets.token_hex(8)}.tmp"
            _write(waiting[path], content)
        for path, new in waiting.items():
            old = path.read_bytes() if path.exists() else None
            os.replace(new, path)
            before[path] = old
    except BaseException:
        for path, old in reversed(before.items()):
            with contextlib.suppress(OSError):
                _put_back(path, old, waiting[path])
        raise
    finally:
        for new in waiting.values():
            with contextlib.suppress(OSError):
                new.unlink()


def make_folder(folder: Path) -> list[Path]:
    """Make a folder with all above it that are missing; returns those made, the innermost last."""
    missing = [one for one in (folder, *folder.parents) if not one.exists()]
    folder.mkdir(parents=True, exist_ok=True)
    return missing[::-1]


def _write(path: Path, content: bytes) -> None:
    with open(path, "xb") as file:
        file.write(content)
        file.flush()
        os.fsync(file.fileno())


def _put_back(path: Path, old: bytes | None, waiting: Path) -> None:
    if old is None:
        path.unlink()
    else:
        _write(waiting, old)
        os.replace(waiting, path)
