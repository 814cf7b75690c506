"""What the command line says after the add-in was put in or taken out."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

from sheetfuncs.hosts.excel.folders import Place
from sheetfuncs.hosts.excel.health import health
from sheetfuncs.hosts.excel.install import install, remove
from sheetfuncs.hosts.findings import finding_lines


def install_lines(place: Place, xlam: Path | None) -> Iterator[str]:
    """Install, and say what was written, what is new, what is still to do, and how to go on."""
    done = install(place, xlam=xlam)
    versions = done.earlier or {}
    yield f"The add-in is installed{_instead_of(versions)}. Written:"
    yield from (f"  {path}" for path in done.written)
    yield from done.notes
    yield from finding_lines([finding for finding in health(place) if not finding.ok])
    if place.windows:
        yield "Close Excel if it is open, and start it: the functions FIT_... and the tab sheetfuncs are there."
    else:
        yield (
            "Quit Excel if it is open, and start it: the tab sheetfuncs is there. Functions in cells need Excel on "
            "Windows."
        )


def remove_lines(place: Place) -> Iterator[str]:
    """Remove, and say what is gone and what stayed."""
    done = remove(place)
    yield "The add-in is removed. Taken away:"
    yield from (f"  {path}" for path in done.files)
    yield from done.notes
    yield "Workbooks are as they were: their cells keep the values that were stored last."


def _instead_of(versions: dict[str, str]) -> str:
    return f", in place of that of version {versions['sheetfuncs']}" if "sheetfuncs" in versions else ""
