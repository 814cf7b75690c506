"""The button's job in the worker: a block of cells in, the diagnostics sheet as a package of one sheet out."""

from __future__ import annotations

import io
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any

from sheetfuncs.cells.address import parse_area
from sheetfuncs.cells.block import Block
from sheetfuncs.checking import Check, Settings
from sheetfuncs.hosts.calc.worker import Head, Progress
from sheetfuncs.hosts.live import area_of_parts, check_block, draw_check, same_range, title_of_check
from sheetfuncs.judgement.words import listed
from sheetfuncs.report.elements import Chart, SheetPlan
from sheetfuncs.report.entries import ENTRY_FIELDS, changed_entries, settings_from_entries
from sheetfuncs.report.layout import COLUMN_PIXELS
from sheetfuncs.report.names import DECISION, ENTRY
from sheetfuncs.report.record import DECISION_FIELDS
from sheetfuncs.workbook.regions import below_titles
from sheetfuncs.workbook.settings import settings_from_names

# Lengths go to LibreOffice in hundredths of a millimetre.
_PIXEL, _POINT = 2540 / 96, 2540 / 72
_CHART_OFFSET, _CHART_SLACK = 2, 8
_KEPT = ("response", "predictors", "intercept", "order", "level", "date_predictors", "base_levels")


def check(head: Head, blocks: list[Block], progress: Progress) -> tuple[Head, bytes | None]:
    """Check one block and draw its sheet.

    head: book, the document's title; sheets, the titles of all its sheets; ours, its diagnostics sheets, each with
    title, names (sheet-scoped names and what they hold) and cells (name -> what stands in the cell it points at);
    again, the title of the one whose settings are used again, or None; titled, whether what was chosen may have titles
    above the data (whole columns, the block around a cell); area, what to record where that is not the block ("B:F");
    parts, the areas of a selection of several, which the block covers; remarks.

    The answer: title of the new sheet; replaces, the title of the sheet in whose place it comes, or None; finding,
    one sentence; layout, what the import cannot carry (see `layout_of`). Its part is the package.
    """
    block, remarks = blocks[0], list(head.get("remarks", ()))
    if head.get("titled"):
        block, skipped = below_titles(block)
        remarks += skipped
    progress("Checking ...")
    settings, said = _settings(head)
    done = check_block(block, book=head["book"], settings=settings, remarks=[*remarks, *said])
    if head.get("area"):
        done = replace(done, settings=replace(done.settings, area=head["area"]))
    earlier = _earlier(head.get("ours", ()), done)
    progress("Drawing the sheet ...")
    out = io.BytesIO()
    title = earlier["title"] if earlier else title_of_check(done, head["sheets"])
    plan = draw_check(done, out, title=title, decision=_decision(earlier))
    answer = {
        "title": title, "replaces": earlier["title"] if earlier else None, "finding": finding(done),
        "notes": _lost_choices(earlier, done.settings, bool(head.get("again"))), "layout": layout_of(plan),
    }
    return answer, out.getvalue()


def finding(check: Check) -> str:
    """One sentence for the person who pressed the button: against what there is evidence."""
    nothing = check.fit.nothing_left()
    if nothing:
        return nothing
    against = [evidence.without_p.rstrip(".") for evidence in check.evidence if evidence.against]
    found = "; ".join(text if not place else text[:1].lower() + text[1:] for place, text in enumerate(against))
    return f"{found}." if found else "No evidence found against an assumption, which is not proof."


def layout_of(plan: SheetPlan) -> dict[str, Any]:
    """Sizes and places for the sheet once it is imported, lengths in hundredths of a millimetre.

    widths, heights: [first, last, length] of neighbouring columns or rows of one length; charts: [row, column, offset,
    width, height], in the order of the drawing; frozen_rows.
    """
    return {
        "widths": _runs({column: pixels * _PIXEL for column, pixels in plan.widths.items()}),
        "heights": _runs({row: points * _POINT for row, points in plan.heights.items()}),
        "charts": [_place(chart) for chart in plan.charts],
        "frozen_rows": plan.frozen_rows,
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


def _earlier(ours: Any, check: Check) -> dict[str, Any] | None:
    """Our sheet of the same range, the first where there are several, with its settings read."""
    for sheet in ours:
        settings = settings_from_names(sheet["names"].items())
        if same_range(settings, check):
            return {**sheet, "settings": settings}
    return None


def _settings(head: Head) -> tuple[dict[str, Any] | None, list[str]]:
    """The settings to use, and a sentence on those that were changed in the cells of the sheet that holds them."""
    if head.get("parts"):
        return area_of_parts([parse_area(part) for part in head["parts"]])[1], []
    found = next((sheet for sheet in head.get("ours", ()) if sheet["title"] == head.get("again")), None)
    recorded = settings_from_names(found["names"].items()) if found else None
    if found is None or recorded is None:
        return None, []
    settings = settings_from_entries(recorded, _cells(found, ENTRY, ENTRY_FIELDS))
    changed = changed_entries(recorded, settings)
    said = [f"Made again with what was changed under Settings: {listed(changed)}."] if changed else []
    return settings, said


def _decision(earlier: Mapping[str, Any] | None) -> dict[str, Any]:
    """The filled cells of the earlier sheet's record, by field."""
    cells = _cells(earlier, DECISION, DECISION_FIELDS) if earlier else {}
    return {field: value for field, value in cells.items() if value not in (None, "")}


def _cells(sheet: Mapping[str, Any], prefix: str, fields: Sequence[str]) -> dict[str, Any]:
    """What stands in the cells that the sheet's names of this kind point at, by field."""
    cells = sheet["cells"]
    named = {f"{prefix}{place}": field for place, field in enumerate(fields, 1)}
    return {field: cells[name] for name, field in named.items() if name in cells}


def _lost_choices(earlier: Mapping[str, Any] | None, settings: Settings, asked: bool) -> list[str]:
    """A sentence where the replaced sheet was made with other settings, and nobody asked for that."""
    if earlier is None or asked:
        return []
    now, before = settings.to_dict(), earlier["settings"]
    changed = [name.replace("_", " ") for name in _KEPT if name in before and before[name] != now[name]]
    if not changed:
        return []
    return [f"The sheet before was made with another choice of {', '.join(changed)}: undo brings it back."]
