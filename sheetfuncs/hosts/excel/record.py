"""The list of what an installation wrote, beside the configuration, so that remove takes exactly that."""

from __future__ import annotations

import hashlib
import json
from dataclasses import asdict, dataclass
from pathlib import Path

from sheetfuncs.errors import InstallError
from sheetfuncs.hosts.excel.folders import Place

SCHEMA = 1
LONGEST = 100_000


@dataclass(frozen=True)
class Record:
    """files: path -> SHA-256 of what was written; folders: those made, outermost first; versions: of sheetfuncs and of
    xlwings; given: the add-in is a copy that was given, not one built here."""

    interpreter: str
    given: bool
    versions: dict[str, str]
    files: dict[str, str]
    folders: list[str]

    def to_bytes(self) -> bytes:
        """As it is stored."""
        return json.dumps({"schema": SCHEMA, **asdict(self)}, indent=1).encode() + b"\n"

    def wrote(self, path: Path) -> bool:
        """Whether this file still is as it was written."""
        return self.files.get(str(path)) == digest(path.read_bytes())


def digest(content: bytes) -> str:
    """SHA-256 in hexadecimal digits."""
    return hashlib.sha256(content).hexdigest()


def read_record(place: Place) -> Record | None:
    """What an earlier installation wrote for this user; None without one.

    Only files that an installation of ours could have written count, whatever the list says. Raises InstallError for a
    list that cannot be understood.
    """
    if not place.record.exists():
        return None
    try:
        with open(place.record, "rb") as file:
            stored = json.loads(file.read(LONGEST))
        if stored.pop("schema") != SCHEMA:
            raise ValueError("another schema")
        record = Record(**stored)
        files = {path: str(sha) for path, sha in record.files.items() if _may_be_ours(place, Path(path))}
        folders = [folder for folder in record.folders if _may_be_made(place, Path(folder))]
        given, versions = bool(record.given), {name: str(text) for name, text in record.versions.items()}
    except (ValueError, TypeError, KeyError, AttributeError):
        raise InstallError(
            f"The list of installed files {place.record} cannot be read: delete it, and run `sheetfuncs excel "
            "install`, which writes it anew."
        ) from None
    return Record(str(record.interpreter), given, versions, files, folders)


def own_files(place: Place) -> list[Path]:
    """The files of an installation, in the order in which they are written, without the record."""
    return [place.addin, *([place.script] if place.script else []), place.configuration]


def _may_be_ours(place: Place, path: Path) -> bool:
    folders = {file.parent for file in own_files(place)}
    return path.parent in folders and path.name.lower().startswith("sheetfuncs")


def _may_be_made(place: Place, folder: Path) -> bool:
    return any(folder in file.parents for file in own_files(place))
