"""Where the parts of the add-in go on Windows and on macOS, worked out from an explicit environment.

On both systems Excel opens all that stands in the user's start folder; the add-in's VBA reads one file of settings of
the user's. XLSTART, and on macOS the folders of the start, are from memory; xlwings' own source names the other two of
macOS: the container (`GetConfigFilePath` in xlwings_custom_addin.bas) and the scripts (`runpython_install` in cli.py).
"""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path, PureWindowsPath

from sheetfuncs.errors import InstallError

PROJECT = "sheetfuncs"
ADDIN_NAME = f"{PROJECT}.xlam"
SCRIPT_NAME = f"{PROJECT}.applescript"
"""What the add-in's VBA asks macOS to run. A name of our own: scripts of other xlwings add-ins stay untouched."""

_MAC_EXCEL = "com.microsoft.Excel"


def _short_path(path: str) -> str:
    """The 8.3 form of a path, which holds plain letters only; the path itself where there is none. Windows only."""
    import ctypes

    kernel = getattr(ctypes, "windll").kernel32  # noqa: B009  only there on Windows, which the type checker knows
    buffer = ctypes.create_unicode_buffer(1024)
    length = kernel.GetShortPathNameW(path, buffer, len(buffer))
    return buffer.value if 0 < length < len(buffer) else path


def _package_version(name: str) -> str | None:
    from importlib.metadata import PackageNotFoundError, version

    try:
        return version(name)
    except PackageNotFoundError:
        return None


def _requirements() -> list[str]:
    """What sheetfuncs itself requires ("numpy>=1.26"), as it was installed; nothing where it was not."""
    from importlib.metadata import PackageNotFoundError, requires

    try:
        return [line for line in requires(PROJECT) or [] if "extra ==" not in line]
    except PackageNotFoundError:
        return []


@dataclass(frozen=True)
class Environment:
    """What decides where things go. A test gives its own; `this_environment` is the real one.

    platform: as sys.platform; code_page: the encoding in which VBA reads text files; short_path: 8.3 form of a path;
    package_version: version of an installed package, or None; requirements: what sheetfuncs needs, with lower bounds.
    """

    platform: str
    home: Path
    variables: Mapping[str, str]
    executable: str
    prefix: str
    base_prefix: str
    code_page: str
    short_path: Callable[[str], str] = field(default=_short_path, repr=False)
    package_version: Callable[[str], str | None] = field(default=_package_version, repr=False)
    requirements: Callable[[], list[str]] = field(default=_requirements, repr=False)


def this_environment() -> Environment:
    """The environment of this process."""
    windows = sys.platform == "win32"
    return Environment(
        platform=sys.platform, home=Path.home(), variables=os.environ, executable=sys.executable, prefix=sys.prefix,
        base_prefix=sys.base_prefix, code_page="mbcs" if windows else "utf-8",
    )


@dataclass(frozen=True)
class Place:
    """Where the parts of the add-in stand for one user; no file need be there yet.

    addin: in Excel's start folder; configuration: read by the add-in's VBA; script: what macOS lets Excel run, None on
    Windows; record: the list of what an installation wrote; log: where the script leaves errors; also_loaded: the
    folder from which a user may have loaded an add-in by hand.
    """

    environment: Environment
    system: str
    addin: Path
    configuration: Path
    script: Path | None
    record: Path
    log: Path
    also_loaded: Path

    @property
    def windows(self) -> bool:
        """Whether this is Windows; otherwise it is macOS."""
        return self.system == "Windows"

    @property
    def interpreter(self) -> str:
        """The Python that Excel is to start: the one that runs now, in its environment."""
        return self.environment.executable

    def staging(self, target: Path) -> Path:
        """The folder in which a new file waits to be swapped in: never Excel's start folder, where all is opened."""
        return target.parent.parent if target == self.addin else target.parent


def find_place(environment: Environment | None = None) -> Place:
    """Where the add-in goes for this user.

    Raises InstallError, with one sentence, on other systems than Windows and macOS, where Excel's own folders are not
    there, and for a Python from the Microsoft Store.
    """
    environment = environment or this_environment()
    if environment.platform == "win32":
        place = _windows(environment)
    elif environment.platform == "darwin":
        place = _mac(environment)
    else:
        raise InstallError(
            "Excel runs on Windows and macOS only, so there is nothing to install here: `sheetfuncs check BOOK` works "
            "on the file itself."
        )
    if not environment.executable:
        raise InstallError(
            "This Python does not say where its program stands, so Excel could not start it: run sheetfuncs from an "
            "environment made with `python -m venv`."
        )
    return place


def _windows(environment: Environment) -> Place:
    missing = [name for name in ("APPDATA", "USERPROFILE") if not environment.variables.get(name)]
    if missing:
        raise InstallError(
            f"The environment variable {missing[0]} is not set, so Excel's folder cannot be found: run the command in "
            "a window of the user who works with Excel."
        )
    if "windowsapps" in PureWindowsPath(environment.base_prefix.lower()).parts:
        raise InstallError(
            "This Python comes from the Microsoft Store, and Windows keeps apart what such a program writes, so Excel "
            "would not find the add-in: install Python from python.org and run the command from there."
        )
    microsoft = Path(environment.variables["APPDATA"], "Microsoft")
    excel = microsoft / "Excel"
    _require(excel)
    own = Path(environment.variables["USERPROFILE"], f".{PROJECT}")
    return Place(
        environment, "Windows", addin=excel / "XLSTART" / ADDIN_NAME, configuration=own / f"{PROJECT}.conf",
        script=None, record=own / "installed.json", log=own / f"{PROJECT}.log", also_loaded=microsoft / "AddIns",
    )


def _mac(environment: Environment) -> Place:
    library = environment.home / "Library"
    container = library / "Containers" / _MAC_EXCEL / "Data"
    office = library / "Group Containers" / "UBF8T346G9.Office"
    _require(container)
    _require(office)
    user_content = _localized(office, "User Content")
    start = _localized(user_content, "Startup") / "Excel"
    return Place(
        environment, "macOS", addin=start / ADDIN_NAME, configuration=container / f"{PROJECT}.conf",
        script=library / "Application Scripts" / _MAC_EXCEL / SCRIPT_NAME,
        record=container / f"{PROJECT}-installed.json", log=container / f"{PROJECT}.log",
        also_loaded=_localized(user_content, "Add-Ins"),
    )


def _localized(parent: Path, name: str) -> Path:
    """The folder that the Finder shows under this name; on the disk it has an ending, in some versions it has not."""
    plain, ending = parent / name, parent / f"{name}.localized"
    return plain if plain.is_dir() and not ending.is_dir() else ending


def refused_by_macos(path: object) -> InstallError:
    """macOS keeps the folders of one program from others until the user allows it."""
    return InstallError(
        f"macOS did not let this program into {path}: allow your terminal under System Settings, Privacy & Security, "
        "Full Disk Access, and run the command again; nothing was changed."
    )


def _require(folder: Path) -> None:
    try:
        there = folder.is_dir()
    except PermissionError as denied:
        raise refused_by_macos(folder) from denied
    if not there:
        raise InstallError(
            f"Excel's folder {folder} is not there: if Excel is installed, start it once, close it, and run this "
            "command again."
        )
