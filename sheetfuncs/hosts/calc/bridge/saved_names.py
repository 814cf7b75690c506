"""After Calc saved an .xlsx file: plain names of our functions in it, as every other program reads them.

Calc writes names there that only Calc knows. The worker writes the plain ones with the project's own workbook code,
beside the file and swapped in; whatever goes wrong, what Calc saved stays.
"""

from __future__ import annotations

import re
import threading
import time
import zipfile
from pathlib import Path

from sheetfuncs_bridge import client, messages
from sheetfuncs_bridge.documents import frame_of, local_path
from sheetfuncs_bridge.loaded_formulas import names_ours

EXTENSIONS = (".xlsx", ".xlsm", ".xltx", ".xltm")
SECONDS = 60.0
CALC_NAMES = b"ORG.SHEETFUNCS.CALC.FUNCTIONS."
UNKNOWN_NAMES = (b"fit_", b"]!FIT_")  # as 7.4 and 25.2 spell those that they did not understand
SHOWN_NAMES = re.compile(rb"""hidden="false"[^<>]{0,80}name="_sheetfuncs_""")  # 7.4 cannot hide a name
LONGEST = 150
PAUSES = (1.0, 3.0, 10.0)

_waiting: set = set()  # files that another handle held when they were to be rewritten


def write_plain_names(model) -> None:
    """Give the file that was saved plain names, where it holds others; says so where that cannot be done."""
    path = local_path(model)
    if path is None or path.suffix.lower() not in EXTENSIONS:
        return
    if not zipfile.is_zipfile(path):  # what a password makes of it
        trouble = "names cannot be changed under a password." if names_ours(model) else None
    else:
        trouble = _ask(path) if _holds_other_names(path) else None
    if trouble:
        messages.show_status(
            frame_of(model), f"Saved, but other programs will not find the FIT_ functions in this file yet: {trouble}"
        )


def try_again() -> None:
    """A document was closed: files that were held then may be free now."""
    if _waiting:
        threading.Thread(target=_try_again, daemon=True).start()


def _try_again() -> None:
    for pause in PAUSES:
        time.sleep(pause)
        for path in list(_waiting):
            _ask(path)
        if not _waiting:
            return


def _ask(path: Path):
    """Let the worker rewrite the file; a sentence where it did not, else None."""
    try:
        answer = client.CELLS.request("rename", {"path": str(path)}, seconds=SECONDS)
    except client.WorkerTrouble as trouble:
        return str(trouble)
    if answer.status != "ok":
        _waiting.discard(path)
        return answer.head.get("sentence", "")
    if not answer.head["busy"]:
        _waiting.discard(path)
        return None
    _waiting.add(path)
    return "this program still holds it; it is tried again when the document is closed."


def _holds_other_names(path: Path) -> bool:
    """Whether names that only Calc knows stand in the file; a look at its bytes, which needs no worker."""
    try:
        with zipfile.ZipFile(path) as package:
            return any(_holds(package, part) for part in package.namelist() if _may_hold_formulas(part))
    except (OSError, ValueError, NotImplementedError, RuntimeError, zipfile.BadZipFile):
        return False


def _may_hold_formulas(part: str) -> bool:
    return part == "xl/workbook.xml" or part.startswith(("xl/worksheets/sheet", "xl/tables/"))


def _holds(package: zipfile.ZipFile, part: str) -> bool:
    overlap = b""
    with package.open(part) as stream:
        while True:
            chunk = stream.read(1 << 20)
            if not chunk:
                return False
            data = overlap + chunk
            if any(name in data for name in (CALC_NAMES, *UNKNOWN_NAMES)) or SHOWN_NAMES.search(data):
                return True
            overlap = data[-LONGEST:]
