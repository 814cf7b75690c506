"""What a plan is made of. Rows and columns count from 1, as they do on the sheet; nothing here knows a host."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from sheetfuncs.report.style import Style

Value = float | int | str | None


def column_letters(column: int) -> str:
    """1 -> A, 27 -> AA."""
    letters = ""
    while column > 0:
        column, rest = divmod(column - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


def quoted(sheet: str) -> str:
    """A sheet's name as formulas and links write it."""
    return "'" + sheet.replace("'", "''") + "'"


@dataclass(frozen=True)
class Area:
    """A rectangle of this sheet."""

    first_row: int
    first_column: int
    last_row: int
    last_column: int

    @property
    def address(self) -> str:
        """$B$3:$B$9, or $B$3 for a single cell."""
        first = f"${column_letters(self.first_column)}${self.first_row}"
        last = f"${column_letters(self.last_column)}${self.last_row}"
        return first if first == last else f"{first}:{last}"

    @property
    def plain(self) -> str:
        """The address without dollar signs, for formulas in cells."""
        return self.address.replace("$", "")

    def on(self, sheet: str) -> str:
        """The address with a sheet's name before it."""
        return f"{quoted(sheet)}!{self.address}"


@dataclass(frozen=True)
class Cell:
    """One cell, or a merged stretch of a row up to last_column.

    value: what a reader sees without recalculation. formula: without "=", over cells of this sheet only; array says
    that it must be entered as an array formula. link: the target "'Jobs'!A17" of a jump inside the workbook.
    """

    row: int
    column: int
    value: Value
    style: Style
    last_column: int | None = None
    formula: str | None = None
    array: bool = False
    link: str | None = None


@dataclass(frozen=True)
class Column:
    """Numbers or texts one below the other; None leaves a cell empty."""

    row: int
    column: int
    values: tuple[Value, ...]
    style: Style

    @property
    def area(self) -> Area:
        return Area(self.row, self.column, self.row + len(self.values) - 1, self.column)


@dataclass(frozen=True)
class Series:
    """One series of a chart.

    name: the cell that holds it. look: "points", "many points", "flagged", "joined points", "course" (of many values),
    "line", "smooth", "limit", "columns" or "flagged columns". labels: what stands beside each point,
    "" for nothing.
    """

    name: Area
    x: Area
    y: Area
    look: str
    labels: tuple[str, ...] = ()


@dataclass(frozen=True)
class Axis:
    """An axis of a chart. low, high, step: None lets the host choose. text: labels are names, not measures;
    every_label: none of them may be skipped."""

    title: str
    number_format: str = "General"
    low: float | None = None
    high: float | None = None
    step: float | None = None
    text: bool = False
    every_label: bool = False


@dataclass(frozen=True)
class Chart:
    """A native chart over cells of the same sheet. kind: "scatter", "columns" or "bars"."""

    kind: str
    place: Area
    title: str
    series: tuple[Series, ...]
    x: Axis
    y: Axis
    description: str
    height: int


@dataclass(frozen=True)
class Choice:
    """A list that the host offers for a cell; other entries stay allowed."""

    row: int
    column: int
    options: tuple[str, ...]


@dataclass(frozen=True)
class SheetPlan:
    """One sheet, complete. widths: pixels by column; heights: points by row. names: sheet-scoped defined names with
    the formulas behind them. print_rows: how many rows go on paper; breaks: rows after which a new page begins."""

    title: str
    cells: tuple[Cell, ...]
    columns: tuple[Column, ...]
    charts: tuple[Chart, ...]
    choices: tuple[Choice, ...]
    widths: Mapping[int, float]
    heights: Mapping[int, float]
    names: Mapping[str, str]
    settings: Mapping[str, Any]
    last_column: int
    print_rows: int
    breaks: tuple[int, ...] = ()
    frozen_rows: int = 0
    footer: str = ""
    description: Mapping[str, str] = field(default_factory=dict)
