"""The files host: read a range of a workbook, check it, and write the diagnostics sheet. No spreadsheet program."""

from __future__ import annotations

import io
import shlex
from collections.abc import Callable, Mapping
from contextlib import nullcontext
from dataclasses import dataclass, field, replace
from datetime import datetime
from pathlib import Path
from typing import Any

from sheetfuncs.cells.address import format_area, quote_sheet
from sheetfuncs.cells.observations import read_observations
from sheetfuncs.checking import Check, check_observations
from sheetfuncs.errors import ArgumentError, WorkbookBusyError, WorkbookError
from sheetfuncs.hosts.places import predictions_at
from sheetfuncs.hosts.recorded import Earlier, earlier_sheet, recorded_settings, sheets_of_other_ranges
from sheetfuncs.judgement.words import counted, listed

Step = Callable[[str], None]
DEFAULT_LEVEL = 0.95


@dataclass(frozen=True)
class Request:
    """What the user asked for. Names are headers or column letters; None means the default."""

    book: Path
    range_text: str | None = None
    response: str | None = None
    predictors: tuple[str, ...] | None = None
    order: str | None = None
    date_predictors: tuple[str, ...] = ()
    base_levels: Mapping[str, str] = field(default_factory=dict)
    intercept: bool = True
    level: float = DEFAULT_LEVEL
    places: tuple[Mapping[str, str], ...] = ()
    out: Path | None = None
    in_place: bool = False
    write: bool = True


@dataclass(frozen=True, eq=False)
class Done:
    """What came of it. out: the workbook written, None where none was; sheet: the diagnostics sheet in it."""

    check: Check
    out: Path | None
    sheet: str | None
    replaced: bool
    warnings: tuple[str, ...]
    predictions: tuple[dict[str, Any], ...]

    def figures(self) -> dict[str, Any]:
        """Every figure, JSON-ready."""
        figures = self.check.to_dict()
        if self.predictions:
            figures["predictions"] = list(self.predictions)
        return figures


def check_book(request: Request, step: Step = lambda text: None) -> Done:
    """Check the requested range and, unless asked not to, write the diagnostics sheet right after the data's sheet."""
    target = _target(request)
    warnings = _busy_warnings(request, target)
    step("Reading the range ...")
    request, remarks = _as_recorded(request)
    check = _read_and_check(request, remarks, step)
    predictions = predictions_at(check, request.places, request.level)
    if target is None:
        return Done(check, None, None, False, warnings, predictions)
    warnings = (*warnings, *_about_what_is_there(request, target, check))
    earlier = earlier_sheet(request.book, target, check.settings)
    step("Drawing the sheet ...")
    sheet, more = _write(request, check, target, earlier, step)
    return Done(check, target, sheet, earlier.replace is not None, (*warnings, *more), predictions)


def evaluate_cell(formula: str, book: Path) -> Any:
    """The value of one worksheet formula of ours on a workbook's cells: a scalar, or a list of rows."""
    from sheetfuncs.functions.formula import evaluate_formula
    from sheetfuncs.workbook.read import open_book
    from sheetfuncs.workbook.selection import resolve_reference

    with open_book(book) as opened:
        return evaluate_formula(formula, lambda text: opened.read(resolve_reference(opened, text)))


def undo_check(book: Path, *, force: bool = False) -> str:
    """Bring a workbook back to what it was before the latest check; returns the sentence that says so."""
    from sheetfuncs.workbook import undo

    undone = undo(book, force=force)
    kept = f" The edited file is kept as {undone.edits}." if undone.edits else ""
    return f"{book} is back as it was before the latest check.{kept}"


def write_names_plainly(book: Path) -> str:
    """Write names of ours in a workbook as every program reads them; returns the sentence that says what changed."""
    from sheetfuncs.workbook.formula_names import write_plain_names

    if book.is_dir():
        raise WorkbookError(f"{book} is a folder. Give the workbook in it.")
    names = write_plain_names(book)
    if not names:
        return f"The names of our functions in {book} are plain already, or it holds none; it was left as it is."
    verb = "is" if names == 1 else "are"
    return f"{counted(names, 'name')} in {book} {verb} now written as every program reads them."


def _target(request: Request) -> Path | None:
    if request.book.is_dir():
        raise WorkbookError(f"{request.book} is a folder. Give the workbook in it.")
    if not request.write:
        return None
    if request.in_place:
        return request.book
    target = request.out or request.book.with_name(f"{request.book.stem}-checked{request.book.suffix}")
    if target.exists() and request.book.exists() and target.samefile(request.book):
        raise ArgumentError(f"--out {target} is the workbook itself: use --in-place to write into it.")
    if target.exists():
        from sheetfuncs.workbook import find_our_sheets

        if not find_our_sheets(target):
            raise WorkbookError(
                f"{target} is there already and holds no diagnostics sheet of ours, so it is left alone: "
                "choose another name with --out."
            )
    return target


def _about_what_is_there(request: Request, target: Path, check: Check) -> tuple[str, ...]:
    """What becomes of the copy that is there already. Refused where it holds a check that would not come back."""
    if request.in_place or not target.exists():
        return ()
    others = sheets_of_other_ranges(target, request.book, check.settings)
    if others:
        raise WorkbookError(
            f"{target} also holds the check of another range ({', '.join(others)}), which writing it anew would take "
            f"out. Add this check to it with --in-place on {target}, or choose another file with --out."
        )
    return (f"The {target.name} that was there is kept: sheetfuncs undo {shlex.quote(str(target))} brings it back.",)


def _busy_warnings(request: Request, target: Path | None) -> tuple[str, ...]:
    from sheetfuncs.workbook import opened_by

    if target is not None:
        busy = opened_by(target)
        if busy:
            raise WorkbookBusyError(busy if request.in_place else f"{busy} Or choose another file with --out.")
    busy = opened_by(request.book)
    return (f"Note: {busy} What was saved last is what was checked.",) if busy else ()


def _as_recorded(request: Request) -> tuple[Request, tuple[str, ...]]:
    """Without a range, in a workbook that opens on a sheet of ours: that check again, but for what was asked anew."""
    found = recorded_settings(request.book) if request.range_text is None else None
    if found is None:
        return request, ()
    kept = found.settings
    place = f"{quote_sheet(kept['sheet'])}!{kept['area']}"
    again = replace(
        request, range_text=place,
        response=request.response or kept.get("response"),
        predictors=request.predictors or tuple(kept.get("predictors") or ()) or None,
        order=request.order or kept.get("order"),
        date_predictors=request.date_predictors or tuple(kept.get("date_predictors") or ()),
        base_levels=request.base_levels or dict(kept.get("base_levels") or {}),
        intercept=request.intercept and bool(kept.get("intercept", True)),
        level=request.level if request.level != DEFAULT_LEVEL else float(kept.get("level", DEFAULT_LEVEL)),
    )
    changed = f", of which {listed(found.changed)} changed there" if found.changed else ""
    return again, (
        f"The workbook opens on “{found.title}”, so that check of {place} was made again with its settings{changed}.",
    )


def _read_and_check(request: Request, remarks: tuple[str, ...], step: Step) -> Check:
    from sheetfuncs.workbook.read import open_book
    from sheetfuncs.workbook.selection import find_selection
    from sheetfuncs.workbook.selection_columns import read_selection

    with open_book(request.book) as book:
        selection = read_selection(
            book, find_selection(book, request.range_text), response=request.response, predictors=request.predictors,
            order=request.order, date_predictors=request.date_predictors,
        )
    observations = read_observations(
        selection.response, selection.predictors, selection.order, dates="check",
        date_predictors=request.date_predictors, base_levels=request.base_levels,
    )
    step("Checking ...")
    return check_observations(
        observations, intercept=request.intercept, level=request.level, remarks=(*remarks, *selection.remarks),
        date_predictors=request.date_predictors, base_levels=request.base_levels, book=request.book.name,
        sheet=selection.area.sheet, area=format_area(replace(selection.area, sheet=None)),
    )


def _write(
    request: Request, check: Check, target: Path, earlier: Earlier, step: Step
) -> tuple[str, tuple[str, ...]]:
    from sheetfuncs.report.draw import draw_report
    from sheetfuncs.workbook import insert_sheet, keep_for_undo

    data_sheet, area = str(check.settings.sheet), str(check.settings.area)
    drawn = io.BytesIO()
    draw_report(
        check, drawn, title=earlier.title, data_sheet=data_sheet, data_area=area, decision=earlier.decision,
        checked_at=datetime.now(),
    )
    step("Writing the workbook ...")
    # A file of ours that is replaced may hold work of the user's too: it can be brought back with undo.
    with keep_for_undo(target) if target.exists() else nullcontext():
        insertion = insert_sheet(
            request.book, drawn, after=None if earlier.replace else data_sheet, replace=earlier.replace, out=target
        )
    return insertion.name, insertion.warnings
