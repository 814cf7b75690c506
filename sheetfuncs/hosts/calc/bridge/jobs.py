"""What happens when a document was loaded, saved or closed: names of our functions find their way in and out of files.

7.4 does not know the names FIT_... in .xlsx files when it loads one, and saves names of its own there. 25.2 knows plain
names and saves them, but keeps the values that another program stored.
"""

from __future__ import annotations

SHEETS = "com.sun.star.sheet.SpreadsheetDocument"


def on_event(context, event_name: str, model) -> None:
    """A document event: OnLoadFinished, OnSaveDone, OnSaveAsDone, OnUnload."""
    if not model.supportsService(SHEETS):
        return
    if event_name == "OnLoadFinished":
        from sheetfuncs_bridge.loaded_formulas import set_again

        set_again(model)
    elif event_name in ("OnSaveDone", "OnSaveAsDone"):
        from sheetfuncs_bridge.saved_names import write_plain_names

        write_plain_names(model)
    elif event_name == "OnUnload":
        from sheetfuncs_bridge.saved_names import try_again

        try_again()
