"""Run in a process of its own: every call of the contract through xlwings' real server; the answers as JSON."""

from __future__ import annotations

import io
import json
import sys
from types import SimpleNamespace

import windows_stubs
from contract_cases import Argument, Array, Cell, Currency, Date, Error, Missing, Range, cases

from sheetfuncs.functions.registry import REGISTRY

MODULE = "sheetfuncs.hosts.excel.functions"
SHEET_ROWS = 1_048_576
# XlCVError of Excel's own type library, as signed 32-bit SCODEs; the last two from memory.
ERROR_NUMBERS = {
    "#NULL!": -2146826288, "#DIV/0!": -2146826281, "#VALUE!": -2146826273, "#REF!": -2146826265, "#NAME?": -2146826259,
    "#NUM!": -2146826252, "#N/A": -2146826246, "#SPILL!": -2146826243, "#CALC!": -2146826238,
}


class NativeRange:
    """A range as pywin32 gives it, of a sheet that holds nothing else."""

    def __init__(self, rows, height=None, parts=1):
        self.rows, self.height = rows, height or len(rows)
        self.Row = self.Column = 1
        self.Rows, self.Columns = SimpleNamespace(Count=self.height), SimpleNamespace(Count=len(rows[0]))
        self.Areas = SimpleNamespace(Count=parts)
        self._oleobj_ = windows_stubs.ComObject(self)

    @property
    def Worksheet(self):
        return NativeSheet(self)

    @property
    def Value(self):
        return self._shaped(in_array=True)

    @property
    def Value2(self):
        return self._shaped(in_array=False)

    def _shaped(self, in_array):
        assert self.height == len(self.rows), "a whole column was read to its end"
        sent = tuple(tuple(sent_cell(cell, in_array=in_array) for cell in row) for row in self.rows)
        return sent[0][0] if len(sent) == len(sent[0]) == 1 else sent


class NativeSheet:
    Parent = SimpleNamespace(Name="Invented jobs.xlsx", Application=SimpleNamespace(Hwnd=7))

    def __init__(self, cells):
        self.cells = cells
        self.Cells = AllCells(self)

    @property
    def UsedRange(self):
        return NativeRange(self.cells.rows)

    def Range(self, first, last):
        assert first == (1, 1)
        return NativeRange(self.cells.rows[: last[0]])


class AllCells:
    """Worksheet.Cells; called, the place of one cell."""

    Row = Column = 1
    Rows, Columns = SimpleNamespace(Count=SHEET_ROWS), SimpleNamespace(Count=16_384)

    def __init__(self, sheet):
        self.Worksheet = sheet

    def __call__(self, row, column):
        return row, column


def sent_cell(cell: Cell, *, in_array: bool) -> object:
    if isinstance(cell, Error):
        return ERROR_NUMBERS[cell.text]
    if isinstance(cell, Currency):
        return cell.rounded if in_array else cell.held
    if isinstance(cell, Date):
        return cell.moment if in_array else cell.held
    return cell


def sent(argument: Argument) -> object:
    """The argument as it reaches the server."""
    if isinstance(argument, Missing):
        return windows_stubs.MISSING
    if isinstance(argument, Range):
        height = SHEET_ROWS if argument.whole else None
        return windows_stubs.ComObject(NativeRange(argument.rows, height, argument.parts))
    if isinstance(argument, Array):
        rows = tuple(tuple(sent_cell(cell, in_array=True) for cell in row) for row in argument.rows)
        return rows[0] if len(rows) == 1 else rows
    return sent_cell(argument.value, in_array=True)


def wrappers(xlwings) -> str:
    """What xlwings itself would write as VBA for the module."""
    import importlib

    text = io.StringIO()
    book = SimpleNamespace(Name="sheetfuncs.xlam")
    xlwings.udfs.generate_vba_wrapper(MODULE, importlib.import_module(MODULE), text, book)
    return text.getvalue()


def help_texts() -> dict[str, object]:
    import importlib

    module = importlib.import_module(MODULE)
    return {
        name: {
            "category": (info := getattr(module, name).__xlfunc__)["category"], "doc": info["ret"]["doc"],
            "arguments": [[one["name"], one["doc"], "optional" in one, one["options"].get("ndim"),
                           one["options"].get("err_to_str")] for one in info["args"]],
        }
        for name in REGISTRY
    }


def macro_runs(xlwings) -> str:
    """As the add-in's VBA starts a macro: the workbook is handed over, then one statement is run."""
    import sheetfuncs.hosts.excel.macros as macros

    seen = []
    macros._run = lambda job: seen.append((xlwings.Book.caller().name, job.__name__))
    server = xlwings.com_server.XLPython()
    book = windows_stubs.ComObject(SimpleNamespace(Name="Invented jobs.xlsx"))
    server.SetAttr(xlwings._xlwindows, "BOOK_CALLER", book)
    for name in macros.MACROS:
        server.Exec(f"import sheetfuncs.hosts.excel.macros; sheetfuncs.hosts.excel.macros.{name}()")
    return json.dumps(seen)


def main() -> None:
    xlwings = windows_stubs.load_xlwings()
    # At its end Python would end every Excel without a window, also those of other programs. This would be seen.
    xlwings._xlwindows.Apps.cleanup = staticmethod(lambda: print("Other Excels were looked for."))
    server = xlwings.com_server.XLPython()
    answers = {
        name: {title: server.CallUDF(MODULE, name, tuple(map(sent, given))) for title, given in cases(name)}
        for name in REGISTRY
    }
    json.dump({
        "answers": answers, "wrappers": wrappers(xlwings), "help": help_texts(), "macros": macro_runs(xlwings),
        "pro": [name for name in sys.modules if name == "xlwings.pro"], "licensed": bool(xlwings.__pro__),
    }, sys.stdout, allow_nan=False)


if __name__ == "__main__":
    main()
