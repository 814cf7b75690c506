"""The mark that a system puts on files that came from elsewhere, which makes Excel block their macros."""

from __future__ import annotations

import ctypes
import os
from pathlib import Path

from sheetfuncs.hosts.excel.folders import Place


def is_marked(place: Place, path: Path) -> bool:
    """Whether a file carries the mark of a download: a stream of its own on Windows, an attribute on macOS."""
    if place.windows:
        try:
            open(f"{path}:Zone.Identifier", "rb").close()
        except OSError:
            return False
        return True
    return _has_attribute(path, "com.apple.quarantine")


def _has_attribute(path: Path, name: str) -> bool:
    """Python has no call for this on macOS: getxattr(2) of its C library, which answers -1 where there is none."""
    ask = ctypes.CDLL(None).getxattr
    ask.restype = ctypes.c_ssize_t
    size = ask(os.fsencode(path), name.encode(), None, ctypes.c_size_t(0), ctypes.c_uint32(0), ctypes.c_int(0))
    return bool(size >= 0)
