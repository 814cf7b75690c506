"""Our sheets in an open workbook: finding them by their hidden names, and bringing a new one in."""

from __future__ import annotations

import tempfile
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any
from uuid import uuid4

from sheetfuncs.cells.address import Area, parse_area, shown
from sheetfuncs.errors import WorkbookError
from sheetfuncs.hosts.excel.native import ask, on_mac, tell
from sheetfuncs.hosts.excel.pointers import Pointers, pointers_to
from sheetfuncs.hosts.excel.ranges import counts_from_1904
from sheetfuncs.hosts.excel.values import as_cell
from sheetfuncs.report.names import SETTINGS
from sheetfuncs.workbook.settings import settings_from_names

if TYPE_CHECKING:
    import xlwings as xw


@dataclass(frozen=True)
class OurSheet:
    """One of our sheets in an open workbook, and the settings that it was made with."""

    sheet: xw.Sheet
    settings: Mapping[str, Any]


def our_sheets(book: xw.Book) -> list[OurSheet]:
    """Our sheets, in the order of the tabs."""
    found = ((sheet, settings_of(sheet)) for sheet in book.sheets)
    return [OurSheet(sheet, settings) for sheet, settings in found if settings is not None]


def settings_of(sheet: xw.Sheet) -> dict[str, Any] | None:
    """The settings in the sheet's hidden names; None where it is not one of ours, or they were damaged."""
    return settings_from_names(local_names(sheet, SETTINGS).items())


def local_names(sheet: xw.Sheet, prefix: str) -> dict[str, str]:
    """Names of the sheet's own that begin with prefix, without the sheet before them, and the formulas behind them."""
    found = {}
    for name in sheet.names:
        scope, _, own = name.name.rpartition("!")
        if own.casefold().startswith(prefix.casefold()) and _unquoted(scope) in ("", sheet.name.casefold()):
            found[own] = name.refers_to or ""
    return found


def _unquoted(scope: str) -> str:
    inside = scope[1:-1] if len(scope) > 1 and scope[0] == scope[-1] == "'" else scope
    return inside.replace("''", "'").casefold()


def filled_cells(sheet: xw.Sheet, prefix: str, fields: Sequence[str]) -> dict[str, Any]:
    """What stands in the cells that the sheet's hidden names point at, by field; dates as serial numbers.

    Fields whose name is gone are not there.
    """
    names, date1904 = local_names(sheet, prefix), counts_from_1904(sheet.book)
    found: dict[str, Any] = {}
    for place, field in enumerate(fields, 1):
        area = _area(names.get(f"{prefix}{place}"))
        if area is not None:
            value = sheet.range((area.first_row, area.first_column)).value
            found[field] = as_cell(value, date1904=date1904)
    return found


def _area(formula: str | None) -> Area | None:
    if formula is None or "#REF!" in formula:
        return None
    return parse_area(formula)


def titles(book: xw.Book) -> list[str]:
    """The titles of all sheets, sheets that are charts among them."""
    known = [sheet.name for sheet in book.sheets]
    with suppress(Exception):
        every = book.api.sheets.name.get() if on_mac() else [sheet.Name for sheet in book.api.Sheets]
        return [*dict.fromkeys([*known, *every])]
    return known


def require_open_structure(book: xw.Book) -> None:
    """Raises WorkbookError where the workbook's structure is protected, so that no sheet can be added."""
    if ask(book, "ProtectStructure", "protect_structure"):
        raise WorkbookError(
            f"The structure of {book.name} is protected, so no sheet can be added to it: lift the protection (Review, "
            "Protect Workbook), or check a copy, and press the button again."
        )


@contextmanager
def package_file() -> Iterator[Path]:
    """A path for a workbook that Excel opens for a moment; the file is gone afterwards.

    On macOS inside Excel's own container, since Excel asks the user for permission anywhere else.
    """
    folder = Path.home() / "Library/Containers/com.microsoft.Excel/Data" if on_mac() else Path(tempfile.gettempdir())
    path = folder / f"sheetfuncs-{uuid4().hex}.xlsx"
    try:
        yield path
    finally:
        with suppress(OSError):
            path.unlink(missing_ok=True)


@dataclass(frozen=True)
class Arrival:
    """The sheet that came in. lost: cells and names that pointed at the replaced sheet and could not be kept."""

    sheet: xw.Sheet
    lost: tuple[str, ...]


def bring_in(
    package: Path, *, title: str, names: Mapping[str, str], after: xw.Sheet, replace: xw.Sheet | None = None
) -> Arrival:
    """Copy the only sheet of a package into the workbook of `after`, right after that sheet or in place of another.

    title: of the sheet in the end. names: its hidden names, made anew where the copy lacks them. A replaced sheet is
    deleted only when the new one is in; formulas elsewhere that point at it then point at the new one. Raises
    WorkbookError where Excel does not take the sheet; the workbook then is as it was.
    """
    copied, pointers = _copied(package, replace or after), Pointers()
    if replace is not None:
        pointers = _taken_out(replace, copied)
    if copied.name != title:
        copied.name = title
    keep_names(copied, names)
    return Arrival(copied, pointers.put_back())


def _taken_out(earlier: xw.Sheet, copied: xw.Sheet) -> Pointers:
    """Delete the earlier sheet; returns what pointed at it. Where that fails, the copy goes and the earlier stays."""
    book = earlier.book
    try:
        pointers = pointers_to(earlier, besides=copied)
        earlier.delete()
        return pointers
    except Exception as failure:
        with suppress(Exception):
            copied.delete()
        raise _not_taken(book, failure) from failure


def _copied(package: Path, place: xw.Sheet) -> xw.Sheet:
    book = place.book
    try:
        guest = book.app.books.open(str(package), update_links=False, read_only=True, add_to_mru=False)
        try:
            return guest.sheets[0].copy(after=place)
        finally:
            with suppress(Exception):  # a guest that stays is better than a sheet that is in and reported as not
                guest.close()
    except Exception as failure:
        raise _not_taken(book, failure) from failure


def _not_taken(book: xw.Book, failure: Exception) -> WorkbookError:
    said = " ".join(str(failure).split())[:120]
    return WorkbookError(
        f"Excel did not take the sheet into {book.name} ({type(failure).__name__}: {said}): see whether the workbook "
        "is shared or protected, or check a copy of it."
    )


def keep_names(sheet: xw.Sheet, names: Mapping[str, str]) -> None:
    """Give the sheet those of its hidden names that it lacks, and hide them."""
    there = {own.casefold() for own in local_names(sheet, "_sheetfuncs_")}
    for own, formula in names.items():
        if own.casefold() not in there:
            tell(sheet.names.add(own, formula), "Visible", "visible", False)


def sheet_called(book: xw.Book, title: str) -> xw.Sheet:
    """The worksheet of this title, in any case. Raises WorkbookError with what to do where it is gone."""
    for sheet in book.sheets:
        if sheet.name.casefold() == title.casefold():
            return sheet
    raise WorkbookError(
        f"{book.name} has no sheet {shown(title)} any more, which this check is about (it was renamed or deleted): "
        "select the data and press the button there."
    )
