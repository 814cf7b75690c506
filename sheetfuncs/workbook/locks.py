"""Whether someone has a workbook open, told from the owner file that spreadsheet programs leave beside it."""

from __future__ import annotations

import os


def opened_by(path: str | os.PathLike[str]) -> str | None:
    """One sentence that says who has the file open, or None. Whether to warn or to refuse is the caller's decision.

    Excel writes "~$name" beside an open workbook, LibreOffice ".~lock.name#". A program that crashed leaves them
    behind, so the sentence says what to do then.
    """
    folder, name = os.path.split(os.path.realpath(path))
    for owner_file, owner_in in ((f"~${name}", _excel_owner), (f".~lock.{name}#", _libreoffice_owner)):
        try:
            with open(os.path.join(folder, owner_file), "rb") as file:
                owner = owner_in(file.read(1024))
        except FileNotFoundError:
            continue
        except OSError:
            owner = ""  # the owner file is there, but the program that holds the workbook holds it too
        who = f" by {owner}" if owner else ""
        return (
            f"{name} is open in a spreadsheet program{who}. Close it there; if nobody has it open, delete the "
            f"left-over file {owner_file} beside it."
        )
    return None


def _excel_owner(data: bytes) -> str:
    """The user's name: its length in the first byte, then the name in the system's code page (from memory)."""
    return _printable(data[1 : 1 + data[0]].decode("cp1252", "ignore")) if data else ""


def _libreoffice_owner(data: bytes) -> str:
    """The first of the comma-separated fields that is filled: the name in the program's options, or of the account."""
    fields = data.decode("utf-8", "ignore").split(",")
    return next((name for field in fields[:2] if (name := _printable(field))), "")


def _printable(text: str) -> str:
    return "".join(character for character in text if character.isprintable()).strip()[:60]
