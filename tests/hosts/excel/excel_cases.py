"""What the tests of the macros share: an invented workbook in the program in memory, and the pressing of a button."""

from __future__ import annotations

import random

import memory_model as model

from sheetfuncs.hosts.excel import macros
from sheetfuncs.workbook.settings import settings_from_names


def invented_jobs(rows=30, seed=3):
    """Invented: cost of a job from weight and holes."""
    draw = random.Random(seed)
    return [["Cost", "Weight", "Holes"]] + [
        [round(12 + 3.1 * weight + 0.9 * holes + draw.gauss(0, 2), 2), weight, holes]
        for weight, holes in ((round(draw.uniform(1, 40), 1), float(draw.randint(1, 12))) for _ in range(rows))
    ]


def workshop() -> model.App:
    """A running program: a workbook with notes, data at B3:D33 of the sheet in front, and a sheet behind it."""
    app = model.App()
    book = app.add("Invented jobs.xlsx")
    notes, jobs, last = book.add("Notes"), book.add("Jobs"), book.add("Later")
    notes.put(1, 1, [["Invented data"], ["=Jobs!B4"]])
    jobs.put(3, 2, invented_jobs())
    last.put(1, 1, [[1.0]])
    book.active, jobs.selected = jobs, "B3:D33"
    return app


def press(app, macro=macros.check_selection):
    """Run a macro; its message. Whatever happened, Excel is left as it was and the user saw no more than that."""
    held = app.screen_updating, app.display_alerts, app.enable_events, app.status_bar
    app.alerts.clear()
    app.seen.clear()
    macro()
    assert (app.screen_updating, app.display_alerts, app.enable_events, app.status_bar) == held
    assert app.seen == []
    assert not any(path.exists() for path in app.opened)
    assert len(app.alerts) == 1
    return app.alerts[0][1]


def titles(app):
    return [sheet.name for sheet in app.books[0].sheets]


def sheet(app, name="Jobs"):
    return app.books[0].sheet(name)


def recorded(app, title="Check of Jobs"):
    """The settings in the hidden names of a sheet of ours."""
    return settings_from_names((name.name, name.refers_to) for name in sheet(app, title).names)


def entry(app, hidden_name, title="Check of Jobs") -> model.Cell:
    """The cell that a hidden name of our sheet points at."""
    ours = sheet(app, title)
    formula = next(name.refers_to for name in ours.names if name.name == hidden_name)
    assert formula.startswith(f"='{title}'!$")
    column, row = formula.split("!$")[1].split("$")
    assert len(column) == 1
    return ours.cells.setdefault((int(row), ord(column) - 64), model.Cell())
