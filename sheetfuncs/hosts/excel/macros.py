"""What the ribbon's buttons do. Each is started by the add-in's VBA, and ends in a message, never in a traceback."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import TYPE_CHECKING

from sheetfuncs.cells.address import quote_sheet
from sheetfuncs.checking import Check
from sheetfuncs.errors import AddressError, SheetfuncsError
from sheetfuncs.hosts.excel.explaining import explain_cell
from sheetfuncs.hosts.excel.functions import failure_sentence
from sheetfuncs.hosts.excel.health import health_text
from sheetfuncs.hosts.excel.message import message_of_check
from sheetfuncs.hosts.excel.quiet import Step, held_still
from sheetfuncs.hosts.excel.ranges import read_block
from sheetfuncs.hosts.excel.selection import Place, place_of_record, place_of_selection, selected_cells
from sheetfuncs.hosts.excel.sheets import (
    OurSheet,
    bring_in,
    filled_cells,
    our_sheets,
    package_file,
    require_open_structure,
    settings_of,
    sheet_called,
    titles,
)
from sheetfuncs.hosts.live import check_block, draw_check, same_range, title_of_check
from sheetfuncs.judgement.words import listed
from sheetfuncs.report.entries import ENTRY_FIELDS, changed_entries, settings_from_entries
from sheetfuncs.report.names import DECISION, ENTRY
from sheetfuncs.report.record import DECISION_FIELDS
from sheetfuncs.workbook.regions import below_titles

if TYPE_CHECKING:
    import xlwings as xw

TITLE = "sheetfuncs"
MACROS = ("check_selection", "check_again", "why_this_value", "show_health")

Job = Callable[["xw.Book", Step], str]


def check_selection() -> None:
    """Check the selected range (on one of our sheets: again, with the settings in its cells) and bring the sheet in."""
    _run(_check_selection)


def check_again() -> None:
    """Check the range of our sheet again, with the settings in its cells; from the data's sheet the one about it."""
    _run(_check_again)


def why_this_value() -> None:
    """Say why the selected cell, which holds one of our functions, shows what it shows."""
    _run(_why_this_value)


def show_health() -> None:
    """Say whether all parts of the installation are in place, with a cure for each that is not."""
    _run(_show_health)


def _run(job: Job) -> None:
    import xlwings as xw

    book = xw.Book.caller()
    mode = "info"
    try:
        with held_still(book.app) as step:
            said = job(book, step)
    except SheetfuncsError as refusal:
        said, mode = str(refusal), "critical"
    except Exception as failure:
        said, mode = failure_sentence(failure), "critical"
    book.app.alert(said, title=TITLE, mode=mode)


def _check_selection(book: xw.Book, step: Step) -> str:
    active = _active_sheet(book)
    ours = None if active is None else _ours(active)
    if ours is not None:
        return _again(book, ours, step)
    return _check(book, place_of_selection(None if active is None else selected_cells(book)), None, step)


def _check_again(book: xw.Book, step: Step) -> str:
    active = _active_sheet(book)
    ours = None if active is None else _ours(active)
    if ours is not None:
        return _again(book, ours, step)
    every = our_sheets(book)
    about = [one for one in every if active is not None and one.settings.get("sheet") == active.name]
    if len(about) == 1:
        return _again(book, about[0], step)
    names = ", ".join(f"“{one.sheet.name}”" for one in about or every)
    raise AddressError(
        f"There are several checks ({names}): go to the one that is to be made again, and press the button there."
        if len(about or every) > 1 else f"There is one check, {names}: go to it, and press the button there." if names
        else f"{book.name} holds no check yet: select the data, and press the button that checks them."
    )


def _again(book: xw.Book, ours: OurSheet, step: Step) -> str:
    """The check behind one of our sheets once more; its cells say which settings are to change."""
    recorded = ours.settings
    if not recorded.get("sheet") or not recorded.get("area"):
        raise AddressError(f"“{ours.sheet.name}” does not say which range it is about: select the data and check them.")
    settings = settings_from_entries(recorded, filled_cells(ours.sheet, ENTRY, ENTRY_FIELDS))
    changed = changed_entries(recorded, settings)
    remark = f"The check of {quote_sheet(recorded['sheet'])}!{recorded['area']} was made again with the settings of "
    remark += f"“{ours.sheet.name}”" + (f", of which {listed(changed)} changed there." if changed else ".")
    place = place_of_record(sheet_called(book, recorded["sheet"]), recorded["area"])
    return _check(book, replace(place, remarks=(remark,), settings=settings), ours, step)


def _check(book: xw.Book, place: Place, again: OurSheet | None, step: Step) -> str:
    """Check what stands at a place. again: our sheet to replace; without one that of the same range, if there is."""
    require_open_structure(book)
    step("reading the cells ...")
    block, remarks = read_block(place.cells), place.remarks
    if block.hidden is None:
        remarks += ("Excel did not say which rows are hidden, so hidden rows are not counted as such.",)
    if place.titled:
        block, skipped = below_titles(block)
        remarks += tuple(skipped)
    step("checking ...")
    check = check_block(block, book=book.name, settings=place.settings, remarks=remarks)
    if place.area is not None:
        check = replace(check, settings=replace(check.settings, area=place.area))
    earlier = again or next((ours for ours in our_sheets(book) if same_range(ours.settings, check)), None)
    title, lost = _put(book, place.cells.sheet, check, earlier, step)
    return message_of_check(book, check, title, lost, None if again else earlier)


def _put(
    book: xw.Book, data: xw.Sheet, check: Check, earlier: OurSheet | None, step: Step
) -> tuple[str, tuple[str, ...]]:
    """Draw the sheet and bring it in; its title, and where something pointed at the earlier one and is lost.

    What was in front is in front again afterwards.
    """
    step("drawing the sheet ...")
    active = _active_sheet(book)
    in_front = None if active is None else active.name
    decision = None if earlier is None else filled_cells(earlier.sheet, DECISION, DECISION_FIELDS)
    title = title_of_check(check, titles(book)) if earlier is None else earlier.sheet.name
    replaced = None if earlier is None else earlier.sheet
    with package_file() as package:
        plan = draw_check(check, package, title=title, decision=decision)
        step("bringing the sheet in ...")
        try:
            arrival = bring_in(package, title=title, names=plan.names, after=data, replace=replaced)
        finally:
            _bring_to_front(book, in_front)
    return title, arrival.lost


def _why_this_value(book: xw.Book, step: Step) -> str:
    selection = None if _active_sheet(book) is None else selected_cells(book)
    if selection is None:
        raise AddressError("No cell is selected: select one with a FIT_ formula, and press the button again.")
    step("calculating ...")
    return explain_cell(selection[0, 0])


def _show_health(book: xw.Book, step: Step) -> str:
    step("looking at the installation ...")
    return health_text()


def _active_sheet(book: xw.Book) -> xw.Sheet | None:
    """The worksheet in front; None where it is a sheet of another kind, such as a chart of its own."""
    try:
        title = book.sheets.active.name
    except Exception:
        return None
    return next((sheet for sheet in book.sheets if sheet.name == title), None)


def _ours(sheet: xw.Sheet) -> OurSheet | None:
    settings = settings_of(sheet)
    return None if settings is None else OurSheet(sheet, settings)


def _bring_to_front(book: xw.Book, title: str | None) -> None:
    # xlwings' own activate also moves Excel before other programs' windows, and fails where it cannot.
    book.impl.activate()
    if title is not None:
        next(sheet for sheet in book.sheets if sheet.name == title).impl.activate()
