"""An xlwings engine over the spreadsheet program in memory, so that real xlwings objects run on it."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from datetime import datetime, timedelta
from decimal import Decimal
from pathlib import Path

import memory_model as model
import xlwings as xw
from memory_native import Get, Missing, Native, NativeName, areas_of
from xlwings import base_classes

ERROR_NUMBERS = {
    "#NULL!": -2146826288, "#DIV/0!": -2146826281, "#VALUE!": -2146826273, "#REF!": -2146826265, "#NAME?": -2146826259,
    "#NUM!": -2146826252, "#N/A": -2146826246,
}
_ERROR_TEXTS = {number: text for text, number in ERROR_NUMBERS.items()}


class Engine:
    name, type = "excel", "desktop"

    def __init__(self, app: model.App):
        self.app = app

    @property
    def apps(self) -> Apps:
        return Apps(self)

    @staticmethod
    def clean_value_data(data, datetime_builder, empty_as, number_builder, err_to_str):
        def clean(value):
            if value in ("", None):
                return empty_as
            if isinstance(value, int) and not isinstance(value, bool) and value in _ERROR_TEXTS:
                return _ERROR_TEXTS[value] if err_to_str else None
            return value

        return [[clean(value) for value in row] for row in data]

    @staticmethod
    def prepare_xl_data_element(value, options):
        return "" if value is None else value


class Apps(base_classes.Apps):
    def __init__(self, engine: Engine):
        self.engine = engine

    def __iter__(self):
        yield App(self.engine)

    def __len__(self):
        return 1


def _of_model(name: str, action: str | None = None) -> property:
    def get(self):
        return getattr(self.model, name)

    def put(self, value):
        self.model.may(action or name)
        if name == "status_bar" and isinstance(value, str):
            self.model.steps.append(value)
        setattr(self.model, name, value)

    return property(get, put)


class App(base_classes.App):
    status_bar, screen_updating = _of_model("status_bar"), _of_model("screen_updating")
    display_alerts, enable_events = _of_model("display_alerts"), _of_model("enable_events")
    pid = 1

    def __init__(self, engine: Engine):
        self._engine, self.model = engine, engine.app

    @property
    def engine(self):
        return self._engine

    @property
    def selection(self):
        book = self.model.active
        if not self.model.selection_is_cells or book.active.is_chart or book.active.selected is None:
            return None
        return Range(self, book.active, areas_of(book.active.selected))

    @property
    def books(self):
        return Books(self)

    def alert(self, prompt, title, buttons, mode, callback):
        # A message that comes while the screen stands still would be the last thing that the user sees.
        assert self.model.screen_updating, "the message came before the screen was let go"
        assert self.model.enable_events
        assert self.model.display_alerts
        self.model.alerts.append((mode, prompt))
        return "ok"


class Books(base_classes.Books):
    def __init__(self, app: App):
        self.app = app

    @property
    def active(self):
        return Book(self.app, self.app.model.active)

    def __iter__(self):
        return (Book(self.app, book) for book in self.app.model.books)

    def __len__(self):
        return len(self.app.model.books)

    def __call__(self, name):
        for book in self.app.model.books:
            if book.name == name:
                return Book(self.app, book)
        raise KeyError(name)

    def open(self, fullname, update_links=None, read_only=None, *others, **more):
        assert read_only, "a file that is only looked at is opened for reading"
        return Book(self.app, self.app.model.open(Path(fullname)))


class Book(base_classes.Book):
    def __init__(self, app: App, book: model.Book):
        self._app, self.model = app, book

    app = property(lambda self: self._app)
    name = property(lambda self: self.model.name)
    sheets = property(lambda self: Sheets(self))

    @property
    def names(self):
        return Names(self, self.model.names)

    @property
    def api(self):
        native = Native(
            Date1904=self.model.date1904, ProtectStructure=self.model.structure_protected,
            ReadOnly=self.model.read_only, Sheets=[Native(Name=sheet.name) for sheet in self.model.sheets],
            date_1904=Get(self.model.date1904), protect_structure=Get(self.model.structure_protected),
            read_only=Get(self.model.read_only),
            sheets=Native(name=Get([sheet.name for sheet in self.model.sheets])),
        )
        return native

    def activate(self):
        self.app.model.active = self.model

    def close(self):
        self.app.model.close(self.model)


class Sheets(base_classes.Sheets):
    def __init__(self, book: Book):
        self.book = book

    @property
    def _worksheets(self):
        return [sheet for sheet in self.book.model.sheets if not sheet.is_chart]

    @property
    def active(self):
        return Sheet(self.book, self.book.model.active)

    def __call__(self, key):
        return Sheet(self.book, self._worksheets[key - 1] if isinstance(key, int) else self.book.model.sheet(key))

    def __len__(self):
        return len(self._worksheets)

    def __contains__(self, name):
        return any(sheet.name == name for sheet in self._worksheets)

    def __iter__(self):
        return (Sheet(self.book, sheet) for sheet in self._worksheets)


class Sheet(base_classes.Sheet):
    def __init__(self, book: Book, sheet: model.Sheet):
        self._book, self.model = book, sheet

    book = property(lambda self: self._book)
    index = property(lambda self: self._book.model.sheets.index(self.model) + 1)

    @property
    def api(self):
        return self.model

    @property
    def name(self):
        return self.model.name

    @name.setter
    def name(self, value):
        model.rename(self.model, value)

    @property
    def names(self):
        return Names(self, self.model.names)

    def range(self, arg1, arg2=None):
        if isinstance(arg1, Range):
            others = [*arg1.areas, *(arg2.areas if arg2 else [])]
            return self._range(min(a[0] for a in others), min(a[1] for a in others),
                               max(a[2] for a in others), max(a[3] for a in others))
        if isinstance(arg1, tuple):
            if len(arg1) == 4:
                row, column, height, width = arg1
                return self._range(row, column, row + height - 1, column + width - 1)
            last = arg1 if arg2 is None else arg2
            return self._range(*arg1, *last)
        return Range(self.book.app, self.model, areas_of(arg1))

    def _range(self, *area):
        return Range(self.book.app, self.model, [area])

    @property
    def cells(self):
        return self._range(1, 1, model.MAX_ROWS, model.MAX_COLUMNS)

    @property
    def used_range(self):
        return self._range(*self.model.used)

    def activate(self):
        self.book.model.active = self.model

    def delete(self):
        model.delete(self.model)

    def copy(self, before, after):
        assert before is None
        model.copy_sheet(self.model, after.model)


class Range(base_classes.Range):
    def __init__(self, app: App, sheet: model.Sheet, areas: list[tuple[int, int, int, int]]):
        self.app, self.model, self.areas = app, sheet, areas
        self.options: dict = {}

    sheet = property(lambda self: Sheet(Book(self.app, self.model.book), self.model))
    row = property(lambda self: self.areas[0][0])
    column = property(lambda self: self.areas[0][1])

    @property
    def shape(self):
        top, left, bottom, right = self.areas[0]
        return bottom - top + 1, right - left + 1

    def __len__(self):
        """A Long in Excel, which a whole sheet is too large for."""
        count = self.shape[0] * self.shape[1]
        if count > 2**31 - 1:
            raise model.ExcelError("Overflow")
        return count

    def __call__(self, row, column):
        place = self.row + row - 1, self.column + column - 1
        return Range(self.app, self.model, [(*place, *place)])

    @property
    def address(self):
        return self.get_address(True, True, False)

    def get_address(self, row_absolute, col_absolute, external):
        assert not external
        r, c = "$" * row_absolute, "$" * col_absolute
        texts = []
        for top, left, bottom, right in self.areas:
            corners = [f"{c}{xw.utils.col_name(column)}{r}{row}" for row, column in ((top, left), (bottom, right))]
            texts.append(":".join(dict.fromkeys(corners)))
        return ",".join(texts)

    def _cells(self) -> Iterator[list[model.Cell]]:
        top, left, bottom, right = self.areas[0]
        for row in range(top, bottom + 1):
            yield [self.model.cell(row, column) for column in range(left, right + 1)]

    def _shaped(self, rows):
        return rows[0][0] if self.shape == (1, 1) else tuple(map(tuple, rows))

    @property
    def raw_value(self):
        """As Range.Value gives it: dates as moments, currency with four decimals, errors as their numbers."""
        return self._shaped([[self._seen(cell) for cell in row] for row in self._cells()])

    @property
    def held(self):
        """As Range.Value2 gives it."""
        return self._shaped([[ERROR_NUMBERS.get(c.value, c.value) if isinstance(c.value, str) else c.value
                              for c in row] for row in self._cells()])

    def _seen(self, cell: model.Cell):
        value = cell.value
        if isinstance(value, str) and value in ERROR_NUMBERS:
            return None if self.app.model.mac else ERROR_NUMBERS[value]
        if isinstance(value, float | int) and not isinstance(value, bool):
            if "yy" in cell.number_format:
                start = datetime(1904, 1, 1) if self.model.book.date1904 else datetime(1899, 12, 30)
                return start + timedelta(milliseconds=round(value * 86_400_000))
            if "$" in cell.number_format and not self.app.model.mac:
                return Decimal(str(round(value, 4)))
            return float(value)
        return value

    @property
    def api(self):
        words = self.app.model.error_words
        shown = self._shaped([["" if c.value is None else words.get(c.value, str(c.value)) for c in row]
                              for row in self._cells()])
        first = self.model.cell(self.row, self.column)
        hidden = self._rows_hidden()
        return Native(
            EntireRow=Native(Hidden=hidden), entire_row=Native(hidden=Get(hidden)),
            Value2=self.held, Areas=Native(Count=len(self.areas)), string_value=Get(shown),
            HasSpill=first.shape == "spill", has_spill=Get(first.shape == "spill"),
            SpillParent=self._spill_parent() if first.shape == "spilled" else Missing(),
        )

    def _rows_hidden(self):
        """True or False for all rows, None for some of them, as Excel's Null; an error where it does not say."""
        if not self.app.model.tells_hidden_rows:
            return Missing()
        top, _, bottom, _ = self.areas[0]
        found = {row in self.model.hidden_rows for row in range(top, bottom + 1)}
        return found.pop() if len(found) == 1 else None

    def _spill_parent(self):
        for row in range(self.row, 0, -1):
            cell = self.model.cell(row, self.column)
            if cell.shape == "spill":
                return Native(Formula=cell.formula)
        raise model.ExcelError("no spill")

    def _texts(self):
        return self._shaped([[c.formula if c.formula is not None else "" if c.value is None else c.value for c in row]
                             for row in self._cells()])

    @property
    def formula(self):
        return self._texts()

    @formula.setter
    def formula(self, value):
        self._enter(value, "")

    @property
    def formula2(self):
        self._require_formula2()
        return self._texts()

    @formula2.setter
    def formula2(self, value):
        self._require_formula2()
        self._enter(value, "spill")

    def _require_formula2(self):
        if not self.app.model.has_formula2:
            raise AttributeError("Range.Formula2")

    def _enter(self, value, shape):
        if self.model.protected:
            raise model.ExcelError("The cell is on a protected sheet")
        cell = self.model.cells.setdefault((self.row, self.column), model.Cell())
        cell.formula, cell.shape = value, shape

    has_array = property(lambda self: self.model.cell(self.row, self.column).shape == "array")

    @property
    def current_region(self):
        return Range(self.app, self.model, [model.region(self.model, self.row, self.column)])

    @property
    def table(self):
        for table in self.model.tables:
            if table.first <= (self.row, self.column) and self.row <= table.last[0] + table.totals \
                    and table.first[1] <= self.column <= table.last[1]:
                return TableImpl(self, table)
        return None

    def get_special_cells(self, cell_type, value_type):
        if self.model.protected:
            raise model.ExcelError("You cannot use this command on a protected sheet")
        top, left, bottom, right = self.areas[0]
        if cell_type == "visible":
            rows = model.runs(row for row in range(top, bottom + 1) if row not in self.model.hidden_rows)
            columns = model.runs(c for c in range(left, right + 1) if c not in self.model.hidden_columns)
            return [Range(self.app, self.model, [(r[0], c[0], r[1], c[1])]) for r in rows for c in columns]
        return [
            Range(self.app, self.model, [(*place, *place)]) for place, cell in sorted(self.model.cells.items())
            if cell.formula is not None and top <= place[0] <= bottom and left <= place[1] <= right
        ]


class TableImpl(base_classes.Table):
    def __init__(self, cell: Range, table: model.Table):
        self.cell, self.table = cell, table

    name = property(lambda self: self.table.name)

    @property
    def header_row_range(self):
        (top, left), (_, right) = self.table.first, self.table.last
        return Range(self.cell.app, self.cell.model, [(top, left, top, right)])

    @property
    def data_body_range(self):
        (top, left), (bottom, right) = self.table.first, self.table.last
        return Range(self.cell.app, self.cell.model, [(top + 1, left, bottom, right)])


class Names(base_classes.Names):
    """The names of a workbook or of one sheet, which Excel gives with the sheet's title before them."""

    def __init__(self, parent: Book | Sheet, names: list[model.Name]):
        self.parent, self._names = parent, names

    def __call__(self, key):
        return Name(self.parent, self._names[key - 1])

    def __len__(self):
        return len(self._names)

    def add(self, name, refers_to):
        if len(refers_to) > 255:
            raise model.ExcelError("RefersTo may have at most 255 characters here")
        made = model.Name(name, refers_to)
        self._names.append(made)
        return Name(self.parent, made)


class Name(base_classes.Name):
    def __init__(self, parent: Book | Sheet, name: model.Name):
        self.parent, self.model = parent, name

    @property
    def api(self):
        return NativeName(self.model)

    @property
    def name(self):
        scope = f"{model._quoted(self.parent.name)}!" if isinstance(self.parent, Sheet) else ""
        return scope + self.model.name

    @property
    def refers_to(self):
        return self.model.refers_to

    @refers_to.setter
    def refers_to(self, value):
        self.model.refers_to = value


@contextmanager
def running_excel(app: model.App) -> Iterator[None]:
    """Within it xlwings finds this program as the Excel that is running, and its active book as the caller."""
    engine = Engine(app)
    kept = xw.engines.active, xw.engines.engines[:], dict(xw.engines.engines_by_name)
    xw.engines.add(xw.Engine(impl=engine))
    xw.engines.active = xw.Engine(impl=engine)
    xw.Book(impl=Book(App(engine), app.active)).set_mock_caller()
    try:
        yield
    finally:
        del xw.Book._mock_caller
        xw.engines.active, xw.engines.engines[:], xw.engines.engines_by_name = kept
