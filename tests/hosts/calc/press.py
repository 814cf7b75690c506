"""Pressing the button as menu, toolbar and macros do: through LibreOffice's dispatch."""

from __future__ import annotations

import os
import signal
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any, NamedTuple

from office import Calc, load_uno, wait_for

COMMAND = "org.sheetfuncs.calc:"


class Outcome(NamedTuple):
    """What a command said."""

    succeeded: bool
    text: str


class Pressed:
    """A command under way."""

    def __init__(self, calc: Calc, document: Any, command: str):
        load_uno()
        import unohelper
        from com.sun.star.frame import XDispatchResultListener
        from com.sun.star.util import URL

        class Listener(unohelper.Base, XDispatchResultListener):
            outcome: Outcome | None = None

            def dispatchFinished(self, event):
                self.outcome = Outcome(event.State == 1, event.Result)

            def disposing(self, event):
                pass

        _, url = calc.service("com.sun.star.util.URLTransformer").parseStrict(URL(Complete=COMMAND + command))
        self.dispatch, self.url = document.CurrentController.Frame.queryDispatch(url, "_self", 0), url
        self.listener = Listener()

    def start(self) -> Pressed:
        self.dispatch.dispatchWithNotification(self.url, (), self.listener)
        return self

    def outcome(self) -> Outcome:
        return wait_for(lambda: self.listener.outcome, "the command says what came of it", 60)


def press(calc: Calc, document: Any, command: str = "check") -> Outcome:
    """Give the command and wait for what it says."""
    return Pressed(calc, document, command).start().outcome()


def select(document: Any, sheet: str, address: str) -> Any:
    """Bring a sheet in front and select a range of it, or several with semicolons between them; returns the sheet."""
    controller, found = document.CurrentController, document.Sheets.getByName(sheet)
    controller.setActiveSheet(found)
    parts = [found.getCellRangeByName(part) for part in address.split(";")]
    if len(parts) == 1:
        controller.select(parts[0])
        return found
    ranges = document.createInstance("com.sun.star.sheet.SheetCellRanges")
    for part in parts:
        ranges.addRangeAddress(part.RangeAddress, False)
    controller.select(ranges)
    return found


def where(document: Any) -> tuple[str, str]:
    """Title of the sheet in front, and what is selected there."""
    controller = document.CurrentController
    return controller.ActiveSheet.Name, controller.Selection.AbsoluteName.replace("$", "").rpartition(".")[2]


def named_cell(sheet: Any, name: str) -> Any:
    """The cell that a hidden name of our sheet points at."""
    return sheet.NamedRanges.getByName(f"_sheetfuncs_{name}").ReferredCells.getCellByPosition(0, 0)


@contextmanager
def workers_ended(calc: Calc) -> Iterator[None]:
    """Workers that start inside are ended afterwards, so that other tests find those they started themselves."""
    before = set(calc.workers())
    try:
        yield
    finally:
        for pid in set(calc.workers()) - before:
            os.kill(pid, signal.SIGKILL)
        wait_for(lambda: set(calc.workers()) <= before, "the workers are gone")

