"""The bar above the sheet that says why functions have no value at all: no worker, or no answer within the limit."""

from __future__ import annotations

from contextlib import suppress

from com.sun.star.uno import Exception as UnoException

BAR = "org.sheetfuncs.calc.trouble"
HEADING = "sheetfuncs gives no values"
WARNING = 2  # com.sun.star.frame.InfobarType


def show_trouble(context, sentence: str) -> None:
    """Say it above the sheet in front; without a bar (a hidden document, an old program) the cells alone show it."""
    controller = _controller(context)
    if controller is None:
        return
    with suppress(UnoException, AttributeError):
        if controller.hasInfobar(BAR):
            controller.updateInfobar(BAR, HEADING, sentence, WARNING)
        else:
            controller.appendInfobar(BAR, HEADING, sentence, WARNING, (), True)


def hide_trouble(context) -> None:
    """Values come again."""
    controller = _controller(context)
    if controller is None:
        return
    with suppress(UnoException, AttributeError):
        if controller.hasInfobar(BAR):
            controller.removeInfobar(BAR)


def _controller(context):
    desktop = context.getServiceManager().createInstanceWithContext("com.sun.star.frame.Desktop", context)
    frame = desktop.getCurrentFrame()
    return None if frame is None else frame.getController()
