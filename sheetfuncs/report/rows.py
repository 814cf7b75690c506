"""Rows that deserve a look: each a jump to its data row, with a sentence that says why."""

from __future__ import annotations

from sheetfuncs.checking import Check
from sheetfuncs.report import style as looks
from sheetfuncs.report.formats import column_format
from sheetfuncs.report.layout import COUNT, FIRST, Head, Page
from sheetfuncs.report.links import to_row
from sheetfuncs.report.text import shortened

NOTE = (
    "Look at each at its source: a typing error, another unit, another kind of case? A row is never left out because "
    "it disagrees; fit with and without it and report both."
)


def write_rows(page: Page, check: Check, data_sheet: str, data_area: str) -> None:
    """The section: the rows to look at, most urgent first."""
    page.section("rows", "Rows that deserve a look", NOTE if check.flagged else "")
    if not check.flagged:
        page.put(FIRST, check.fit.nothing_left() or "No row stands out.", looks.WRAPPED, span=COUNT)
        page.next()
        return
    page.table_head([
        Head(FIRST, 1, "Row"), Head(FIRST + 1, 1, shortened(check.settings.response, 24), right=True),
        Head(FIRST + 2, 1, "Fitted", right=True), Head(FIRST + 3, 1, "Residual", right=True),
        Head(FIRST + 4, COUNT - 4, "Why"),
    ])
    response, fitted, residuals = check.design.response, check.fit.fitted, check.fit.residuals
    places = [flag.index for flag in check.flagged]
    one_format = column_format([*response[places], *fitted[places]], 5)
    for flag in check.flagged:
        page.put(FIRST, flag.row, looks.LINK, link=to_row(data_sheet, data_area, flag.row))
        page.number(FIRST + 1, response[flag.index], one_format)
        page.number(FIRST + 2, fitted[flag.index], one_format)
        page.number(FIRST + 3, residuals[flag.index], column_format(residuals[places], 4))
        page.put(FIRST + 4, flag.reason, looks.BESIDE, span=COUNT - 4)
        page.next()
