"""An add-in as a file: whether it is ours, what it was built from, whether it is signed, and what its macros say."""

from __future__ import annotations

import io
import os
import tempfile
import zipfile
from dataclasses import dataclass
from importlib.metadata import version
from pathlib import Path

from sheetfuncs import __version__
from sheetfuncs.errors import InstallError
from sheetfuncs.hosts.excel.addin import addin_versions, build_addin

LARGEST = 50 << 20
"""Most bytes of an add-in that are read, packed or not. Ours has 50 kB."""
_SIGNATURE = "xl/vbaprojectsignature"  # [MS-OFFCRYPTO] 2.3.2; newer kinds of signature have longer names


@dataclass(frozen=True)
class Addin:
    """The content of an add-in. given: a copy that came from a file, not one built here."""

    content: bytes
    versions: dict[str, str]
    signed: bool
    given: bool


def built_addin() -> Addin:
    """The add-in for the versions installed here."""
    file = io.BytesIO()
    build_addin(file)
    return Addin(file.getvalue(), versions_here(), signed=False, given=False)


def given_addin(path: Path) -> Addin:
    """A copy from a file, such as one that carries the signature of a firm.

    Raises InstallError where it is not our add-in, or was built for other versions than those installed here.
    """
    if not path.is_file():
        raise InstallError(f"{path} is not there: give the file of the add-in, for instance sheetfuncs.xlam.")
    versions = addin_versions(path)
    if not versions_here().keys() <= versions.keys() or not _is_sound(path):
        raise InstallError(f"{path} is not the add-in of sheetfuncs: give the signed copy of sheetfuncs.xlam.")
    for name, here in versions_here().items():
        if versions[name] != here:
            raise InstallError(
                f"{path} was built for {name} {versions[name]}, and {here} is installed here: install that version, or "
                f"have the add-in of this one signed, which `sheetfuncs excel install` puts into Excel's start folder."
            )
    return Addin(path.read_bytes(), versions, is_signed(path), given=True)


def versions_here() -> dict[str, str]:
    """The versions that the add-in has to fit: its functions and its library."""
    return {"sheetfuncs": __version__, "xlwings": version("xlwings")}


def is_ours(path: Path) -> bool:
    """Whether a file is an add-in of ours, of whichever version."""
    return path.is_file() and bool(addin_versions(path))


def is_signed(path: Path) -> bool:
    """Whether the macros of a package carry a signature; whose it is, and whether it is good, Excel says."""
    return any(name.lower().startswith(_SIGNATURE) for name in _sizes(path))


def says_the_same(content: bytes, other: bytes) -> bool:
    """Whether two add-ins hold the same macros. Case and spaces do not count: Excel's editor sets them its own way."""
    return _macros(content) == _macros(other)


def _is_sound(path: Path) -> bool:
    """Whether a package is of a bearable size and holds macros that can be read."""
    if sum(_sizes(path).values()) > LARGEST or path.stat().st_size > LARGEST:
        return False
    try:
        return bool(_macros(path.read_bytes()))
    except Exception:  # whatever pyopenvba meets in bytes that are no project
        return False


def _sizes(path: Path) -> dict[str, int]:
    """Part -> bytes before packing; nothing for a file that is no package."""
    try:
        with zipfile.ZipFile(path) as package:
            return {entry.filename: entry.file_size for entry in package.infolist()}
    except (OSError, zipfile.BadZipFile):
        return {}


def _macros(content: bytes) -> dict[str, str]:
    """Name -> source of each module, without spaces, capitals and the header."""
    from pyopenvba import ExcelFile

    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder, "addin.xlam")
        path.write_bytes(content)
        with ExcelFile(os.fspath(path)) as book:
            return {module.name.lower(): _bare(module.source) for module in book.vba_project().modules}


def _bare(source: str) -> str:
    lines = [line for line in source.splitlines() if not line.startswith("Attribute VB_")]
    return "".join("".join(lines).lower().split())
