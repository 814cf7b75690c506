"""What the person at the sheet is told: a box, the status bar, a bar above the sheet."""

from __future__ import annotations

import os
import sys
import threading
from contextlib import suppress

import uno
from com.sun.star.awt.MessageBoxButtons import BUTTONS_OK
from com.sun.star.awt.MessageBoxType import INFOBOX
from com.sun.star.beans import StringPair
from com.sun.star.uno import Exception as UnoException

TITLE = "Regression check"
BAR = "org.sheetfuncs.calc.bar"
STATUS_SECONDS = 12.0
SHOW_COMMAND = "org.sheetfuncs.calc:show"
_SYSTEM_XWINDOW = 6  # com.sun.star.lang.SystemDependent


class Teller:
    """Says the outcome of one command: to the caller that listens for it, else in a box on the screen.

    done(succeeded, text) is what a caller gave that wants the outcome for itself, or None.
    """

    def __init__(self, frame, done=None):
        self.frame, self._done = frame, done

    def refuse(self, text: str) -> None:
        """What was asked for could not be done."""
        self._say(False, text)

    def answer(self, text: str) -> None:
        """The answer to a question, in a box."""
        self._say(True, text)

    def finish(self, text: str, detail: str, title: str) -> None:
        """The sheet of this title was made: said beside the work, not in its way."""
        if self._done is not None:
            self._done(True, f"{text} {detail}".strip())
        show_status(self.frame, text)
        _show_bar(self.frame, text, detail, title)

    def _say(self, succeeded: bool, text: str) -> None:
        if self._done is not None:
            self._done(succeeded, text)
        else:
            tell(self.frame, TITLE, text)


def tell(frame, title: str, text: str) -> None:
    """A message box; where there is no window that could show it, the status bar."""
    window = None if frame is None else frame.getContainerWindow()
    if window is None or not on_screen(window):
        show_status(frame, text)
        return
    box = window.getToolkit().createMessageBox(window, INFOBOX, BUTTONS_OK, title, text)
    box.execute()
    box.dispose()


def on_screen(window) -> bool:
    """Whether somebody can see this window: not one of a hidden document or of a program without a display."""
    if not window.isVisible():
        return False
    if not sys.platform.startswith("linux") or os.environ.get("WAYLAND_DISPLAY"):
        return True
    if not os.environ.get("DISPLAY"):
        return False
    try:
        handle = window.getWindowHandle(uno.ByteSequence(bytes(16)), _SYSTEM_XWINDOW)
    except (UnoException, AttributeError):
        return True
    return bool(getattr(handle, "WindowHandle", True))


class Status:
    """Progress in the status bar of a window; may be used from any thread."""

    def __init__(self, frame, text: str):
        self._indicator = None if frame is None else frame.createStatusIndicator()
        if self._indicator is not None:
            self._indicator.start(text, 0)

    def show(self, text: str) -> None:
        if self._indicator is not None:
            _quietly(self._indicator.setText, text)

    def end(self) -> None:
        if self._indicator is not None:
            _quietly(self._indicator.end)
            self._indicator = None


def show_status(frame, text: str) -> None:
    """A text in the status bar that goes away after a while."""
    if frame is None:
        return
    status = Status(frame, text)
    timer = threading.Timer(STATUS_SECONDS, status.end)
    timer.daemon = True
    timer.start()


def _show_bar(frame, text: str, detail: str, title: str) -> None:
    """The bar above the sheet, with a button that goes to the result unless it is in front."""
    if frame is None or not on_screen(frame.getContainerWindow()):
        return
    controller = frame.getController()
    hide_bar(controller)
    in_front = controller.getActiveSheet().getName() == title
    buttons = () if in_front else (StringPair("Show the sheet", SHOW_COMMAND),)
    with suppress(UnoException, AttributeError):  # the status bar says it too
        controller.appendInfobar(BAR, text, detail, 0, buttons, True)


def hide_bar(controller) -> None:
    """Take the bar away, if it is there: what it says was seen, or is not true any more."""
    with suppress(UnoException, AttributeError):
        if controller.hasInfobar(BAR):
            controller.removeInfobar(BAR)


def _quietly(call, *arguments) -> None:
    with suppress(UnoException):  # the window was closed meanwhile
        call(*arguments)
