"""A plan drawn with XlsxWriter, as a package of one sheet."""

from __future__ import annotations

import math
from collections.abc import Mapping
from datetime import datetime
from pathlib import Path
from typing import Any, BinaryIO

import xlsxwriter
from xlsxwriter.format import Format
from xlsxwriter.workbook import Workbook
from xlsxwriter.worksheet import Worksheet

from sheetfuncs.checking import Check
from sheetfuncs.report.chart_drawing import insert_chart
from sheetfuncs.report.elements import Cell, SheetPlan, Value
from sheetfuncs.report.paging import MARGIN_BOTTOM, MARGIN_LEFT_RIGHT, MARGIN_TOP
from sheetfuncs.report.plan import plan_sheet
from sheetfuncs.report.style import FONT, INK, Style

# A text from the data stays a text: never a formula, a link or a number.
OPTIONS = {
    "in_memory": True,  # the analyst's data pass through no temporary file
    "strings_to_formulas": False, "strings_to_urls": False, "strings_to_numbers": False, "constant_memory": False,
    "nan_inf_to_errors": False, "default_format_properties": {"font_name": FONT, "font_size": 9},
}
MOST_TEXT = 32_767
_PAPER_A4 = 9
_FIXED_DATE = datetime(2000, 1, 1)


def draw_report(
    check: Check, out: str | Path | BinaryIO, *, title: str, data_sheet: str, data_area: str,
    decision: Mapping[str, Value] | None = None, checked_at: datetime | None = None,
) -> SheetPlan:
    """Plan and draw in one call; arguments as of `plan_sheet`. Returns the plan."""
    plan = plan_sheet(
        check, title=title, data_sheet=data_sheet, data_area=data_area, decision=decision, checked_at=checked_at,
    )
    draw_plan(plan, out)
    return plan


def draw_plan(plan: SheetPlan, out: str | Path | BinaryIO) -> None:
    """Write the plan as an .xlsx package of one sheet. The same plan gives the same bytes."""
    with xlsxwriter.Workbook(str(out) if isinstance(out, str | Path) else out, OPTIONS) as workbook:
        workbook.set_properties({
            "title": plan.description.get("title", ""), "subject": plan.description.get("subject", "")[:255],
            "created": _FIXED_DATE,
        })
        draw_sheet(workbook, plan)


def draw_sheet(workbook: Workbook, plan: SheetPlan) -> Worksheet:
    """Add the plan's sheet to an XlsxWriter workbook made with OPTIONS."""
    sheet = workbook.add_worksheet(plan.title)
    formats = _Formats(workbook)
    _size_grid(sheet, plan, formats)
    for cell in plan.cells:
        _write_cell(sheet, cell, formats)
    for column in plan.columns:
        look = formats.get(column.style)
        for place, value in enumerate(column.values):
            _write_value(sheet, column.row - 1 + place, column.column - 1, value, look)
    for choice in plan.choices:
        sheet.data_validation(choice.row - 1, choice.column - 1, choice.row - 1, choice.column - 1, {
            "validate": "list", "source": list(choice.options), "show_error": False,
        })
    for chart in plan.charts:
        insert_chart(workbook, sheet, plan.title, chart)
    for name, formula in plan.names.items():
        # Written to the list itself: the public call cannot hide a name, nor take a sheet whose name holds "!".
        workbook.defined_names.append([name, sheet.index, formula.removeprefix("="), True])
    _set_page(sheet, plan)
    return sheet


class _Exact(float):
    """A number that is written with all its digits. XlsxWriter asks for sixteen, and a copy of a column like
    1e9 + u needs the seventeenth: without it the cross-check would fit other data than ours."""

    def __format__(self, specification: str) -> str:
        return repr(float(self))


class _Formats:
    """Workbook formats by style, each made once."""

    def __init__(self, workbook: Workbook):
        self.workbook = workbook
        self.made: dict[Style, Format] = {}

    def get(self, style: Style) -> Format:
        if style not in self.made:
            self.made[style] = self.workbook.add_format(_properties(style))
        return self.made[style]


def _properties(style: Style) -> dict[str, Any]:
    properties: dict[str, Any] = {
        "font_name": FONT, "font_size": style.size, "font_color": style.colour, "align": style.align,
        "valign": style.upright, "num_format": style.number_format,
    }
    if style.bold:
        properties["bold"] = True
    if style.italic:
        properties["italic"] = True
    if style.underlined:
        properties["underline"] = 1
    if style.wrap:
        properties["text_wrap"] = True
    if style.indent:
        properties["indent"] = style.indent
    if style.fill:
        properties |= {"bg_color": style.fill, "pattern": 1}
    if style.editable:
        properties["locked"] = False
    for side, colour in (("top", style.above), ("bottom", style.below)):
        if colour:
            properties |= {side: 1, f"{side}_color": colour}
    if style.box:
        properties |= {"border": 1, "border_color": style.box}
    return properties


def _size_grid(sheet: Worksheet, plan: SheetPlan, formats: _Formats) -> None:
    for column, pixels in plan.widths.items():
        sheet.set_column_pixels(column - 1, column - 1, pixels)
    for row, points in plan.heights.items():
        sheet.set_row(row - 1, points)


def _write_cell(sheet: Worksheet, cell: Cell, formats: _Formats) -> None:
    look = formats.get(cell.style)
    row, column = cell.row - 1, cell.column - 1
    if cell.last_column is not None and cell.last_column > cell.column:
        sheet.merge_range(row, column, row, cell.last_column - 1, "", look)
    if cell.formula is not None:
        write = sheet.write_array_formula if cell.array else sheet.write_formula
        place = (row, column, row, column) if cell.array else (row, column)
        write(*place, "=" + cell.formula, look, cell.value)
    elif cell.link is not None:
        sheet.write_url(row, column, "internal:" + cell.link, look, str(cell.value))
        if not isinstance(cell.value, str):
            _write_value(sheet, row, column, cell.value, look)
    else:
        _write_value(sheet, row, column, cell.value, look)


def _write_value(sheet: Worksheet, row: int, column: int, value: Value, look: Format) -> None:
    if value is None or value == "":
        sheet.write_blank(row, column, None, look)
    elif isinstance(value, str):
        sheet.write_string(row, column, value[:MOST_TEXT], look)
    elif math.isfinite(value):
        sheet.write_number(row, column, _Exact(value), look)
    else:
        raise ValueError(f"Row {row + 1}, column {column + 1} was planned as {value}, which no cell holds.")


def _set_page(sheet: Worksheet, plan: SheetPlan) -> None:
    sheet.hide_gridlines(2)
    sheet.set_landscape()
    sheet.set_paper(_PAPER_A4)
    sheet.set_margins(left=MARGIN_LEFT_RIGHT, right=MARGIN_LEFT_RIGHT, top=MARGIN_TOP, bottom=MARGIN_BOTTOM)
    sheet.fit_to_pages(1, 0)
    sheet.print_area(0, 0, plan.print_rows - 1, plan.last_column - 1)
    sheet.set_h_pagebreaks(list(plan.breaks))
    title = plan.footer.replace("&", "&&")
    sheet.set_footer(f"&L&8{title[:200]}&R&8Page &P of &N")
    if plan.frozen_rows:
        sheet.freeze_panes(plan.frozen_rows, 0)
    if plan.print_rows > plan.frozen_rows:
        sheet.repeat_rows(0)
    sheet.set_tab_color(INK)
