"""The grid of the sheet and a cursor that fills it from top to bottom, setting row heights as texts ask for."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass

from sheetfuncs.report import style as looks
from sheetfuncs.report.elements import Area, Cell, Chart, Choice, Column, Value, quoted
from sheetfuncs.report.style import Style
from sheetfuncs.report.text import line_count, text_width

# Fourteen equal columns between two margins: 1,180 pixels, which a screen of 1,280 shows beside its row numbers.
FIRST, COUNT = 2, 14
LAST = FIRST + COUNT - 1
COLUMN_PIXELS, MARGIN_PIXELS = 82.0, 16.0
ROW_POINTS = 15.0
_LINE, _PADDING = 1.27, 2.6
_CELL_PADDING = 10.0
_INDENT = 9.0
MISSING = "–"
# A heading, its note, a gap, column labels and two lines of the table stay on one printed page.
_TOGETHER = 7


@dataclass(frozen=True)
class Head:
    """One column of a table: where it stands, how many grid columns it takes, its label, and its side."""

    column: int
    span: int
    label: str
    right: bool = False


class Page:
    """Collects the parts of a plan. `row` is the next row to write on."""

    def __init__(self, title: str):
        self.title = title
        self.row = 1
        self.least = ROW_POINTS
        self.cells: list[Cell] = []
        self.columns: list[Column] = []
        self.charts: list[Chart] = []
        self.choices: list[Choice] = []
        self.heights: dict[int, float] = {}
        self.names: dict[str, str] = {}
        self.anchors: dict[str, int] = {}
        self.kept: list[tuple[int, int]] = []

    def put(
        self, column: int, value: Value, style: Style = looks.TEXT, *, span: int = 1, formula: str | None = None,
        array: bool = False, link: str | None = None,
    ) -> Cell:
        """A cell on the current row, over `span` grid columns; wrapped text makes the row as high as it needs."""
        last_column = column + span - 1 if span > 1 else None
        cell = Cell(self.row, column, None if value == "" else value, style, last_column, formula, array, link)
        self.cells.append(cell)
        if isinstance(value, str):
            self.ask_height(self._height_of(value, span, style))
        return cell

    def number(self, column: int, value: float | None, number_format: str, style: Style = looks.NUMBER) -> None:
        """A number, right-aligned; a dash where there is none."""
        if value is None or not math.isfinite(value):
            self.put(column, MISSING, style.but(colour=looks.QUIET))
        else:
            self.put(column, float(value), style.but(number_format=number_format))

    def next(self, rows: int = 1) -> None:
        self.row += rows

    def gap(self, points: float = 8.0) -> None:
        """An empty row of this height."""
        self.heights[self.row] = points
        self.row += 1

    def ask_height(self, points: float) -> None:
        """Make the current row at least so high."""
        self.heights[self.row] = max(self.heights.get(self.row, self.least), points)

    def section(self, anchor: str, title: str, note: str = "") -> None:
        """Heading of a section, with a quiet sentence under it."""
        if self.kept and self.kept[-1][1] >= self.row:
            self.kept[-1] = (self.kept[-1][0], self.row - 1)
        self.kept.append((self.row, self.row + _TOGETHER))
        self.gap(16.0)
        self.anchors[anchor] = self.row
        self.put(FIRST, title, looks.HEADING.but(below=looks.HAIRLINE), span=COUNT)
        self.ask_height(20.0)
        self.next()
        if note:
            self.put(FIRST, note, looks.QUIET_WRAPPED, span=COUNT)
            self.next()
        self.gap(3.0)

    def subheading(self, title: str) -> None:
        self.kept.append((self.row, self.row + _TOGETHER - 1))
        self.gap(6.0)
        self.put(FIRST, title, looks.STRONG, span=COUNT)
        self.next()

    def table_head(self, heads: Sequence[Head]) -> None:
        """Column labels with a line under the whole table."""
        covered: set[int] = set()
        for head in heads:
            look = looks.COLUMN_HEAD_RIGHT if head.right else looks.COLUMN_HEAD
            beside = not head.right and head.column > heads[0].column
            self.put(head.column, head.label, look.but(indent=int(beside)), span=head.span)
            covered.update(range(head.column, head.column + head.span))
        first, last = min(covered), max(covered)
        for column in range(first, last + 1):
            if column not in covered:
                self.put(column, None, looks.COLUMN_HEAD)
        self.next()
        self.gap(2.0)

    def labelled(self, label: str, text: str, *, label_span: int = 3, style: Style = looks.WRAPPED) -> None:
        """A quiet label and a text beside it, on a row of their own."""
        self.put(FIRST, label, looks.QUIET_TEXT, span=label_span)
        self.put(FIRST + label_span, text, style, span=COUNT - label_span)
        self.next()

    def here(self, column: int) -> str:
        """A jump to a cell of this sheet on the current row."""
        return f"{quoted(self.title)}!{Area(self.row, column, self.row, column).plain}"

    @contextmanager
    def at(self, row: int) -> Iterator[None]:
        """Write on rows that were kept free above."""
        kept, self.row = self.row, row
        yield
        self.row = kept

    def _height_of(self, text: str, span: int, style: Style) -> float:
        line = style.size * _LINE
        if not style.wrap:
            return line + _PADDING
        width = span * COLUMN_PIXELS - _CELL_PADDING - style.indent * _INDENT
        return line_count(text, width, style.size, style.bold) * line + _PADDING


def fits(text: str, span: int, style: Style) -> bool:
    """Whether a text stands on one line of so many grid columns."""
    return text_width(text, style.size, style.bold) <= span * COLUMN_PIXELS - _CELL_PADDING
