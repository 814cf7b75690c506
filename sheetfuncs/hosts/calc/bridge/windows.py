"""The windows of a document: each shows the same sheet, selection and place afterwards as before.

A window whose sheet is gone shows the one before it.
"""

from __future__ import annotations

from contextlib import contextmanager, suppress

from com.sun.star.beans import PropertyValue
from com.sun.star.uno import Exception as UnoException

_AT_ONCE = (PropertyValue(Name="SynchronMode", Value=True),)


@contextmanager
def same_view(document):
    """Whatever happens inside, every window of the document ends where it was; without repainting on the way."""
    windows = [_Window(controller) for controller in controllers_of(document)]
    document.addActionLock()
    try:
        yield
    finally:
        for window in windows:
            window.restore(document)
        document.removeActionLock()


def set_up_view(context, document, sheet, frozen_rows: int) -> None:
    """Freeze the top rows of a new sheet and hide its gridlines in every window; it is in front afterwards."""
    dispatcher = context.getServiceManager().createInstanceWithContext("com.sun.star.frame.DispatchHelper", context)
    for controller in controllers_of(document):
        controller.setActiveSheet(sheet)
        if frozen_rows:
            controller.freezeAtPosition(0, frozen_rows)
        # The controller's property ShowGrid is that of all sheets; a new sheet has its lines, and this takes them off.
        dispatcher.executeDispatch(controller.getFrame(), ".uno:ToggleSheetGrid", "", 0, _AT_ONCE)


def controllers_of(document) -> list:
    """The controllers of all windows that show the document's sheets."""
    found = document.getControllers()
    controllers = []
    while found.hasMoreElements():
        controllers.append(found.nextElement())
    return [one for one in controllers if hasattr(one, "getActiveSheet")]


class _Window:
    """What one window shows. Ranges are kept by the title of their sheet, as its place may change."""

    def __init__(self, controller):
        self._controller = controller
        self._title = controller.getActiveSheet().getName()
        self._place = controller.getActiveSheet().getRangeAddress().Sheet
        selection = controller.getSelection()
        self._areas, self._shapes = [], None
        if hasattr(selection, "getRangeAddress"):
            self._areas = [selection.getRangeAddress()]
        elif hasattr(selection, "getRangeAddresses"):
            self._areas = list(selection.getRangeAddresses())
        else:
            self._shapes = selection
        self._corners = [self._corner(place) for place in range(controller.getCount())]

    def restore(self, document) -> None:
        sheets = document.getSheets()
        if not sheets.hasByName(self._title):
            self._controller.setActiveSheet(sheets.getByIndex(max(0, self._place - 1)))
            return
        sheet = sheets.getByName(self._title)
        self._controller.setActiveSheet(sheet)
        with suppress(UnoException):  # a shape of a sheet that was replaced
            self._select(document, sheet)
        for place in range(min(len(self._corners), self._controller.getCount())):
            pane, (row, column) = self._controller.getByIndex(place), self._corners[place]
            if (pane.getFirstVisibleRow(), pane.getFirstVisibleColumn()) != (row, column):
                pane.setFirstVisibleRow(row)
                pane.setFirstVisibleColumn(column)

    def _select(self, document, sheet) -> None:
        if self._shapes is not None:
            self._controller.select(self._shapes)
        elif len(self._areas) == 1:
            area = self._areas[0]
            self._controller.select(
                sheet.getCellRangeByPosition(area.StartColumn, area.StartRow, area.EndColumn, area.EndRow)
            )
        elif self._areas:
            ranges = document.createInstance("com.sun.star.sheet.SheetCellRanges")
            for area in self._areas:
                area.Sheet = sheet.getRangeAddress().Sheet
                ranges.addRangeAddress(area, False)
            self._controller.select(ranges)

    def _corner(self, place: int):
        pane = self._controller.getByIndex(place)
        return pane.getFirstVisibleRow(), pane.getFirstVisibleColumn()
