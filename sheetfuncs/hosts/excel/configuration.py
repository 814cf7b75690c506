"""The user's configuration, from which the add-in's VBA takes which Python to start: lines of "KEY","value".

VBA reads it with `Input #`, on Windows in the code page of the system, so a path that this code page cannot hold is
written in its 8.3 form.
"""

from __future__ import annotations

import csv

from sheetfuncs.errors import InstallError
from sheetfuncs.hosts.excel.folders import Place

WORKBOOK_FOLDER = "ADD_WORKBOOK_TO_PYTHONPATH"
"""xlwings' default puts the folder of the workbook before all others from which Python takes modules."""


def interpreter_key(place: Place) -> str:
    """The key under which the add-in looks for Python on this system."""
    return "INTERPRETER_WIN" if place.windows else "INTERPRETER_MAC"


def configuration_bytes(place: Place) -> bytes:
    """The whole file for this place. Raises InstallError for a path of Python that it cannot hold."""
    lines = ((interpreter_key(place), interpreter_text(place)), (WORKBOOK_FOLDER, "False"))
    end = "\r\n" if place.windows else "\n"
    return "".join(f'"{key}","{value}"{end}' for key, value in lines).encode(place.environment.code_page)


def interpreter_text(place: Place) -> str:
    """The path of Python as the configuration can hold it. Raises InstallError where there is no such form."""
    path = place.interpreter
    if not place.windows:
        return _without_marks(path, "\"'|\r\n")
    for form in (path, place.environment.short_path(path)):
        if _fits(form, place.environment.code_page):
            return _without_marks(form, '"\r\n')
    raise InstallError(
        f"The path of Python, {path}, holds letters that Excel's macros cannot read on this computer, and Windows "
        "keeps no short form of it: make the environment in a folder of plain letters, such as C:\\sheetfuncs, and run "
        "the command from there."
    )


def parsed_configuration(content: bytes, code_page: str) -> dict[str, str]:
    """Key -> value, keys in capitals. Bytes that the code page does not know become marks; no error is raised."""
    rows = csv.reader(content.decode(code_page, "replace").splitlines())
    return {row[0].strip().upper(): row[1] for row in rows if len(row) == 2}


def _fits(text: str, code_page: str) -> bool:
    try:
        text.encode(code_page)
    except UnicodeEncodeError:
        return False
    return True


def _without_marks(path: str, marks: str) -> str:
    found = [mark for mark in marks if mark in path]
    if found:
        raise InstallError(
            f"The path of Python, {path!r}, holds the character {found[0]!r}, with which Excel's macros cannot hand it "
            "on: make the environment in a folder without it, and run the command from there."
        )
    return path
