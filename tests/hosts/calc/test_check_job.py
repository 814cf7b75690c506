"""The worker's part of the button, without LibreOffice: a block in, a package of one sheet out."""

import io
import json
from pathlib import Path

import pytest

from sheetfuncs.cells.address import parse_area
from sheetfuncs.cells.block import Block
from sheetfuncs.errors import SheetfuncsError
from sheetfuncs.hosts.calc.check_job import check
from sheetfuncs.hosts.files import Request, check_book
from sheetfuncs.report.entries import ENTRY_FIELDS
from sheetfuncs.report.names import settings_to_names
from sheetfuncs.workbook import find_our_sheets
from sheetfuncs.workbook.read import open_book
from sheetfuncs.workbook.selection import resolve

BOOK = Path(__file__).parents[3] / "templates" / "order-hours-unequal-spread.xlsx"
SHEETS = ["Notes", "Orders", "Check of Orders"]


def read(reference: str) -> Block:
    with open_book(BOOK) as book:
        return book.read(resolve(book, reference))


def run(block: Block, **head):
    said: list[str] = []
    answer, package = check({"book": BOOK.name, "sheets": SHEETS, "ours": [], **head}, [block], said.append)
    json.dumps(answer, allow_nan=False)  # it goes through a pipe
    assert said
    (ours,) = find_our_sheets(io.BytesIO(package))
    assert ours.name == answer["title"]
    return answer, package, ours.settings


def first_texts(package: bytes) -> list[str]:
    """The texts of the first screen."""
    with open_book(io.BytesIO(package)) as book:
        sheet = book.read(resolve(book, f"'{book.sheets[0].name}'!A1:O30"))
    return [sheet.text(row, column) or "" for row in range(30) for column in range(15)]


def our_sheet(settings: dict, **cells) -> dict:
    named = {f"_sheetfuncs_{name}": value for name, value in cells.items()}
    return {"title": "Seen in spring", "names": settings_to_names(settings), "cells": named}


def test_a_new_sheet_has_the_settings_of_the_files_host_and_a_free_title():
    answer, _, settings = run(read("Panels"))
    file = check_book(Request(book=BOOK, range_text="Panels", write=False)).figures()["settings"]
    assert {name: settings[name] for name in file} == file
    assert answer["title"] == "Check of Orders (2)"
    assert answer["replaces"] is None
    assert "evidence against constant variance" in answer["finding"]


def test_a_sheet_of_the_same_range_is_replaced_under_its_title_and_its_record_is_kept():
    _, _, settings = run(read("Panels"))
    earlier = our_sheet(settings, decision_1="Use it", decision_2="", decision_4=45_000.0)
    other = our_sheet(settings | {"area": "D4:G20"}) | {"title": "Another"}
    answer, package, _ = run(read("Panels"), ours=[other, earlier])
    assert (answer["title"], answer["replaces"]) == ("Seen in spring", "Seen in spring")
    assert answer["notes"] == []
    with open_book(io.BytesIO(package)) as book:
        kept = [book.local_name("Seen in spring", f"_sheetfuncs_decision_{place}") for place in (1, 2, 4)]
        values = [book.read(parse_area(name)).value(0, 0) for name in kept]
    assert values == ["Use it", None, 45_000.0]


def test_other_settings_than_those_of_the_replaced_sheet_are_said():
    _, _, settings = run(read("Panels"))
    earlier = our_sheet(settings | {"intercept": False})
    answer, _, _ = run(read("Panels"), ours=[earlier])
    assert answer["notes"] == ["The sheet before was made with another choice of intercept: undo brings it back."]
    again, _, settings = run(read("Panels"), ours=[earlier], again="Seen in spring")
    assert again["notes"] == []
    assert settings["intercept"] is False


def test_a_setting_that_was_changed_in_its_cell_is_used_and_said():
    _, _, settings = run(read("Panels"))
    place = ENTRY_FIELDS.index("predictors") + 1
    earlier = our_sheet(settings, **{f"entry_{place}": "Glaze colours; Panel area (m²)"})
    answer, package, settings = run(read("Panels"), ours=[earlier], again="Seen in spring")
    assert answer["replaces"] == "Seen in spring"
    assert settings["predictors"] == ["Glaze colours", "Panel area (m²)"]
    assert any("changed under Settings: Predictors" in text for text in first_texts(package))


def test_parts_of_a_selection_are_the_columns_to_use():
    _, _, settings = run(read("Orders!D4:G74"), parts=["D4:D74", "F4:G74"])
    assert settings["predictors"] == ["Glaze colours", "Cut pieces"]
    with pytest.raises(SheetfuncsError, match="different rows"):
        run(read("Orders!D4:G74"), parts=["D4:D74", "F4:G70"])


def test_names_that_were_damaged_make_no_sheet_ours():
    damaged = {"title": "Torn", "names": {"_sheetfuncs_settings_1": '"{"'}, "cells": {}}
    assert run(read("Panels"), ours=[damaged])[0]["replaces"] is None


def test_whole_columns_are_recorded_as_such_and_titles_above_the_data_skipped():
    data = read("Panels")
    above = [["Orders of the year, invented", None, None, None], [None] * 4, [None] * 4]
    cells = [[data.value(row, column) for column in range(4)] for row in range(data.row_count)]
    block = Block.from_rows(above + cells, sheet="Orders", first_row=1, first_column=4)
    answer, _, settings = run(block, titled=True, area="D:G")
    assert (settings["sheet"], settings["area"], settings["response"]) == ("Orders", "D:G", "Work time (h)")
    assert answer["replaces"] is None
    _, package, settings = run(block, titled=True)
    assert settings["area"] == "D4:G74"
    assert any("above row 4 was skipped" in text for text in first_texts(package))


def test_the_layout_says_what_the_import_loses():
    layout = run(read("Panels"))[0]["layout"]
    assert layout["frozen_rows"] == 2
    assert layout["widths"][0][:2] == [1, 1]
    assert len(layout["charts"]) == 7
    row, column, _, width, height = layout["charts"][0]
    assert column == 2
    assert 14_000 < width < 16_000
    lengths = {place: length for first, last, length in layout["heights"] for place in range(first, last + 1)}
    assert sum(lengths[row + place] for place in range(12)) > height  # the chart stands within its twelve rows


def test_refusals_keep_their_sentence():
    with pytest.raises(SheetfuncsError, match="leaves no predictor"):
        run(read("Orders!D4:D74"))
