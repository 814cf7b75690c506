"""The whole sheet as a plan, section by section, from a check."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import datetime

from sheetfuncs.checking import Check
from sheetfuncs.report.charts import reserve_panels, write_figures
from sheetfuncs.report.coefficients import write_fit
from sheetfuncs.report.elements import SheetPlan, Value
from sheetfuncs.report.first_screen import what_was_fitted, write_first_screen, write_jumps
from sheetfuncs.report.layout import COLUMN_PIXELS, FIRST, LAST, MARGIN_PIXELS, Page
from sheetfuncs.report.ledger import write_ledger
from sheetfuncs.report.names import settings_to_names
from sheetfuncs.report.paging import page_breaks
from sheetfuncs.report.record import entries_of, fingerprint_of, write_decision, write_settings
from sheetfuncs.report.reviewer import reserve_cross_check, why_no_copy, write_copy, write_cross_check
from sheetfuncs.report.rows import write_rows
from sheetfuncs.report.separation import write_separation
from sheetfuncs.report.statistics import write_statistics

__all__ = ["SheetPlan", "plan_sheet"]


def plan_sheet(
    check: Check, *, title: str, data_sheet: str, data_area: str, decision: Mapping[str, Value] | None = None,
    checked_at: datetime | None = None,
) -> SheetPlan:
    """Plan the diagnostics sheet of one check.

    title: the sheet's name, at most 31 characters. data_sheet, data_area: where the data stand ("Jobs", "B3:F64"),
    for the jumps. decision: what the record holds so far, by the names in `record.DECISION_FIELDS`; dates as serial
    numbers. checked_at: the time to print; None prints none, so that the same check gives the same sheet.
    """
    page = Page(title)
    fingerprint = fingerprint_of(check)
    write_first_screen(page, check, data_sheet, data_area)
    panels = reserve_panels(page, check)
    write_rows(page, check, data_sheet, data_area)
    write_statistics(page, check)
    write_fit(page, check)
    write_separation(page, check)
    write_ledger(page, check, data_sheet, data_area)
    start = reserve_cross_check(page, check)
    write_decision(page, decision, fingerprint)
    write_settings(page, check, data_sheet, data_area, checked_at, fingerprint)
    printed = page.row - 1
    if not why_no_copy(check):
        write_cross_check(page, check, start, write_copy(page, check))
    write_figures(page, panels)
    write_jumps(page)
    settings = {**check.settings.to_dict(), "fingerprint": fingerprint, "shown": entries_of(check)}
    page.names.update(settings_to_names(settings))
    return _finished(page, check, settings, printed, data_sheet)


def _finished(page: Page, check: Check, settings: dict, printed: int, data_sheet: str) -> SheetPlan:
    used = [cell.last_column or cell.column for cell in page.cells]
    widest = max([LAST + 1, *used, *(column.column for column in page.columns)])
    widths = {FIRST - 1: MARGIN_PIXELS, **dict.fromkeys(range(FIRST, widest + 1), COLUMN_PIXELS)}
    return SheetPlan(
        title=page.title, cells=tuple(page.cells), columns=tuple(page.columns), charts=tuple(page.charts),
        choices=tuple(page.choices), widths=widths, heights=dict(page.heights), names=dict(page.names),
        settings=settings, last_column=LAST, print_rows=printed,
        breaks=page_breaks(page.heights, printed, page.kept, page.heights[1]), frozen_rows=2, footer=page.title,
        description={"title": page.title, "subject": what_was_fitted(check), "data": data_sheet},
    )
