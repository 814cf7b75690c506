"""Excel held still while a macro works: nothing flickers, asks or reacts, and all is as before at the end."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import ExitStack, contextmanager, suppress
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import xlwings as xw

_TURNED_OFF = ("screen_updating", "display_alerts", "enable_events")

Step = Callable[[str], None]


@contextmanager
def held_still(app: xw.App) -> Iterator[Step]:
    """Gives a function that shows a step in the status bar. Every setting is restored, whatever happens."""
    with ExitStack() as restoring:
        for name in ("status_bar", *_TURNED_OFF):
            with suppress(Exception):  # a setting that Excel does not tell is none that we change and restore
                restoring.callback(_set, app, name, getattr(app, name))
                if name in _TURNED_OFF:
                    setattr(app, name, False)
        yield lambda text: _set(app, "status_bar", f"sheetfuncs: {text}")


def _set(app: xw.App, name: str, value: Any) -> None:
    # A setting that Excel does not take now must not hide the failure that led here, nor keep the others from it.
    with suppress(Exception):
        setattr(app, name, value)
