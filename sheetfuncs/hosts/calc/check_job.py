"""The button's job in the worker: a block of cells in, the diagnostics sheet as a package of one sheet out."""

from __future__ import annotations

import io
from collections.abc import Mapping
from dataclasses import replace
from typing import Any

from sheetfuncs.cells.block import Block, Kind
from sheetfuncs.checking import Check, Settings
from sheetfuncs.hosts.calc.worker import Head, Progress
from sheetfuncs.hosts.live import check_block, draw_check, same_range, title_of_check
from sheetfuncs.report.elements import Chart, SheetPlan
from sheetfuncs.report.layout import COLUMN_PIXELS
from sheetfuncs.report.record import DECISION_FIELDS
from sheetfuncs.workbook.regions import first_block
from sheetfuncs.workbook.settings import settings_from_names

# Lengths go to LibreOffice in hundredths of a millimetre.
_PIXEL, _POINT = 2540 / 96, 2540 / 72
_CHART_OFFSET, _CHART_SLACK = 2, 8
_KEPT = ("response", "predictors", "intercept", "order", "level", "date_predictors", "base_levels")


def check(head: Head, blocks: list[Block], progress: Progress) -> tuple[Head, bytes | None]:
    """Check one block and draw its sheet.

    head: book, the document's title; sheets, the titles of all its sheets; ours, its diagnostics sheets, each with
    title, names (sheet-scoped names and what they hold) and decision (place in the record, from "1" -> value);
    settings, those to be used again, or None; titled, whether what was chosen may have titles above the data (whole
    columns, the block around a cell); area, what to record where that is not the block ("B:F"); remarks.

    The answer: title of the new sheet; replaces, the title of the sheet in whose place it comes, or None; finding,
    one sentence; layout, what the import cannot carry (see `layout_of`). Its part is the package.
    """
    block, remarks = blocks[0], list(head.get("remarks", ()))
    if head.get("titled"):
        block, skipped = _below_titles(block)
        remarks += skipped
    progress("Checking ...")
    done = check_block(block, book=head["book"], settings=head.get("settings"), remarks=remarks)
    if head.get("area"):
        done = replace(done, settings=replace(done.settings, area=head["area"]))
    earlier = _earlier(head.get("ours", ()), done)
    progress("Drawing the sheet ...")
    out = io.BytesIO()
    title = earlier["title"] if earlier else title_of_check(done, head["sheets"])
    plan = draw_check(done, out, title=title, decision=_decision(earlier))
    answer = {
        "title": title, "replaces": earlier["title"] if earlier else None, "finding": finding(done),
        "notes": _lost_choices(earlier, done.settings), "layout": layout_of(plan),
    }
    return answer, out.getvalue()


def finding(check: Check) -> str:
    """One sentence for the person who pressed the button: against what there is evidence."""
    nothing = check.fit.nothing_left()
    if nothing:
        return nothing
    against = [evidence.finding.rstrip(".") for evidence in check.evidence if evidence.against]
    found = "; ".join(text if not place else text[:1].lower() + text[1:] for place, text in enumerate(against))
    return f"{found}." if found else "No evidence found against an assumption, which is not proof."


def layout_of(plan: SheetPlan) -> dict[str, Any]:
    """Sizes and places for the sheet once it is imported, lengths in hundredths of a millimetre.

    widths, heights: [first, last, length] of neighbouring columns or rows of one length; charts: [row, column, offset,
    width, height], in the order of the drawing; frozen_rows; print_rows and print_columns; repeated_rows.
    """
    return {
        "widths": _runs({column: pixels * _PIXEL for column, pixels in plan.widths.items()}),
        "heights": _runs({row: points * _POINT for row, points in plan.heights.items()}),
        "charts": [_place(chart) for chart in plan.charts],
        "frozen_rows": plan.frozen_rows, "print_rows": plan.print_rows, "print_columns": plan.last_column,
        "repeated_rows": int(plan.print_rows > plan.frozen_rows),
    }


def _runs(lengths: Mapping[int, float]) -> list[list[int]]:
    runs: list[list[int]] = []
    for place, length in sorted(lengths.items()):
        if runs and runs[-1][1] == place - 1 and runs[-1][2] == round(length):
            runs[-1][1] = place
        else:
            runs.append([place, place, round(length)])
    return runs


def _place(chart: Chart) -> list[int]:
    columns = chart.place.last_column - chart.place.first_column + 1
    width = int(columns * COLUMN_PIXELS) - _CHART_SLACK
    return [
        chart.place.first_row, chart.place.first_column, round(_CHART_OFFSET * _PIXEL), round(width * _PIXEL),
        round(chart.height * _PIXEL),
    ]


def _below_titles(block: Block) -> tuple[Block, list[str]]:
    """The block from its first block of data on, and a sentence where titles or notes stood above."""
    found = first_block(block)
    start = found[0].first_row - 1 if found else 0
    if not start:
        return block, []
    below = block.rows(start, block.row_count)
    if not (block.kinds[:start] != Kind.BLANK).any():
        return below, []
    return below, [f"What stands above row {below.first_row} was skipped, as a title or note."]


def _earlier(ours: Any, check: Check) -> dict[str, Any] | None:
    """Our sheet of the same range, the first where there are several, with its settings read."""
    for sheet in ours:
        settings = settings_from_names(sheet["names"].items())
        if same_range(settings, check):
            return {**sheet, "settings": settings}
    return None


def _decision(earlier: Mapping[str, Any] | None) -> dict[str, Any]:
    """The filled cells of the earlier sheet's record, by field."""
    filled = earlier["decision"] if earlier else {}
    return {
        DECISION_FIELDS[int(place) - 1]: value for place, value in filled.items()
        if value not in (None, "") and 1 <= int(place) <= len(DECISION_FIELDS)
    }


def _lost_choices(earlier: Mapping[str, Any] | None, settings: Settings) -> list[str]:
    """A sentence where the replaced sheet was made with other settings than the new one."""
    if earlier is None:
        return []
    now, before = settings.to_dict(), earlier["settings"]
    changed = [name.replace("_", " ") for name in _KEPT if name in before and before[name] != now[name]]
    if not changed:
        return []
    return [f"The sheet before was made with another choice of {', '.join(changed)}: undo brings it back."]
