"""Bringing a sheet into a document, taking it out again, and one step of undo for both.

LibreOffice copies a sheet from another document with its cells, charts, links and names, and loses its page, its
frozen rows and gridlines and, where fonts differ, the widths of its columns. All that is set again here. The copying
is not undoable by itself: an undo action of our own keeps the new sheet as a package and the one that it replaced in a
hidden document, and puts the right one in place.
"""

from __future__ import annotations

from contextlib import contextmanager, suppress

import uno
import unohelper
from com.sun.star.awt import Point, Size
from com.sun.star.beans import PropertyValue
from com.sun.star.document import XUndoAction
from com.sun.star.lang import XComponent
from com.sun.star.uno import Exception as UnoException
from sheetfuncs_bridge.messages import hide_bar
from sheetfuncs_bridge.recording import keep_unrecorded, unrecorded
from sheetfuncs_bridge.references import kept_references
from sheetfuncs_bridge.windows import controllers_of, same_view, set_up_view

XLSX = "Calc MS Excel 2007 XML"
_READ_ONLY = 16  # com.sun.star.beans.PropertyAttribute


class Package:
    """One sheet as a file in memory. layout: sizes to set again and frozen rows (see the worker's check job)."""

    def __init__(self, data: bytes, layout: dict):
        self.layout, self.frozen_rows = layout, layout["frozen_rows"]
        self._data = data

    @contextmanager
    def opened(self, context):
        """The sheet in a hidden document, which runs no macros and follows no links."""
        stream = context.getServiceManager().createInstanceWithArgumentsAndContext(
            "com.sun.star.io.SequenceInputStream", (uno.ByteSequence(self._data),), context
        )
        source = _desktop(context).loadComponentFromURL("private:stream", "_blank", 0, _properties(
            Hidden=True, InputStream=stream, FilterName=XLSX, MacroExecutionMode=0, UpdateDocMode=0,
        ))
        if source is None:
            raise RuntimeError("LibreOffice could not open the sheet that was drawn.")
        try:
            yield source, source.getSheets().getByIndex(0)
        finally:
            source.close(True)


class SetAside:
    """A sheet of a document as it is now, copied into a hidden document until it is discarded."""

    layout = None  # sizes come along

    def __init__(self, context, document, title: str, frozen_rows: int):
        self.frozen_rows = frozen_rows
        self._holder = _desktop(context).loadComponentFromURL(
            "private:factory/scalc", "_blank", 0, _properties(Hidden=True)
        )
        sheets = self._holder.getSheets()
        sheets.importSheet(document, title, 0)
        _carry_page(document, document.getSheets().getByName(title), self._holder, sheets.getByIndex(0))
        self._holder.setModified(False)  # nobody is to be asked about it

    @contextmanager
    def opened(self, context):
        """The hidden document and the sheet in it."""
        yield self._holder, self._holder.getSheets().getByIndex(0)

    def discard(self) -> None:
        """Close the hidden document."""
        with suppress(UnoException):
            self._holder.close(True)


def put_sheet(context, document, title: str, position: int, package: Package, *, replaces: bool) -> None:
    """Bring the package's sheet into the document at a place (from 0), as one step of undo.

    replaces: the sheet of this title is at that place and goes. Windows, selections and formulas elsewhere that read
    from the replaced sheet stay as they were.
    """
    before = SetAside(context, document, title, package.frozen_rows) if replaces else None
    swap = _Swap(context, document, title, position, before, package)
    try:
        swap.redo()
    except Exception:
        swap.dispose()
        raise
    document.getUndoManager().addUndoAction(swap)


class _Swap(unohelper.Base, XUndoAction, XComponent):
    """The undoable exchange of what stands under a title: before, a SetAside or nothing; after, a Package."""

    def __init__(self, context, document, title: str, position: int, before, after):
        self.Title = f"Check: {title}"
        self._context, self._document = context, document
        self._title, self._position, self._before, self._after = title, position, before, after

    def getTitle(self):
        return self.Title

    def undo(self):
        for controller in controllers_of(self._document):
            hide_bar(controller)
        self._exchange(self._after, self._before)

    def redo(self):
        self._exchange(self._before, self._after)

    def dispose(self):
        """Called when the step is no longer among those that can be undone or done again."""
        if self._before is not None:
            self._before.discard()

    def addEventListener(self, listener):
        pass

    def removeEventListener(self, listener):
        pass

    def _exchange(self, old, new) -> None:
        document, sheets = self._document, self._document.getSheets()
        with unrecorded(document), same_view(document), kept_references(document, self._title):
            if old is not None and sheets.hasByName(self._title):
                self._position = sheets.getByName(self._title).getRangeAddress().Sheet
                sheets.removeByName(self._title)
            if new is None:
                _remove_page_style(document, self._title)
                return
            try:
                _bring_in(self._context, document, self._title, self._position, new)
            except Exception:
                if old is not None and not sheets.hasByName(self._title):
                    _bring_in(self._context, document, self._title, self._position, old)
                raise


def _bring_in(context, document, title: str, position: int, sheet_to_bring) -> None:
    with sheet_to_bring.opened(context) as (source, theirs):
        document.getSheets().importSheet(source, theirs.getName(), position)
        keep_unrecorded(document)
        sheet = document.getSheets().getByIndex(position)
        if sheet.getName() != title:
            sheet.setName(title)
        if sheet_to_bring.layout is not None:
            _set_sizes(sheet, sheet_to_bring.layout)
        _carry_page(source, theirs, document, sheet)
    set_up_view(context, document, sheet, sheet_to_bring.frozen_rows)


def _set_sizes(sheet, layout: dict) -> None:
    """Widths, heights and the places of the charts, in hundredths of a millimetre."""
    for first, last, width in layout["widths"]:
        sheet.getCellRangeByPosition(first - 1, 0, last - 1, 0).getColumns().setPropertyValue("Width", width)
    for first, last, height in layout["heights"]:
        sheet.getCellRangeByPosition(0, first - 1, 0, last - 1).getRows().setPropertyValue("Height", height)
    page = sheet.getDrawPage()
    shapes = [page.getByIndex(place) for place in range(page.getCount())]
    for shape, (row, column, offset, width, height) in zip(shapes, layout["charts"]):  # noqa: B905 (Python 3.8)
        corner = sheet.getCellByPosition(column - 1, row - 1).getPropertyValue("Position")
        shape.setSize(Size(width, height))
        shape.setPosition(Point(corner.X + offset, corner.Y + offset))


def _carry_page(source, theirs, document, sheet) -> None:
    """Page style, print range and repeated rows of one document's sheet for the copy in another."""
    style = _page_style(document, sheet.getName())
    _copy_properties(source.getStyleFamilies().getByName("PageStyles").getByName(theirs.PageStyle), style)
    sheet.PageStyle = style.getName()
    place = sheet.getRangeAddress().Sheet
    areas = theirs.getPrintAreas()
    for area in areas:
        area.Sheet = place
    keep_unrecorded(document)
    sheet.setPrintAreas(areas)
    if theirs.getPrintTitleRows():
        rows = theirs.getTitleRows()
        rows.Sheet = place
        keep_unrecorded(document)
        sheet.setTitleRows(rows)
        keep_unrecorded(document)
        sheet.setPrintTitleRows(True)
    names = sheet.getPropertyValue("NamedRanges")
    for name in ("_xlnm.Print_Area", "_xlnm.Print_Titles"):  # they would be saved beside what was just set
        if names.hasByName(name):
            keep_unrecorded(document)
            names.removeByName(name)


def _copy_properties(theirs, ours) -> None:
    properties = sorted(theirs.getPropertySetInfo().getProperties(), key=lambda one: one.Name.startswith("ScaleTo"))
    for one in properties:  # how many pages wide comes last: a scale in per cent would undo it
        if not one.Attributes & _READ_ONLY and one.Name != "UserDefinedAttributes":
            with suppress(UnoException):  # a property that another version does not set
                ours.setPropertyValue(one.Name, theirs.getPropertyValue(one.Name))


def _page_style(document, title: str):
    styles = document.getStyleFamilies().getByName("PageStyles")
    name = _style_name(title)
    if not styles.hasByName(name):
        styles.insertByName(name, document.createInstance("com.sun.star.style.PageStyle"))
    return styles.getByName(name)


def _remove_page_style(document, title: str) -> None:
    styles = document.getStyleFamilies().getByName("PageStyles")
    if styles.hasByName(_style_name(title)) and not styles.getByName(_style_name(title)).isInUse():
        styles.removeByName(_style_name(title))


def _style_name(title: str) -> str:
    return f"sheetfuncs {title}"


def _service(context, name: str):
    return context.getServiceManager().createInstanceWithContext(name, context)


def _desktop(context):
    return _service(context, "com.sun.star.frame.Desktop")


def _properties(**values):
    return tuple(PropertyValue(Name=name, Value=value) for name, value in values.items())
