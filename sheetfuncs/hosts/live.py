"""A check of cells that a running program hands over, for the hosts that put a button beside the sheet."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from datetime import datetime
from pathlib import Path
from typing import Any, BinaryIO

from sheetfuncs.cells.address import MAX_COLUMNS, Area, column_letters, format_area
from sheetfuncs.cells.block import Block
from sheetfuncs.cells.observations import read_observations
from sheetfuncs.checking import Check, check_observations
from sheetfuncs.errors import ArgumentError
from sheetfuncs.report.draw import draw_report
from sheetfuncs.report.elements import SheetPlan, Value
from sheetfuncs.workbook.selection_columns import select_columns
from sheetfuncs.workbook.titles import sheet_title


def check_block(
    block: Block, *, book: str, settings: Mapping[str, Any] | None = None, remarks: Iterable[str] = ()
) -> Check:
    """Check the regression in a block of cells: response first unless the settings of an earlier sheet say otherwise.

    block: with its sheet, first row and column, DATE kinds and, if the host knows, hidden rows. book: the workbook's
    title, for the record. settings: what an earlier sheet of ours recorded, which are then used again. remarks: one
    sentence for each thing that the host decided. Raises a SheetfuncsError whose text is the sentence to show.
    """
    known = settings or {}
    dates = tuple(known.get("date_predictors") or ())
    bases = dict(known.get("base_levels") or {})
    selected = select_columns(
        block, response=known.get("response"), predictors=tuple(known.get("predictors") or ()) or None,
        order=known.get("order"), date_predictors=dates,
    )
    observations = read_observations(
        selected.response, selected.predictors, selected.order, dates="check", date_predictors=dates, base_levels=bases,
    )
    return check_observations(
        observations, intercept=bool(known.get("intercept", True)), level=float(known.get("level", 0.95)),
        remarks=(*remarks, *selected.remarks), date_predictors=dates, base_levels=bases, book=book,
        sheet=selected.area.sheet, area=format_area(replace(selected.area, sheet=None)),
    )


def area_of_parts(parts: Sequence[Area]) -> tuple[Area, dict[str, Any]]:
    """The rectangle over the parts of a selection, and settings that take their columns alone: the first one is the
    response, the others are the predictors, in the order in which they were selected.

    One part gives itself and no settings. Raises ArgumentError where the parts stand on different rows or sheets, or
    are a single column.
    """
    first = parts[0]
    if len(parts) == 1:
        return first, {}
    if any((part.sheet, part.first_row, part.last_row) != (first.sheet, first.first_row, first.last_row)
           for part in parts):
        said = ", ".join(format_area(replace(part, sheet=None)) for part in parts[:4])
        raise ArgumentError(
            f"The selected parts ({said}{', ...' if len(parts) > 4 else ''}) stand on different rows: select columns "
            "over the same rows, the response first, or one whole block."
        )
    places = [place for part in parts for place in range(part.first_column, (part.last_column or MAX_COLUMNS) + 1)]
    columns = [column_letters(place) for place in dict.fromkeys(places)]
    if len(columns) == 1:
        raise ArgumentError(f"Only column {columns[0]} is selected: select the response and at least one predictor.")
    cover = replace(first, first_column=min(places), last_column=max(places))
    return cover, {"response": columns[0], "predictors": columns[1:]}


def draw_check(
    check: Check, out: str | Path | BinaryIO, *, title: str, decision: Mapping[str, Value] | None = None
) -> SheetPlan:
    """Draw the diagnostics sheet as a package of one sheet, dated now; returns its plan.

    title: of the sheet in the host's workbook, since formulas and links on it name it. decision: the filled cells of
    an earlier decision record by field (report.record.DECISION_FIELDS), written back unchanged.
    """
    return draw_report(
        check, out, title=title, data_sheet=str(check.settings.sheet), data_area=str(check.settings.area),
        decision=decision, checked_at=datetime.now(),
    )


def title_of_check(check: Check, taken: Iterable[str]) -> str:
    """A title for the diagnostics sheet that none of the workbook's sheets has."""
    return sheet_title(f"Check of {check.settings.sheet}", taken=list(taken))


def same_range(settings: Mapping[str, Any] | None, check: Check) -> bool:
    """Whether the settings that a sheet of ours recorded are of the range just checked, so that it is replaced."""
    found = settings or {}
    return (found.get("sheet"), found.get("area")) == (check.settings.sheet, check.settings.area)
