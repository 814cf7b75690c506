"""Bringing a sheet into a document, taking it out again, and one step of undo for both.

LibreOffice copies a sheet from another document with its cells, charts, links and names, and loses its page, its
frozen rows and gridlines and, where fonts differ, the widths of its columns. All that is set again here. The copying
is not undoable by itself: an undo action of our own keeps both sheets as packages and puts the right one in place.
"""

from __future__ import annotations

from contextlib import suppress

import uno
import unohelper
from com.sun.star.awt import Point, Size
from com.sun.star.beans import PropertyValue
from com.sun.star.document import XUndoAction
from com.sun.star.uno import Exception as UnoException
from sheetfuncs_bridge.recording import keep_unrecorded, unrecorded
from sheetfuncs_bridge.references import kept_references
from sheetfuncs_bridge.windows import same_view, set_up_view

XLSX, ODS = "Calc MS Excel 2007 XML", "calc8"
_READ_ONLY = 16  # com.sun.star.beans.PropertyAttribute


class Package:
    """One sheet as a file in memory. layout: sizes to set again (see the worker's check job), None if it has them."""

    def __init__(self, data: bytes, filter_name: str, layout, frozen_rows: int):
        self.data, self.filter_name, self.layout, self.frozen_rows = data, filter_name, layout, frozen_rows


def put_sheet(context, document, title: str, position: int, package: Package, *, replaces: bool) -> None:
    """Bring the package's sheet into the document at a place (from 0), as one step of undo.

    replaces: the sheet of this title is at that place and goes. Windows, selections and formulas elsewhere that read
    from the replaced sheet stay as they were.
    """
    before = _packed(context, document, title, package.frozen_rows) if replaces else None
    swap = _Swap(context, document, title, position, before, package)
    swap.redo()
    document.getUndoManager().addUndoAction(swap)


class _Swap(unohelper.Base, XUndoAction):
    """The undoable exchange of what stands under a title: a Package, or nothing."""

    def __init__(self, context, document, title: str, position: int, before, after):
        self.Title = f"Check: {title}"
        self._context, self._document = context, document
        self._title, self._position, self._before, self._after = title, position, before, after

    def getTitle(self):
        return self.Title

    def undo(self):
        self._exchange(self._after, self._before)

    def redo(self):
        self._exchange(self._before, self._after)

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


def _bring_in(context, document, title: str, position: int, package: Package) -> None:
    source = _load(context, package)
    try:
        theirs = source.getSheets().getByIndex(0)
        document.getSheets().importSheet(source, theirs.getName(), position)
        keep_unrecorded(document)
        sheet = document.getSheets().getByIndex(position)
        if sheet.getName() != title:
            sheet.setName(title)
        if package.layout is not None:
            _set_sizes(sheet, package.layout)
        _carry_page(source, theirs, document, sheet)
    finally:
        source.close(True)
    set_up_view(context, document, sheet, package.frozen_rows)


def _packed(context, document, title: str, frozen_rows: int) -> Package:
    """A sheet of the document as a package of its own."""
    scratch = _desktop(context).loadComponentFromURL("private:factory/scalc", "_blank", 0, _properties(Hidden=True))
    try:
        sheets = scratch.getSheets()
        sheets.importSheet(document, title, 0)
        for name in sheets.getElementNames()[1:]:
            sheets.removeByName(name)
        _carry_page(document, document.getSheets().getByName(title), scratch, sheets.getByIndex(0))
        stream = _service(context, "com.sun.star.io.SequenceOutputStream")
        scratch.storeToURL("private:stream", _properties(FilterName=ODS, OutputStream=stream))
        return Package(stream.getWrittenBytes().value, ODS, None, frozen_rows)
    finally:
        scratch.close(True)


def _load(context, package: Package):
    """The package as a hidden document, which may run no macros and follow no links."""
    arguments = (uno.ByteSequence(package.data),)
    stream = context.getServiceManager().createInstanceWithArgumentsAndContext(
        "com.sun.star.io.SequenceInputStream", arguments, context
    )
    source = _desktop(context).loadComponentFromURL("private:stream", "_blank", 0, _properties(
        Hidden=True, InputStream=stream, FilterName=package.filter_name, MacroExecutionMode=0, UpdateDocMode=0,
    ))
    if source is None:
        raise RuntimeError("LibreOffice could not open the sheet that was drawn.")
    return source


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
