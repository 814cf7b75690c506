"""One panel an assumption: what was found, and a chart that answers the question. Two panels stand side by side."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from sheetfuncs.checking import Check
from sheetfuncs.report import style as looks
from sheetfuncs.report.chart_order import autocorrelation_chart, order_chart
from sheetfuncs.report.chart_residuals import form_chart, normality_chart, variance_chart
from sheetfuncs.report.chart_rows import rows_chart, separation_chart
from sheetfuncs.report.elements import Area
from sheetfuncs.report.figures import FigureBlock
from sheetfuncs.report.first_screen import finding_look, sentence
from sheetfuncs.report.layout import COUNT, FIRST, ROW_POINTS, Page
from sheetfuncs.report.sketch import Sketch

CHART_ROWS = 12
CHART_PIXELS = int(CHART_ROWS * ROW_POINTS * 96 / 72) - 4
_WIDTH = COUNT // 2
FURTHER_APART = "Independence, further apart"

# Assumption, heading, chart; two of a row of panels belong together where they can.
PANELS: tuple[tuple[str, str, Callable[[Check], Sketch | None]], ...] = (
    ("form", "Form and mean", form_chart),
    ("constant variance", "Constant variance", variance_chart),
    ("independence", "Independence", order_chart),
    ("independence", FURTHER_APART, autocorrelation_chart),
    ("normality", "Normality", normality_chart),
    ("rows", "Single rows", rows_chart),
    ("collinearity", "Collinearity", separation_chart),
)


@dataclass(frozen=True)
class Panel:
    """A sketch and the place that was kept for its chart."""

    sketch: Sketch
    place: Area


def reserve_panels(page: Page, check: Check) -> list[Panel]:
    """Write the panels' texts and keep room for the charts."""
    page.section("charts", "Charts")
    sketches = [(name, title, sketch) for name, title, draw in PANELS if (sketch := draw(check)) is not None]
    if not sketches:
        page.put(FIRST, f"None. {check.fit.nothing_left() or 'There are too few rows.'}", looks.WRAPPED, span=COUNT)
        page.next()
        return []
    panels: list[Panel] = []
    for start in range(0, len(sketches), 2):
        panels += _write_row(page, check, sketches[start:start + 2])
    return panels


def _write_row(page: Page, check: Check, sketches: Sequence[tuple[str, str, Sketch]]) -> list[Panel]:
    top = page.row
    findings = {evidence.assumption: evidence for evidence in check.evidence}
    columns = [FIRST + place * _WIDTH for place in range(len(sketches))]
    for column, (_, title, _) in zip(columns, sketches, strict=True):
        page.put(column, title, looks.STRONG, span=_WIDTH)
    page.next()
    for column, (assumption, title, _) in zip(columns, sketches, strict=True):
        evidence = findings[assumption]
        if title == FURTHER_APART:  # its neighbour has said the finding
            page.put(column, sentence(evidence.size), looks.WRAPPED, span=_WIDTH)
        else:
            page.put(column, evidence.with_test, finding_look(evidence).but(bold=False), span=_WIDTH)
    page.next()
    first, last = page.row, page.row + CHART_ROWS - 1
    for row in range(first, last + 1):
        page.heights[row] = ROW_POINTS  # said aloud, since a host's own default may differ
    page.row = last + 1
    for column, (assumption, _, sketch) in zip(columns, sketches, strict=True):
        bears_on = findings[assumption].bears_on
        matters = f" Why it matters: {bears_on[:1].lower()}{bears_on[1:]}"
        page.put(column, sketch.caption + matters, looks.QUIET_WRAPPED, span=_WIDTH)
    page.next()
    page.kept.append((top, page.row - 1))
    page.gap(6.0)
    return [
        Panel(sketch, Area(first, column, last, column + _WIDTH - 1))
        for column, (_, _, sketch) in zip(columns, sketches, strict=True)
    ]


def write_figures(page: Page, panels: Sequence[Panel]) -> None:
    """The figures behind the charts, at the end of the sheet, and the charts themselves."""
    if not panels:
        return
    page.section("figures", "Figures behind the charts", "The charts show these cells. Not printed.")
    block = FigureBlock(page)
    page.charts += [block.add(panel.sketch, panel.place, CHART_PIXELS) for panel in panels]
    page.row = block.bottom + 1
