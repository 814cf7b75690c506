"""The orders of `order_hours` once more, with every worksheet function of ours typed into a cell beside them."""

from collections.abc import Callable, Sequence
from io import BytesIO
from pathlib import Path
from typing import Any

from xlsxwriter.worksheet import Worksheet

from sheetfuncs.functions.evaluate import evaluate
from sheetfuncs.functions.registry import REGISTRY, WorksheetFunction

from .order_hours import FIRST, LAST, Order, draw_orders
from .sheets import Book
from .without_recalculation import as_saved_by_excel

FILE = "order-hours-functions.xlsm"
HEADERS = ["Work time (h)", "Panel area (m²)", "Glaze colours", "Cut pieces"]
QUOTED = [(8.0, 3, 20), (20.0, 5, 40)]  # area, colours, cut pieces of two panels to quote
HOURS, SIZES, QUOTES = "Hours", "Sizes", "Quotes"  # defined names

NOTES = [
    ("Purpose", "The functions that the add-in of sheetfuncs brings to Excel, each in a cell that you can copy."),
    ("Orders", "One row an order, and beside it what the regression says about each row. Rows with a gap show #N/A."),
    ("Figures", "Functions that give one figure or one sentence."),
    ("Tables", "Functions that give several cells. The two panels to quote are typed in there; change them."),
    ("Rows", "All measures of each row side by side."),
    ("With the add-in", "Change a number on the sheet Orders, and what hangs on it is computed anew. Hours, Sizes and "
     "Quotes are names of cell ranges: Formulas, Name Manager shows where they lie."),
    ("Without it", "The values stand as they were stored. A cell that is computed anew shows #NAME?, because this "
     "Excel does not know the function; close without saving, and the values are there again."),
]  # fmt: skip

# What stands for the arguments that a function cannot do without.
_GIVEN = {"response": HOURS, "predictors": SIZES, "at": QUOTES, "row_count": "66", "predictor_count": "3"}
BESIDE_ROWS = ("FIT_FITTED", "FIT_RESIDUALS", "FIT_NORMAL_SCORES", "FIT_LEVERAGE", "FIT_COOKS_DISTANCE", "FIT_DFFITS")
Cells = list[list[Any]]


def formula_of(function: WorksheetFunction) -> str:
    """The shortest call: "=FIT_VIF(Sizes)"."""
    needed = [_GIVEN[argument.name] for argument in function.arguments if not argument.optional]
    return f"={function.name}({', '.join(needed)})"


def write(folder: Path) -> Path:
    path = folder / FILE
    file = BytesIO()
    book = Book(file, "Panels to order: hours, with functions")
    orders = draw_orders()
    value = _values(orders)
    book.notes("Panels to order: hours, with functions", NOTES)
    _write_orders(book, orders, value)
    _write_figures(book, value)
    _write_tables(book, value)
    _write_rows(book, value)
    book.close()
    path.write_bytes(as_saved_by_excel(file.getvalue()))
    return path


def _values(orders: list[Order]) -> Callable[[WorksheetFunction], Any]:
    """What each function gives for these orders: a value, or a list of rows."""
    rows: Cells = [[order.hours, order.area, "#N/A" if order.colours_unknown else order.colours, order.pieces]
                   for order in orders]  # fmt: skip
    blocks = {
        HOURS: [[HEADERS[0]], *([row[0]] for row in rows)], SIZES: [HEADERS[1:], *(row[1:] for row in rows)],
        QUOTES: [list(row) for row in QUOTED],
    }

    def value(function: WorksheetFunction) -> Any:
        needed = [_GIVEN[argument.name] for argument in function.arguments if not argument.optional]
        return evaluate(function.name, *(blocks[word] if word in blocks else float(word) for word in needed))

    return value


def _write_orders(book: Book, orders: list[Order], value: Callable[[WorksheetFunction], Any]) -> None:
    widths = [2, 9, 1.5, 13, 13, 12, 10, 1.5, *[14] * len(BESIDE_ROWS)]
    sheet = book.sheet("Orders", "Tile panels made to order, and what the regression says of each", widths, wide=True)
    book.headers(sheet, "B4", [("Order", "text")])
    book.headers(sheet, "D4", [(header, "tenth") for header in HEADERS])
    for row, order in enumerate(orders, start=FIRST):
        sheet.write(f"B{row}", f"P {118 + row - FIRST}")
        for column, cell, style in zip("DEFG", (order.hours, order.area, order.colours, order.pieces),
                                       ("tenth", "tenth", "whole", "whole"), strict=True):  # fmt: skip
            if cell is not None:
                sheet.write_number(f"{column}{row}", cell, book.format(style))
        if order.colours_unknown:
            sheet.write_formula(f"F{row}", "=NA()", book.format("whole"), "#N/A")
    book.file.define_name(HOURS, f"=Orders!$D$4:$D${LAST}")
    book.file.define_name(SIZES, f"=Orders!$E$4:$G${LAST}")
    for place, name in enumerate(BESIDE_ROWS):
        function = REGISTRY[name]
        _array(book, sheet, 3, 8 + place, function, value(function), headed=True)
    book.data_page(sheet, "AN", LAST)


def _write_figures(book: Book, value: Callable[[WorksheetFunction], Any]) -> None:
    sheet = book.sheet("Figures", "One figure or one sentence each", [2, 18, 14, 42, 84], wide=True)
    columns = [("Subject", "text"), ("Value", "tenth"), ("What stands in the cell", "indented"),
               ("What it gives", "text")]  # fmt: skip
    book.headers(sheet, "B4", columns)
    row = 5
    for function in _returning("number"):
        sheet.write_formula(f"C{row}", formula_of(function), book.format("figure"), value(function))
        _explain(book, sheet, row, function)
        row += 1
    for function in _returning("text"):
        _explain(book, sheet, row, function)
        sheet.merge_range(f"C{row + 1}:E{row + 1}", "", book.format("prose"))
        sheet.write_formula(f"C{row + 1}", formula_of(function), book.format("prose"), value(function))
        sheet.set_row(row, 45)
        row += 2


def _explain(book: Book, sheet: Worksheet, row: int, function: WorksheetFunction) -> None:
    sheet.write(f"B{row}", function.group, book.format("label"))
    sheet.write_string(f"D{row}", formula_of(function), book.format("call"))
    sheet.write_string(f"E{row}", function.summary, book.format("prose"))
    sheet.set_row(row - 1, 45 if len(function.summary) > 170 else 30)


def _write_tables(book: Book, value: Callable[[WorksheetFunction], Any]) -> None:
    sheet = book.sheet("Tables", "Several cells each", [2, 20, *[16] * 7], wide=True)
    book.headers(sheet, "B4", [("Panels to quote", "text"), *((header, "tenth") for header in HEADERS[1:])])
    for row, panel in enumerate(QUOTED, start=5):
        sheet.write(f"B{row}", f"Panel {row - 4}")
        for column, cell in zip("CDE", panel, strict=True):
            sheet.write_number(f"{column}{row}", cell, book.format("input_tenth"))
    book.file.define_name(QUOTES, f"=Tables!$C$5:$E${4 + len(QUOTED)}")
    row = 7 + len(QUOTED)
    for function in _returning("table", "column"):
        if function.name not in (*BESIDE_ROWS, "FIT_ROWS"):
            cells = value(function)
            sheet.write_string(row, 1, formula_of(function), book.format("title_line"))
            for place, column in enumerate(function.columns):
                texts = isinstance(cells[0][place], str)
                sheet.write(row + 1, 1 + place, column, book.format("quiet" if texts else "quiet_right"))
            _array(book, sheet, row + 2, 1, function, cells)
            row += len(cells) + 4


def _write_rows(book: Book, value: Callable[[WorksheetFunction], Any]) -> None:
    function = REGISTRY["FIT_ROWS"]
    cells = value(function)
    sheet = book.sheet("Rows", "All measures of each row", [2, *[15] * len(cells[0])], wide=True)
    _array(book, sheet, 3, 1, function, cells, headed=True)
    sheet.freeze_panes(4, 0)


def _returning(*kinds: str) -> Sequence[WorksheetFunction]:
    return [function for function in REGISTRY.values() if function.returns in kinds]


def _array(
    book: Book, sheet: Worksheet, row: int, column: int, function: WorksheetFunction, cells: Cells, *,
    headed: bool = False,
) -> None:  # fmt: skip
    """One formula over several cells, as every version of Excel knows it, with the value of each cell."""
    last_row, last_column = row + len(cells) - 1, column + len(cells[0]) - 1
    for down, line in enumerate(cells):
        for across, cell in enumerate(line):
            words = "text" if isinstance(cell, str) and not cell.startswith("#") else "row_figure"
            style = book.format("header_right" if headed and down == 0 else words)
            if (down, across) == (0, 0):
                sheet.write_array_formula(row, column, last_row, last_column, formula_of(function), style, cell)
            elif isinstance(cell, str):
                sheet.write_string(row + down, column + across, cell, style)
            elif cell is not None:
                sheet.write_number(row + down, column + across, cell, style)
    if headed:
        sheet.set_row(row, 33)
