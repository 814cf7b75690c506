"""A real LibreOffice for tests: a private profile with the extension in it, started without a window, driven by UNO."""

from __future__ import annotations

import functools
import os
import subprocess
import sys
import time
from collections.abc import Callable
from contextlib import suppress
from pathlib import Path
from typing import Any

import pytest

from sheetfuncs.errors import SheetfuncsError
from sheetfuncs.hosts.calc import install
from sheetfuncs.hosts.calc.office import Office, clean_environment, find_office, find_uno_python

UNO_FOLDERS = ("/usr/lib/python3/dist-packages", "/usr/lib/libreoffice/program", "/usr/lib64/libreoffice/program")


@functools.cache
def load_uno() -> Any:
    """The uno module; skips the test where this Python cannot load it."""
    try:
        python = find_uno_python(find_office())
    except SheetfuncsError:
        pytest.skip("LibreOffice is not installed")
    if python is None:
        pytest.skip("no Python here can import uno (Debian: python3-uno)")
    asked = "import sys, uno; print(*sys.version_info[:2], uno.__file__)"
    run = subprocess.run([python, "-c", asked], env=clean_environment(), capture_output=True, text=True, check=True)
    major, minor, file = run.stdout.split(maxsplit=2)
    if (int(major), int(minor)) != sys.version_info[:2]:
        pytest.skip(f"uno is made for Python {major}.{minor}, these tests run in {sys.version.split()[0]}")
    before = dict(os.environ)
    sys.path.append(str(Path(file.strip()).parent))
    import uno

    uno.getComponentContext()
    for name in os.environ.keys() - before.keys():
        del os.environ[name]  # uno sets what would mislead every program started from here
    return uno


class Calc:
    """A running LibreOffice with the extension. context, desktop: UNO; folder: where the extension was unpacked."""

    def __init__(self, profile: Path, environment: dict[str, str] | None = None):
        self.uno = load_uno()
        self.profile = profile
        self._environment = environment
        self.start()

    def start(self) -> None:
        self.office = Office(self.profile, environment=self._environment)
        local = self.uno.getComponentContext()
        resolver = local.ServiceManager.createInstanceWithContext("com.sun.star.bridge.UnoUrlResolver", local)
        self.context = wait_for(lambda: self._resolved(resolver), "LibreOffice accepts a connection", 60)
        self.desktop = self.service("com.sun.star.frame.Desktop")

    def _resolved(self, resolver: Any) -> Any:
        from com.sun.star.uno import Exception as UnoException

        try:
            context = resolver.resolve(self.office.address)
            context.ServiceManager.createInstanceWithContext("com.sun.star.frame.Desktop", context)
            return context
        except UnoException:  # not there yet; or there, and about to start again, as in a new profile
            return None

    def stop(self) -> None:
        from com.sun.star.uno import Exception as UnoException

        with suppress(UnoException):  # the connection may end before the answer
            self.desktop.terminate()
        self.office.stop()

    def restart(self) -> None:
        self.stop()
        self.start()

    @property
    def folder(self) -> Path:
        packages = self.context.getValueByName("/singletons/com.sun.star.deployment.PackageInformationProvider")
        return Path(self.uno.fileUrlToSystemPath(packages.getPackageLocation("org.sheetfuncs.calc")))

    def service(self, name: str) -> Any:
        return self.context.ServiceManager.createInstanceWithContext(name, self.context)

    def properties(self, **values: Any) -> tuple[Any, ...]:
        """PropertyValues by name."""
        made = []
        for name, value in values.items():
            one = self.uno.createUnoStruct("com.sun.star.beans.PropertyValue")
            one.Name, one.Value = name, value
            made.append(one)
        return tuple(made)

    def new_document(self, **options: Any) -> Any:
        """A new spreadsheet, hidden unless Hidden=False; close it with `close(True)`, or use the fixture `document`."""
        return self.load("private:factory/scalc", **options)

    def open(self, path: Path, **options: Any) -> Any:
        """A file as a document. Give each test a copy of its own: a lock file left behind makes loading fail."""
        return self.load(path.resolve().as_uri(), **options)

    def load(self, url: str, **options: Any) -> Any:
        document = self.desktop.loadComponentFromURL(url, "_blank", 0, self.properties(**{"Hidden": True, **options}))
        assert document is not None, f"{url} could not be loaded"
        return document

    def workers(self) -> list[int]:
        """Process ids of this program's workers (Linux)."""
        return [pid for pid, command in children(self.office.process.pid) if "hosts.calc.worker" in command]


def children(parent: int) -> list[tuple[int, str]]:
    """(pid, command line) of the processes that this one started and that still run."""
    found = []
    for folder in Path("/proc").glob("[0-9]*"):
        try:
            fields = (folder / "stat").read_text().rpartition(")")[2].split()
            if int(fields[1]) == parent and fields[0] != "Z":
                found.append((int(folder.name), (folder / "cmdline").read_bytes().replace(b"\0", b" ").decode()))
        except (OSError, IndexError):
            continue  # it ended meanwhile
    return found


def wait_for(condition: Callable[[], Any], what: str, seconds: float = 20) -> Any:
    """The first true value of the condition; fails the test when it does not come."""
    until = time.monotonic() + seconds
    while not (value := condition()):
        assert time.monotonic() < until, f"it did not happen within {seconds:g} s: {what}"
        time.sleep(0.05)
    return value


def fill(sheet: Any, address: str, rows: list[list[Any]]) -> None:
    """Write rows of None, float, str into cells; a text that starts with = becomes a formula."""
    cells = sheet.getCellRangeByName(address)
    cells.setFormulaArray(tuple(tuple(_entered(value) for value in row) for row in rows))


def _entered(value: Any) -> str:
    return "" if value is None else value if isinstance(value, str) else repr(float(value))


def type_formula(sheet: Any, address: str, formula: str) -> Any:
    """Type a formula into a cell, or as an array formula into several, and return the range."""
    cells = sheet.getCellRangeByName(address)
    if ":" in address:
        cells.setArrayFormula(formula)
    else:
        cells.setFormula(formula)
    return cells


def installed_profile(folder: Path, *, seconds: float = install.SECONDS) -> Path:
    """A new profile in this folder with the extension installed."""
    profile = folder / "profile"
    install.install(profile, seconds=seconds)
    return profile
