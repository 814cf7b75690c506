"""The demo workbooks: invented data, copied out for trying things on."""

from __future__ import annotations

from pathlib import Path

from sheetfuncs.errors import WorkbookError
from sheetfuncs.workbook.saving import written_beside

_INSTALLED = Path(__file__).parent.parent / "_templates"
_CHECKOUT = Path(__file__).parent.parent.parent / "templates"


def templates_folder() -> Path:
    """Where the ready workbooks stand: in the installed package, or in a checkout."""
    for folder in (_INSTALLED, _CHECKOUT):
        if any(folder.glob("*.xlsx")):
            return folder
    raise WorkbookError("The demo workbooks are missing from this installation: install sheetfuncs again.")


def _books(folder: Path) -> list[Path]:
    """Those to check first, then the one with every function in a cell."""
    return [*sorted(folder.glob("*.xlsx")), *sorted(folder.glob("*.xlsm"))]


def write_demo(folder: Path) -> list[Path]:
    """Copy the demo workbooks into folder (made if need be); an existing file of that name is left as it is."""
    folder.mkdir(parents=True, exist_ok=True)
    written = []
    for template in _books(templates_folder()):
        target = folder / template.name
        if not target.exists():
            with written_beside(target) as file:
                file.write(template.read_bytes())
        written.append(target)
    return written
