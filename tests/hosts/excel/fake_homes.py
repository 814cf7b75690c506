"""Homes of users on Windows and on macOS, as folders of a test: what Excel makes at its first start, and a Python."""

from __future__ import annotations

from dataclasses import replace
from importlib.metadata import version
from pathlib import Path

from sheetfuncs import __version__
from sheetfuncs.hosts.excel.folders import Environment, Place, find_place

VERSIONS = {"sheetfuncs": __version__, "numpy": "2.0.1", "pywin32": "308", "appscript": "1.3.0", "psutil": "6.0"}
DLLS = [f"xlwings{bits}-{version('xlwings')}.dll" for bits in (64, 32)]


def windows(folder: Path, **changes: object) -> Environment:
    """A user of Windows who has started Excel, with an environment made by venv that holds xlwings' libraries."""
    home = folder / "Users" / "Ida"
    (home / "AppData/Roaming/Microsoft/Excel/XLSTART").mkdir(parents=True)
    python = folder / "tools" / "venv" / "Scripts" / "python.exe"
    python.parent.mkdir(parents=True)
    python.touch()
    for name in DLLS:
        (python.parent.parent / name).touch()
    environment = Environment(
        platform="win32", home=home, variables={"APPDATA": str(home / "AppData/Roaming"), "USERPROFILE": str(home)},
        executable=str(python), prefix=str(python.parent.parent), base_prefix="C:\\Python311", code_page="cp1252",
        short_path=lambda path: path, package_version=VERSIONS.get, requirements=lambda: ["numpy>=1.26"],
    )
    return replace(environment, **changes)


def mac(folder: Path, **changes: object) -> Environment:
    """A user of macOS who has started Excel."""
    home = folder / "Users" / "ida"
    (home / "Library/Containers/com.microsoft.Excel/Data").mkdir(parents=True)
    (home / "Library/Group Containers/UBF8T346G9.Office").mkdir(parents=True)
    python = home / "tools" / "venv" / "bin" / "python"
    python.parent.mkdir(parents=True)
    python.touch()
    environment = Environment(
        platform="darwin", home=home, variables={}, executable=str(python), prefix=str(python.parent.parent),
        base_prefix="/opt/python", code_page="utf-8", package_version=VERSIONS.get,
        requirements=lambda: ["numpy>=1.26"],
    )
    return replace(environment, **changes)


def place_on(system: str, folder: Path, **changes: object) -> Place:
    """The place of the add-in on a fresh "Windows" or "macOS" in this folder."""
    return find_place({"Windows": windows, "macOS": mac}[system](folder, **changes))


def tree(folder: Path) -> dict[str, bytes | None]:
    """Every file with its bytes, and every folder (None), by its path below this folder."""
    return {
        path.relative_to(folder).as_posix(): path.read_bytes() if path.is_file() else None
        for path in sorted(folder.rglob("*"))
    }
