"""A reader changes a pale cell of the settings, and the check is run again on that workbook."""

from pathlib import Path

import openpyxl
import pytest

from sheetfuncs.errors import ArgumentError
from sheetfuncs.hosts.files import Done, Request, check_book
from sheetfuncs.report.entries import ENTRY_FIELDS
from sheetfuncs.report.names import ENTRY

BOOK = Path(__file__).parents[2] / "templates" / "order-hours-unequal-spread.xlsx"


def changed(book: Path, sheet: str, **entries: object) -> None:
    """Type into the settings of the sheet and save with that sheet in front, as a spreadsheet program would."""
    opened = openpyxl.load_workbook(book)
    ours = opened[sheet]
    for field, value in entries.items():
        name = ours.defined_names[f"{ENTRY}{ENTRY_FIELDS.index(field) + 1}"]
        ours[name.attr_text.rpartition("!")[2].replace("$", "")] = value
    opened.active = ours
    opened.save(book)


@pytest.fixture
def checked(tmp_path: Path) -> Done:
    return check_book(Request(book=BOOK, range_text="Panels", out=tmp_path / "orders.xlsx"))


def test_a_changed_setting_is_used_and_said(checked: Done) -> None:
    first, second = checked.check.settings.predictors[:2]
    changed(checked.out, checked.sheet, predictors=f"{second}; {first}", intercept="no", level=0.9)
    again = check_book(Request(book=checked.out, in_place=True))
    assert again.replaced
    assert again.sheet == checked.sheet
    settings = again.check.settings
    assert settings.predictors == (second, first)
    assert (settings.intercept, settings.level) == (False, 0.9)
    assert settings.area == checked.check.settings.area
    assert "of which Predictors, Intercept and Interval level changed there" in again.check.remarks[0]
    # And back: the intercept that was left out can be had again from the sheet.
    changed(again.out, again.sheet, predictors=None, intercept="yes", level=None)
    back = check_book(Request(book=again.out, in_place=True))
    assert back.check.settings.to_dict() | {"book": None} == checked.check.settings.to_dict() | {"book": None}


def test_unchanged_cells_change_nothing(checked: Done) -> None:
    changed(checked.out, checked.sheet)
    again = check_book(Request(book=checked.out, in_place=True))
    assert again.check.settings.to_dict() | {"book": None} == checked.check.settings.to_dict() | {"book": None}
    assert again.check.remarks[0].endswith("was made again with its settings.")


def test_a_column_that_is_not_there_is_refused(checked: Done) -> None:
    changed(checked.out, checked.sheet, order="Weekday")
    with pytest.raises(ArgumentError, match=r"The order .Weekday. is no column"):
        check_book(Request(book=checked.out, in_place=True))
