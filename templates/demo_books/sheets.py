"""What the three workbooks share: the firm, its cell formats, the notes sheet and the page set-up."""

import datetime
import math
from collections.abc import Sequence
from pathlib import Path
from typing import Any, BinaryIO

import xlsxwriter
from xlsxwriter.format import Format
from xlsxwriter.utility import xl_cell_to_rowcol
from xlsxwriter.worksheet import Worksheet

FIRM = "Umberlow Tile Works, Nether Quibble"
MARK = "Invented data for demonstration"
CREATED = datetime.datetime(2024, 1, 1, 8, 0, 0)

CLAY, SAND, MIST, SLATE = "#7A4A33", "#FBF1DF", "#D9D2C9", "#5C5650"

_HEADER = {"bold": True, "font_color": "#FFFFFF", "bg_color": CLAY, "text_wrap": True, "valign": "vcenter"}
_INPUT = {"bg_color": SAND, "border": 1, "border_color": MIST}
_TOTAL = {"bold": True, "top": 1, "top_color": CLAY}
_FORMATS: dict[str, dict[str, Any]] = {
    "title": {"bold": True, "font_size": 16, "font_color": CLAY},
    "mark": {"bold": True, "font_size": 12, "bg_color": SAND, "border": 1, "border_color": CLAY, "align": "center"},
    "quiet": {"font_color": SLATE, "italic": True},
    "quiet_right": {"font_color": SLATE, "italic": True, "align": "right"},
    "unit": {"font_color": SLATE, "italic": True, "indent": 1},
    "section": {"bold": True, "font_size": 12, "font_color": CLAY, "bottom": 1, "bottom_color": CLAY},
    "header": _HEADER,
    "header_indented": _HEADER | {"align": "left", "indent": 1},
    "header_right": _HEADER | {"align": "right"},
    "label": {"bold": True, "valign": "top"},
    "prose": {"text_wrap": True, "valign": "top"},
    "text": {},
    "indented": {"indent": 1},
    "right": {"align": "right"},
    "whole": {"num_format": "#,##0"},
    "tenth": {"num_format": "#,##0.0"},
    "hundredth": {"num_format": "#,##0.00"},
    "figure": {"num_format": "[>=0.00005]0.0000;[<=-0.00005]-0.0000;0.0E+00", "align": "right", "valign": "top"},
    "row_figure": {"num_format": "[>=0.00005]0.0000;[<=-0.00005]-0.0000;0.0E+00", "align": "right"},
    "call": {"align": "left", "indent": 1, "valign": "top"},
    "title_line": {"bold": True, "font_color": CLAY},
    "price": {"num_format": "€ 0.000"},
    "money": {"num_format": "€ #,##0"},
    "date": {"num_format": "d mmm yyyy", "align": "left"},
    "input_whole": _INPUT | {"num_format": "#,##0"},
    "input_tenth": _INPUT | {"num_format": "#,##0.0"},
    "input_text": _INPUT | {"align": "right"},
    "total_text": _TOTAL,
    "total_whole": _TOTAL | {"num_format": "#,##0"},
    "total_tenth": _TOTAL | {"num_format": "#,##0.0"},
    "total_money": _TOTAL | {"num_format": "€ #,##0"},
    "mark_high": {"bg_color": "#F6D9C6"},
    "mark_empty": {"bg_color": "#ECE7E1"},
}

# a column: its header and the format of its cells
Column = tuple[str, str]
# a formula cell: its address, the formula, its format, and the value that a reader without a spreadsheet sees
FormulaCell = tuple[str, str, str, float | str]


class Book:
    """One workbook being written, with the firm's formats at hand by name.

    Row heights are whole steps of 0.75 points and conditional formats are added in the order of their cells, because
    versions of XlsxWriter treat other heights and orders differently and the file would not come out the same.
    """

    def __init__(self, path: Path | BinaryIO, title: str) -> None:
        # In memory every zip entry gets the same fixed time stamp; a temporary folder would add its own.
        self.file = xlsxwriter.Workbook(str(path) if isinstance(path, Path) else path, {"in_memory": True})
        self.file.set_properties({"title": title, "comments": MARK, "company": FIRM, "created": CREATED})
        self.file.set_size(24000, 14000)
        self._formats: dict[str, Format] = {}

    def format(self, name: str) -> Format:
        if name not in self._formats:
            self._formats[name] = self.file.add_format(_FORMATS[name])
        return self._formats[name]

    def sheet(self, name: str, title: str, widths: Sequence[float], *, wide: bool = False) -> Worksheet:
        """A new sheet with its title in B2, column widths from A on, and a page that prints on A4."""
        sheet = self.file.add_worksheet(name)
        for column, width in enumerate(widths):
            sheet.set_column(column, column, width)
        sheet.write("B2", title, self.format("title"))
        sheet.set_row(1, 24)
        sheet.hide_gridlines(2)
        sheet.set_paper(9)
        sheet.set_margins(left=0.5, right=0.5, top=0.6, bottom=0.7)
        sheet.fit_to_pages(1, 0)
        sheet.set_footer(f"&L{MARK}&C&A&RPage &P of &N")
        if wide:
            sheet.set_landscape()
        return sheet

    def header_format(self, style: str) -> Format:
        """Headers stand over their column: to the left above words and dates, to the right above numbers."""
        names = {"text": "header", "date": "header", "indented": "header_indented"}
        return self.format(names.get(style, "header_right"))

    def headers(self, sheet: Worksheet, address: str, columns: Sequence[Column]) -> None:
        row, column = xl_cell_to_rowcol(address)
        sheet.set_row(row, 33)
        for i, (name, style) in enumerate(columns):
            sheet.write(row, column + i, name, self.header_format(style))

    def table(
        self, sheet: Worksheet, area: str, name: str, columns: Sequence[Column], data: Sequence[Any] = (),
        *, filters: bool = False,
    ) -> None:  # fmt: skip
        """An Excel table over `area`; `data` holds one sequence per row, or nothing when cells are written later."""
        described = [
            {"header": header, "header_format": self.header_format(style), "format": self.format(style)}
            for header, style in columns
        ]
        options = {"name": name, "style": "Table Style Light 1", "autofilter": filters, "columns": described}
        if data:
            options["data"] = data
        if sheet.add_table(area, options) != 0:
            raise ValueError(f"the table {name} could not be written at {area}")

    def formulas(self, sheet: Worksheet, cells: Sequence[FormulaCell]) -> None:
        for address, formula, style, value in cells:
            sheet.write_formula(address, formula, self.format(style), value)

    def totals(self, sheet: Worksheet, first: int, last: int, label: str, sums: dict[str, tuple[str, float]]) -> None:
        """A line of sums below the rows `first` to `last`; `sums` gives format and value of each summed column."""
        row = last + 1
        end = max(sums)
        for code in range(ord("B"), ord(end) + 1):
            sheet.write(f"{chr(code)}{row}", label if chr(code) == "B" else "", self.format("total_text"))
        for column, (style, value) in sums.items():
            formula = f"=SUM({column}{first}:{column}{last})"
            sheet.write_formula(f"{column}{row}", formula, self.format(f"total_{style}"), value)

    def section(self, sheet: Worksheet, row: int, label: str) -> None:
        """A heading line across columns B to D."""
        for column in "BCD":
            sheet.write(f"{column}{row}", label if column == "B" else "", self.format("section"))

    def data_page(self, sheet: Worksheet, columns: str, last: int) -> None:
        """The data sheet of a book: opens here, header in sight while scrolling and on every printed page."""
        sheet.freeze_panes(4, 2)
        sheet.repeat_rows(3)
        sheet.print_area(f"{columns[0]}1:{columns[1]}{last}")
        sheet.activate()

    def notes(self, title: str, entries: Sequence[tuple[str, str]]) -> None:
        """The first sheet: the mark that everything is invented, then a label and a sentence or two per line."""
        sheet = self.sheet("Notes", title, [2, 20, 84])
        sheet.merge_range("B4:C4", MARK, self.format("mark"))
        sheet.set_row(3, 21.75)
        firm = ("Firm", f"{FIRM}: there is no such firm, place or product. No figure here was measured.")
        for i, (label, text) in enumerate([firm, *entries]):
            sheet.write(5 + i, 1, label, self.format("label"))
            sheet.write(5 + i, 2, text, self.format("prose"))
            sheet.set_row(5 + i, 15 * math.ceil(len(text) / 86) + 6)  # a line holds about 88 characters

    def close(self) -> None:
        self.file.close()
