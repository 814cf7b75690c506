"""The spreadsheet program in memory with the names and habits of Excel's COM objects, for xlwings' Windows side."""

from __future__ import annotations

from pathlib import Path

import memory_engine as engine
import memory_model as model
from memory_native import areas_of
from pywintypes import com_error  # a stub

VISIBLE, FORMULAS = 12, -4123  # XlCellType
LARGEST_COUNT = 2**31 - 1
OWN = {
    "ScreenUpdating": "screen_updating", "DisplayAlerts": "display_alerts", "EnableEvents": "enable_events",
    "StatusBar": "status_bar",
}


class Application:
    def __init__(self, app: model.App):
        object.__setattr__(self, "model", app)

    Hwnd = 7

    def __getattr__(self, name):
        return getattr(self.model, OWN[name])

    def __setattr__(self, name, value):
        if name == "StatusBar" and isinstance(value, str):
            self.model.steps.append(value)
        setattr(self.model, OWN[name], value)

    @property
    def Selection(self):
        book = self.model.active
        if not self.model.selection_is_cells:
            raise com_error("Selection has no Address")
        return Range(book.active, areas_of(book.active.selected))

    @property
    def Workbooks(self):
        return Workbooks(self.model)

    def Intersect(self, one, other):
        return one


class Workbooks:
    def __init__(self, app):
        self.model = app

    def __call__(self, name):
        for book in self.model.books:
            if book.name == name:
                return Workbook(book)
        raise com_error(f"Subscript out of range: {name}")

    def Open(self, path, update_links, read_only, *others):
        assert (update_links, read_only) == (False, True)
        return Workbook(self.model.open(Path(path)))


class Workbook:
    def __init__(self, book):
        self.model = book

    Name = property(lambda self: self.model.name)
    Application = property(lambda self: Application(self.model.app))
    Worksheets = property(lambda self: Worksheets(self))
    Sheets = property(lambda self: [Worksheet(sheet) for sheet in self.model.sheets])
    Names = property(lambda self: Names(self.model.names, ""))
    ActiveSheet = property(lambda self: Worksheet(self.model.active))
    ProtectStructure = property(lambda self: self.model.structure_protected)
    ReadOnly = property(lambda self: self.model.read_only)
    Date1904 = property(lambda self: self.model.date1904)

    def Activate(self):
        self.model.app.active = self.model

    def Close(self, SaveChanges):
        assert SaveChanges is False
        self.model.app.close(self.model)


class Worksheets:
    def __init__(self, book):
        self.Parent = book

    @property
    def _all(self):
        return [Worksheet(sheet) for sheet in self.Parent.model.sheets if not sheet.is_chart]

    Count = property(lambda self: len(self._all))

    def __iter__(self):
        return iter(self._all)

    def __call__(self, key):
        return self._all[key - 1] if isinstance(key, int) else Worksheet(self.Parent.model.sheet(key))


class Worksheet:
    def __init__(self, sheet):
        self.model = sheet

    @property
    def Name(self):
        return self.model.name

    @Name.setter
    def Name(self, title):
        model.rename(self.model, title)

    Parent = property(lambda self: Workbook(self.model.book))
    Names = property(lambda self: Names(self.model.names, model._quoted(self.model.name) + "!"))
    Index = property(lambda self: self.model.book.sheets.index(self.model) + 1)
    UsedRange = property(lambda self: Range(self.model, [self.model.used]))
    Cells = property(lambda self: Range(self.model, [(1, 1, model.MAX_ROWS, model.MAX_COLUMNS)]))

    def Range(self, first, last=None):
        if isinstance(first, str):
            return Range(self.model, areas_of(first))
        a, b = first.areas[0], (last or first).areas[0]
        return Range(self.model, [(min(a[0], b[0]), min(a[1], b[1]), max(a[2], b[2]), max(a[3], b[3]))])

    def Activate(self):
        self.model.book.active = self.model

    def Delete(self):
        model.delete(self.model)

    def Copy(self, Before, After):
        assert Before is None
        model.copy_sheet(self.model, After.model)


class Range:
    """What the engine's range knows, under COM's names."""

    def __init__(self, sheet, areas):
        self.sheet, self.areas = sheet, areas
        self.inner = engine.Range(engine.App(engine.Engine(sheet.book.app)), sheet, areas)

    Worksheet = property(lambda self: Worksheet(self.sheet))
    Application = property(lambda self: Application(self.sheet.book.app))
    Row = property(lambda self: self.inner.row)
    Column = property(lambda self: self.inner.column)
    Rows = property(lambda self: _Count(self.inner.shape[0]))
    Columns = property(lambda self: _Count(self.inner.shape[1]))
    Address = property(lambda self: self.inner.address)
    Value = property(lambda self: self.inner.raw_value)
    Value2 = property(lambda self: self.inner.held)
    HasArray = property(lambda self: self.inner.has_array)
    HasSpill = property(lambda self: self.inner.api.HasSpill)
    SpillParent = property(lambda self: self.inner.api.SpillParent)
    EntireRow = property(lambda self: self.inner.api.EntireRow)
    CurrentRegion = property(lambda self: Range(self.sheet, self.inner.current_region.areas))

    @property
    def Count(self):
        """A Long, which a whole sheet is too large for."""
        height, width = self.inner.shape
        if height * width > LARGEST_COUNT:
            raise com_error("Overflow")
        return height * width

    @property
    def Areas(self):
        return _Areas([Range(self.sheet, [area]) for area in self.areas])

    @property
    def Formula(self):
        return self.inner.formula

    @Formula.setter
    def Formula(self, text):
        self.inner.formula = text

    @property
    def Formula2(self):
        return self.inner.formula2

    @Formula2.setter
    def Formula2(self, text):
        self.inner.formula2 = text

    @property
    def ListObject(self):
        table = self.inner.table
        return None if table is None else ListObject(table)

    def SpecialCells(self, Type):
        kind = {VISIBLE: "visible", FORMULAS: "formulas"}[Type]
        found = self.inner.get_special_cells(kind, None)
        return Range(self.sheet, [one.areas[0] for one in found])

    def __call__(self, row, column):
        return Range(self.sheet, self.inner(row, column).areas)


class ListObject:
    def __init__(self, table):
        self.table = table

    Name = property(lambda self: self.table.name)
    HeaderRowRange = property(lambda self: self._range(self.table.header_row_range))
    DataBodyRange = property(lambda self: self._range(self.table.data_body_range))

    def _range(self, found):
        return Range(found.model, found.areas)


class Names:
    def __init__(self, names, scope):
        self._names, self._scope = names, scope

    Count = property(lambda self: len(self._names))

    def __call__(self, key):
        return Name(self._names[key - 1], self._scope)

    def Add(self, name, refers_to):
        made = model.Name(name, refers_to)
        self._names.append(made)
        return Name(made, self._scope)


class Name:
    def __init__(self, name, scope):
        object.__setattr__(self, "model", name)
        object.__setattr__(self, "Name", scope + name.name)

    RefersTo = property(lambda self: self.model.refers_to)

    def __setattr__(self, key, value):
        setattr(self.model, {"Visible": "visible", "RefersTo": "refers_to"}[key], value)


class _Count:
    def __init__(self, count):
        self.Count = count


class _Areas(list):
    Count = property(len)
