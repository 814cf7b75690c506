"""Run in a process of its own: the buttons through xlwings' real Windows side, over the program in memory; as JSON."""

from __future__ import annotations

import json
import sys

import windows_stubs

xlwings = windows_stubs.load_xlwings()  # before what imports xlwings or pywin32

import memory_com  # noqa: E402
from excel_cases import recorded, sheet, titles, workshop  # noqa: E402
from memory_model import Cell, Name, Table  # noqa: E402

STATEMENT = "import sheetfuncs.hosts.excel.macros; sheetfuncs.hosts.excel.macros.{}()"


def press(app, macro="check_selection"):
    """As the add-in's VBA does it."""
    server = xlwings.com_server.XLPython()
    server.SetAttr(xlwings._xlwindows, "BOOK_CALLER", windows_stubs.ComObject(memory_com.Workbook(app.active)))
    app.seen.clear()
    said = []
    windows_stubs.stub("win32api").MessageBox = lambda window, text, title, style: said.append(text) or 1
    server.Exec(STATEMENT.format(macro))
    held = [app.screen_updating, app.display_alerts, app.enable_events, app.status_bar]
    return {"said": said, "held": held, "seen": list(app.seen), "left": [str(p) for p in app.opened if p.exists()]}


def selection(app):
    first = press(app)
    sheet(app, "Notes").put(5, 1, [["='Check of Jobs'!B5"]])
    sheet(app, "Notes").cells[6, 1] = Cell(None, "=SUM('Check of Jobs'!B5:B9)", shape="array")
    app.active.names.append(Name("CheckedOn", "='Check of Jobs'!$B$5"))
    return [first, press(app)]


def our_sheet(app):
    press(app)
    app.active.active, app.selection_is_cells = sheet(app, "Check of Jobs"), False
    return [press(app, "check_again")]


def table(app):
    sheet(app).put(34, 2, [[2500.0, 800.0, 200.0]])
    sheet(app).tables.append(Table("JobList", (3, 2), (33, 4), totals=1))
    sheet(app).selected = "C10"
    return [press(app)]


def columns(app):
    sheet(app).selected = "$D:$D,$B:$B"
    return [press(app)]


def whole_sheet(app):
    sheet(app).selected = "A1:XFD1048576"
    return [press(app)]


def chart(app):
    app.selection_is_cells = False
    return [press(app)]


def names_lost(app):
    app.carries_names = False
    return [press(app)]


def why(app):
    sheet(app).cells[10, 3].value = "heavy"
    sheet(app).cells[40, 8] = Cell("#VALUE!", "=FIT_VIF($C$4:$D$33)")
    sheet(app).selected = "H40"
    return [press(app, "why_this_value")]


def awkward(app):
    """Currency, dates, an error, hidden rows, on a protected sheet."""
    jobs = sheet(app)
    jobs.put(3, 5, [["Day"], *([46000.0 + i] for i in range(30))], "yyyy-mm-dd")
    for row in range(4, 34):
        jobs.cells[row, 3].number_format = "$#,##0.00"
    jobs.cells[8, 3].value, jobs.cells[9, 3].value = "#N/A", 17.123456789
    jobs.hidden_rows, jobs.protected, jobs.selected = {5, 8, 9}, True, "B3:E33"
    return [press(app)]


SCENES = {scene.__name__: scene for scene in (
    selection, our_sheet, table, columns, whole_sheet, chart, names_lost, why, awkward,
)}


def main() -> None:
    answers = {}
    for name, scene in SCENES.items():
        app = workshop()
        pressed = scene(app)
        made = "Check of Jobs" in titles(app)
        texts = [cell.value for cell in sheet(app, "Check of Jobs").cells.values()] if made else []
        answers[name] = {
            "pressed": pressed, "titles": titles(app), "in_front": app.active.active.name,
            "settings": recorded(app) if made else None,
            "hidden": [not one.visible for one in sheet(app, "Check of Jobs").names] if made else [],
            "notes": [cell.formula for cell in sheet(app, "Notes").cells.values() if cell.formula],
            "names": [one.refers_to for one in app.active.names], "books": len(app.books),
            "texts": [text for text in texts if isinstance(text, str)],
        }
    json.dump(answers, sys.stdout)


if __name__ == "__main__":
    main()
