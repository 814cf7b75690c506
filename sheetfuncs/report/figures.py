"""The figures behind the charts: columns at the end of the sheet, each under its name, and the charts over them."""

from __future__ import annotations

import math

from sheetfuncs.report import style as looks
from sheetfuncs.report.elements import Area, Chart, Column, Series, Value
from sheetfuncs.report.formats import column_format
from sheetfuncs.report.layout import FIRST, Page
from sheetfuncs.report.sketch import Figures, Sketch


class FigureBlock:
    """Sketches side by side, an empty column between two; each begins with a line that says which chart it serves."""

    def __init__(self, page: Page):
        self.page = page
        self.top = page.row
        self.column = FIRST
        self.bottom = page.row + 1

    def add(self, sketch: Sketch, place: Area, height: int) -> Chart:
        """Write a sketch's figures and return the chart that shows them at its place."""
        if self.column > FIRST:
            self.column += 1
        with self.page.at(self.top):
            self.page.put(self.column, sketch.question, looks.QUIET_TEXT.but(bold=True))
        areas = [self._write(figures) for figures in sketch.figures]
        series = tuple(
            Series(areas[line.y][0], areas[line.x][1], areas[line.y][1], line.look, line.labels)
            for line in sketch.lines
        )
        return Chart(
            sketch.kind, place, sketch.question, series, sketch.x, sketch.y,
            f"{sketch.question} {sketch.caption}", height,
        )

    def _write(self, figures: Figures) -> tuple[Area, Area]:
        """The cell of the name, and the cells of the figures below it."""
        row = self.top + 1
        with self.page.at(row):
            head = looks.COLUMN_HEAD if figures.kind == "text" else looks.COLUMN_HEAD_RIGHT
            self.page.put(self.column, figures.name, head.but(wrap=False))
        column = Column(row + 1, self.column, tuple(_kept(v) for v in figures.values), _look(figures))
        self.page.columns.append(column)
        self.column += 1
        self.bottom = max(self.bottom, column.area.last_row)
        return Area(row, column.column, row, column.column), column.area


def _kept(value: float | int | str) -> Value:
    """An empty cell in place of a number that no cell holds: charts leave a gap there."""
    return None if isinstance(value, float) and not math.isfinite(value) else value


def _look(figures: Figures) -> looks.Style:
    if figures.kind == "text":
        return looks.QUIET_TEXT
    if figures.kind == "count":
        return looks.QUIET_NUMBER.but(number_format="0")
    return looks.QUIET_NUMBER.but(number_format=column_format([float(v) for v in figures.values]))
