"""What a running program hands over is checked as the same cells in a file are."""

import io
from pathlib import Path

import pytest

from sheetfuncs.cells.address import parse_area
from sheetfuncs.cells.block import Block
from sheetfuncs.errors import ArgumentError, BlockShapeError
from sheetfuncs.hosts.files import Request, check_book
from sheetfuncs.hosts.live import area_of_parts, check_block, draw_check, same_range, title_of_check
from sheetfuncs.workbook import find_our_sheets
from sheetfuncs.workbook.read import open_book
from sheetfuncs.workbook.selection import resolve

BOOK = Path(__file__).parents[2] / "templates" / "order-hours-unequal-spread.xlsx"


@pytest.fixture(scope="module")
def block() -> Block:
    with open_book(BOOK) as book:
        return book.read(resolve(book, "Panels"))


def test_same_figures_as_on_the_file(block: Block) -> None:
    ours = check_block(block, book=BOOK.name).to_dict()
    file = check_book(Request(book=BOOK, range_text="Panels", write=False)).figures()
    assert ours["settings"] == file["settings"]
    assert ours == file


def test_recorded_settings_are_used_again(block: Block) -> None:
    first = check_block(block, book="b")
    one = list(first.settings.predictors[:1])
    asked = first.settings.to_dict() | {"intercept": False, "level": 0.9, "predictors": one}
    again = check_block(block, book="b", settings=asked)
    assert again.settings.to_dict() == asked
    assert again.fit.p == 1
    assert same_range(asked, again)
    assert not same_range(asked | {"area": "A1:B9"}, again)
    assert not same_range(None, again)


def test_drawn_sheet_is_recognised_and_keeps_the_decision(block: Block) -> None:
    check = check_block(block, book="b", remarks=["The host chose this."])
    title = title_of_check(check, ["Orders", "Check of Orders"])
    assert title not in ("Orders", "Check of Orders")
    out = io.BytesIO()
    plan = draw_check(check, out, title=title, decision={"by": "Ines Invented"})
    assert "The host chose this." in check.remarks
    assert any(cell.value == "Ines Invented" for cell in plan.cells)
    (ours,) = find_our_sheets(out)
    assert ours.name == title
    assert same_range(ours.settings, check)


def test_one_column_is_refused_in_a_sentence() -> None:
    block = Block.from_rows([[1.0], [2.0], [4.0]], sheet="Data")
    with pytest.raises(BlockShapeError, match="leaves no predictor"):
        check_block(block, book="b")


def parts(*texts: str):
    return area_of_parts([parse_area(f"Orders!{text}") for text in texts])


def test_parts_of_a_selection_are_columns_of_the_block_over_them(block: Block) -> None:
    area, settings = parts("E4:E74", "G4:G74", "D4:D74")
    assert str(area) == "Orders!D4:G74"
    check = check_block(block, book="b", settings=settings)
    whole = check_block(block, book="b").settings
    d, (e, _, g) = whole.response, whole.predictors
    assert (check.settings.response, check.settings.predictors) == (e, (g, d))
    assert check.settings.area == "D4:G74"


def test_one_part_is_taken_as_it_is() -> None:
    assert parts("D4:G74") == (parse_area("Orders!D4:G74"), {})
    assert parts("D:D", "F:G")[1] == {"response": "D", "predictors": ["F", "G"]}
    assert parts("D4:E9", "E4:F9")[1] == {"response": "D", "predictors": ["E", "F"]}


def test_parts_on_different_rows_and_a_single_column_are_refused() -> None:
    with pytest.raises(ArgumentError, match=r"The selected parts \(D4:D74, F5:G74\) stand on different rows"):
        parts("D4:D74", "F5:G74")
    with pytest.raises(ArgumentError, match="Only column D is selected"):
        parts("D4:D9", "D4:D9")
