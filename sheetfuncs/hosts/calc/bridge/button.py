"""The commands of menu and toolbar.

Each takes done(succeeded, text), for a caller that wants the outcome for itself, instead of a box on the screen.
"""

from __future__ import annotations

import threading
from contextlib import suppress

import unohelper
from com.sun.star.awt import XCallback
from com.sun.star.uno import Exception as UnoException
from com.sun.star.util import XModifyListener
from sheetfuncs_bridge import protocol
from sheetfuncs_bridge.chosen import Refusal, from_own_sheets, from_selection
from sheetfuncs_bridge.client import JOBS, Answer, Packed, WorkerTrouble
from sheetfuncs_bridge.explanation import explain
from sheetfuncs_bridge.messages import Status, Teller, hide_bar
from sheetfuncs_bridge.own_sheets import own_sheets
from sheetfuncs_bridge.ranges import read_block
from sheetfuncs_bridge.sheet_import import Package, put_sheet

SHEETS = "com.sun.star.sheet.SpreadsheetDocument"
CHECK_SECONDS = 600.0
ROWS_AT_ONCE = 20_000
NO_SHEETS = "This works on a spreadsheet: open one first."
STILL_RUNNING = "The check of this document is still running; it comes by itself when it is done."
READ_ONLY = (
    "This document is open for reading only, so that no sheet can be added. Use “Edit Document” in the Edit menu, or "
    "save a copy and check there."
)
PROTECTED = (
    "The structure of this document is protected, so that no sheet can be added. Take the protection away (Tools, "
    "Protect Spreadsheet Structure), or save a copy and check there."
)
RECORDED = (
    "Changes to this document are being recorded (Edit, Track Changes), and LibreOffice needs minutes to replace a "
    "sheet then. Stop recording, or save a copy and check there."
)
CHANGED_MEANWHILE = "The data were changed while they were checked: choose “Check again” on the sheet."

_running: dict = {}  # RuntimeUID of a document -> the title of the sheet that is being checked
_latest: dict = {}  # RuntimeUID of a document -> the title of the sheet that the latest check made


def check_selection(context, frame, done=None) -> None:
    """Check the selected range, the block around the selected cell, or what our sheet in front was made from."""
    _begin(context, frame, done, from_selection)


def check_again(context, frame, done=None) -> None:
    """Check again what our sheet in front was made from, or the only check of the sheet in front."""
    _begin(context, frame, done, from_own_sheets)


def why_this_value(context, frame, done=None) -> None:
    """Say for each of our functions in the selected cell whether something stopped it, and what."""
    teller = Teller(frame, done)
    document = _document(frame)
    if document is None:
        teller.refuse(NO_SHEETS)
        return
    try:
        teller.answer(explain(document, frame.getController()))
    except (Refusal, WorkerTrouble) as refusal:
        teller.refuse(str(refusal))
    except UnoException as trouble:
        teller.refuse(f"The formula could not be read ({_short(trouble)}).")


def show_health(context, frame, done=None) -> None:
    """Say which interpreter and versions work together, or what is wrong."""
    from sheetfuncs_bridge.condition import condition

    Teller(frame, done).answer(condition())


def show_sheet(context, frame, done=None) -> None:
    """Go to the sheet that the latest check of this document made."""
    document = _document(frame)
    title = None if document is None else _latest.get(document.getPropertyValue("RuntimeUID"))
    if title is not None and document.getSheets().hasByName(title):
        frame.getController().setActiveSheet(document.getSheets().getByName(title))
        hide_bar(frame.getController())


def _document(frame):
    controller = None if frame is None else frame.getController()
    document = None if controller is None else controller.getModel()
    return document if document is not None and document.supportsService(SHEETS) else None


def _begin(context, frame, done, choose) -> None:
    teller = Teller(frame, done)
    try:
        document = _document(frame)
        _refuse_where_no_sheet_can_be_added(document)
        job = _Check(context, document, teller, choose(document, frame.getController()))
        job.start()
    except Refusal as refusal:
        teller.refuse(str(refusal))
    except UnoException as trouble:
        teller.refuse(f"The check could not be started ({_short(trouble)}). Nothing was changed.")


def _refuse_where_no_sheet_can_be_added(document) -> None:
    if document is None:
        raise Refusal(NO_SHEETS)
    if document.isReadonly():
        raise Refusal(READ_ONLY)
    if document.isProtected():
        raise Refusal(PROTECTED)
    if document.getPropertyValue("RecordChanges"):
        raise Refusal(RECORDED)
    if document.getPropertyValue("RuntimeUID") in _running:
        raise Refusal(STILL_RUNNING)


class _Check(unohelper.Base, XCallback):
    """One press of the button. A thread reads the cells and waits for the worker, so that the program goes on; the
    sheet is brought in by the program's main loop."""

    def __init__(self, context, document, teller, chosen):
        self._context, self._document, self._teller, self._chosen = context, document, teller, chosen
        self._owner = document.getPropertyValue("RuntimeUID")
        self._data_sheet = chosen.cells.getSpreadsheet().getName()
        sheets = own_sheets(document)
        if chosen.again is not None:  # first, should a copy of it have the same settings
            sheets = [chosen.again, *(one for one in sheets if one.title != chosen.again.title)]
        self._head = {
            "book": document.getTitle(), "sheets": list(document.getSheets().getElementNames()),
            "ours": [one.to_head() for one in sheets], "again": chosen.again.title if chosen.again else None,
            "area": chosen.area, "titled": chosen.titled, "parts": chosen.parts, "remarks": chosen.remarks,
        }
        self._changes = _Changes()
        self._answer: Answer | None = None
        self._trouble: str | None = None

    def start(self) -> None:
        _running[self._owner] = self._data_sheet
        self._status = Status(self._teller.frame, "Reading the cells ...")
        self._chosen.cells.addModifyListener(self._changes)
        threading.Thread(target=self._work, daemon=True).start()

    def _work(self) -> None:
        try:
            packed = Packed(protocol.pack(_read(self._chosen.cells, self._document)))
            self._answer = JOBS.request(
                "check", self._head, [packed], seconds=CHECK_SECONDS, progress=self._show_progress
            )
        except WorkerTrouble as trouble:
            self._trouble = str(trouble)
        except Exception as trouble:
            self._trouble = f"The check could not be made ({_short(trouble)}). Nothing was changed."
        callback = self._context.getServiceManager().createInstanceWithContext(
            "com.sun.star.awt.AsyncCallback", self._context
        )
        callback.addCallback(self, None)

    def _show_progress(self, text) -> None:
        if text:
            self._status.show(text)

    def notify(self, data) -> None:
        """Called by the main loop when the worker has answered."""
        self._status.end()
        _running.pop(self._owner, None)
        try:
            self._chosen.cells.removeModifyListener(self._changes)
            if self._answer is None:
                self._teller.refuse(self._trouble or "The worker gave no answer.")
            else:
                self._take(self._answer)
        except Exception as trouble:
            with suppress(UnoException):  # the document may be closed by now; there is nobody to tell then
                self._teller.refuse(f"The sheet could not be brought in ({_short(trouble)}). Nothing was changed.")

    def _take(self, answer) -> None:
        refusal = answer.head.get("sentence") if answer.status != "ok" else self._changed_sheets(answer.head)
        if refusal:
            self._teller.refuse(refusal)
        else:
            self._bring_in(answer.head, answer.part)

    def _changed_sheets(self, head: dict):
        """The sentence where the document is not any more what the worker was told of it, else None."""
        sheets = self._document.getSheets()
        if not sheets.hasByName(self._data_sheet):
            return f"The sheet “{self._data_sheet}” was removed or renamed while it was checked; nothing was added."
        if sheets.hasByName(head["title"]) != (head["replaces"] is not None):
            return f"The sheets were changed while “{self._data_sheet}” was checked; nothing was added. Try again."
        return None

    def _bring_in(self, head: dict, data: bytes) -> None:
        sheets = self._document.getSheets()
        title, replaces = head["title"], head["replaces"] is not None
        position = sheets.getByName(title if replaces else self._data_sheet).getRangeAddress().Sheet + (not replaces)
        package = Package(data, head["layout"])
        put_sheet(self._context, self._document, title, position, package, replaces=replaces)
        _latest[self._owner] = title
        where = "was written anew" if replaces else f"stands right after “{self._data_sheet}”"
        notes = [head["finding"], *head["notes"], *([CHANGED_MEANWHILE] if self._changes.happened else [])]
        self._teller.finish(f"“{title}” {where}.", " ".join(notes), title)


class _Changes(unohelper.Base, XModifyListener):
    """Whether a cell of the range was changed since."""

    def __init__(self):
        self.happened = False

    def modified(self, event):
        self.happened = True

    def disposing(self, event):
        self.happened = True


def _read(cells, document):
    """The range as one block, read in slices so that the program can do other things between them."""
    address = cells.getRangeAddress()
    last_row, last_column = address.EndRow - address.StartRow, address.EndColumn - address.StartColumn
    slices = [
        read_block(
            cells.getCellRangeByPosition(0, row, last_column, min(row + ROWS_AT_ONCE - 1, last_row)), document
        )
        for row in range(0, last_row + 1, ROWS_AT_ONCE)
    ]
    first, rest = slices[0], slices[1:]
    if rest and any(one.kinds is not None for one in slices):
        first.kinds = b"".join(one.kinds or bytes([protocol.NUMBER]) * len(one.numbers) for one in slices)
    if rest:
        first.hidden = b"".join(one.hidden for one in slices)
        first.texts = [text for one in slices for text in one.texts]
    for one in rest:
        first.numbers.extend(one.numbers)
        first.rows += one.rows
    return first


def _short(trouble) -> str:
    text = str(getattr(trouble, "Message", "") or trouble) or type(trouble).__name__
    return text.splitlines()[0][:200] if text else type(trouble).__name__
