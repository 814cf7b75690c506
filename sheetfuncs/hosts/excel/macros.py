"""What the ribbon's buttons do. Each is started by the add-in's VBA, and ends in a message, never in a traceback."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from sheetfuncs.cells.address import format_area, parse_area, quote_sheet
from sheetfuncs.errors import AddressError, SheetfuncsError
from sheetfuncs.hosts.excel.quiet import Step, held_still

if TYPE_CHECKING:
    import xlwings as xw

    from sheetfuncs.checking import Check
    from sheetfuncs.hosts.excel.sheets import OurSheet

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
        from sheetfuncs.hosts.excel.functions import failure_sentence

        said, mode = failure_sentence(failure), "critical"
    book.app.alert(said, title=TITLE, mode=mode)


def _check_selection(book: xw.Book, step: Step) -> str:
    from sheetfuncs.hosts.excel.ranges import place_of_selection

    active = _active_sheet(book)
    if active is not None:
        ours = _ours(active)
        if ours is not None:
            return _again(book, ours, step)
    place = place_of_selection(None if active is None else book.selection)
    return _check(book, place.cells, place.remarks, step)


def _check_again(book: xw.Book, step: Step) -> str:
    from sheetfuncs.hosts.excel.sheets import our_sheets

    active = _active_sheet(book)
    ours = None if active is None else _ours(active)
    if ours is not None:
        return _again(book, ours, step)
    every = our_sheets(book)
    about = [one for one in every if active is not None and one.settings.get("sheet") == active.name]
    if len(about) == 1:
        return _again(book, about[0], step)
    titles = ", ".join(f"“{one.sheet.name}”" for one in about or every)
    raise AddressError(
        f"There are several checks ({titles}): go to the one that is to be made again, and press the button there."
        if titles else f"{book.name} holds no check yet: select the data, and press the button that checks them."
    )


def _again(book: xw.Book, ours: OurSheet, step: Step) -> str:
    """The check behind one of our sheets once more; its cells say which settings are to change."""
    from sheetfuncs.hosts.excel.ranges import within_used
    from sheetfuncs.hosts.excel.sheets import filled_cells, sheet_called
    from sheetfuncs.judgement.words import listed
    from sheetfuncs.report.entries import ENTRY_FIELDS, changed_entries, settings_from_entries
    from sheetfuncs.report.names import ENTRY

    recorded = ours.settings
    if not recorded.get("sheet") or not recorded.get("area"):
        raise AddressError(f"“{ours.sheet.name}” does not say which range it is about: select the data and check them.")
    settings = settings_from_entries(recorded, filled_cells(ours.sheet, ENTRY, ENTRY_FIELDS))
    changed = changed_entries(recorded, settings)
    area = parse_area(recorded["area"])
    data = sheet_called(book, recorded["sheet"]).range(format_area(replace(area, sheet=None)))
    place = f"{quote_sheet(recorded['sheet'])}!{recorded['area']}"
    remark = f"The check of {place} was made again with the settings of “{ours.sheet.name}”"
    remark += f", of which {listed(changed)} changed there." if changed else "."
    return _check(book, within_used(data), (remark,), step, settings=settings, earlier=ours)


def _check(
    book: xw.Book, cells: xw.Range, remarks: Iterable[str], step: Step, *, settings: dict[str, Any] | None = None,
    earlier: OurSheet | None = None,
) -> str:
    from sheetfuncs.hosts.excel.ranges import read_block
    from sheetfuncs.hosts.excel.sheets import our_sheets, require_open_structure
    from sheetfuncs.hosts.live import check_block, same_range

    require_open_structure(book)
    step("reading the cells ...")
    block = read_block(cells)
    if block.hidden is None:
        remarks = (*remarks, "Excel did not say which rows are hidden, so hidden rows are not counted as such.")
    step("checking ...")
    check = check_block(block, book=book.name, settings=settings, remarks=remarks)
    if earlier is None:
        earlier = next((ours for ours in our_sheets(book) if same_range(ours.settings, check)), None)
    return _put(book, cells.sheet, check, earlier, step)


def _put(book: xw.Book, data: xw.Sheet, check: Check, earlier: OurSheet | None, step: Step) -> str:
    """Draw the sheet and bring it in; what was in front is in front again afterwards."""
    from sheetfuncs.hosts.excel.sheets import bring_in, filled_cells, package_file, titles
    from sheetfuncs.hosts.live import draw_check, title_of_check
    from sheetfuncs.report.names import DECISION
    from sheetfuncs.report.record import DECISION_FIELDS

    step("drawing the sheet ...")
    in_front = None if (active := _active_sheet(book)) is None else active.name
    decision = None if earlier is None else filled_cells(earlier.sheet, DECISION, DECISION_FIELDS)
    title = title_of_check(check, titles(book)) if earlier is None else earlier.sheet.name
    with package_file() as package:
        plan = draw_check(check, package, title=title, decision=decision)
        step("bringing the sheet in ...")
        try:
            arrival = bring_in(
                package, title=title, names=plan.names, after=data, replace=None if earlier is None else earlier.sheet
            )
        finally:
            _bring_to_front(book, in_front)
    return _said(book, check, title, data.name, arrival.lost)


def _said(book: xw.Book, check: Check, title: str, data: str, lost: tuple[str, ...]) -> str:
    from sheetfuncs.hosts.excel.native import ask
    from sheetfuncs.judgement.uses import uses
    from sheetfuncs.judgement.words import counted

    ledger = check.observations.ledger
    rows = f"{counted(len(ledger.used), 'row')} used" + (
        f", {len(ledger.excluded):,} left out" if ledger.excluded else ""
    )
    parts = [f"The check of “{data}” is in the sheet “{title}” ({rows})."]
    nothing_left = check.fit.nothing_left()
    parts += [nothing_left] if nothing_left else [f"{use.title}: {use.sentence}" for use in uses(check.evidence)]
    if lost:
        parts.append(f"These pointed at the earlier sheet and have to be entered again: {', '.join(lost)}.")
    if ask(book, "ReadOnly", "read_only"):
        parts.append("This workbook is open for reading only: save it under another name to keep the sheet.")
    return "\n\n".join(parts)


def _why_this_value(book: xw.Book, step: Step) -> str:
    from sheetfuncs.hosts.excel.explaining import explain_cell

    selection = None if _active_sheet(book) is None else book.selection
    if selection is None:
        raise AddressError("No cell is selected: select one with a FIT_ formula, and press the button again.")
    step("calculating ...")
    return explain_cell(selection[0, 0])


def _show_health(book: xw.Book, step: Step) -> str:
    from sheetfuncs.hosts.excel.health import health_text

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
    from sheetfuncs.hosts.excel.sheets import OurSheet, settings_of

    settings = settings_of(sheet)
    return None if settings is None else OurSheet(sheet, settings)


def _bring_to_front(book: xw.Book, title: str | None) -> None:
    # xlwings' own activate also moves Excel before other programs' windows, and fails where it cannot.
    book.impl.activate()
    if title is not None:
        next(sheet for sheet in book.sheets if sheet.name == title).impl.activate()
