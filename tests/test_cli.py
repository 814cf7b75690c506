"""The command line as its user meets it: files appear, decisions stay, refusals are one sentence."""

from __future__ import annotations

import json
import re
import shutil
import zipfile
from pathlib import Path

import openpyxl
import pytest
from click.testing import CliRunner

from sheetfuncs.cli import main
from sheetfuncs.hosts.demo import templates_folder
from sheetfuncs.report.names import DECISION
from sheetfuncs.workbook.read import open_book

ORDERS = "order-hours-unequal-spread.xlsx"


def run(*arguments: object, exit_code: int = 0):
    result = CliRunner().invoke(main, [str(argument) for argument in arguments], catch_exceptions=False)
    assert result.exit_code == exit_code, result.output
    if exit_code == 1:
        assert result.stdout == ""
        assert len(result.stderr.strip().splitlines()) == 1
        assert result.stderr.strip().endswith((".", "?"))
    return result


@pytest.fixture
def orders(tmp_path) -> Path:
    return Path(shutil.copy(templates_folder() / ORDERS, tmp_path))


def sheet_names(path: Path) -> list[str]:
    with open_book(path) as book:
        return [sheet.name for sheet in book.sheets]


def decide(path: Path, sheet: str, text: str) -> None:
    """Fill in the first cell of the decision record by hand, as a spreadsheet program would."""
    with open_book(path) as book:
        place = book.local_name(sheet, f"{DECISION}1")
    cell = place.rsplit("!", 1)[1].replace("$", "")
    part = next(s.part for s in book.sheets if s.name == sheet)
    with zipfile.ZipFile(path) as old:
        entries = {info: old.read(info) for info in old.infolist()}
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as new:
        for info, data in entries.items():
            if info.filename == part.lstrip("/"):
                head, tail = data.split(f'<c r="{cell}"'.encode(), 1)
                style, rest = tail.split(b"/>", 1)
                value = b' t="inlineStr"><is><t>' + text.encode() + b"</t></is></c>"
                data = head + f'<c r="{cell}"'.encode() + style + value + rest
            new.writestr(info, data)


def decision_of(path: Path, sheet: str) -> object:
    with open_book(path) as book:
        place = book.local_name(sheet, f"{DECISION}1").rsplit("!", 1)[1].replace("$", "")
    workbook = openpyxl.load_workbook(path)
    return workbook[sheet][place].value


def test_check_writes_a_copy_beside_the_book(orders):
    before = orders.read_bytes()
    result = run("check", orders)
    checked = orders.with_name("order-hours-unequal-spread-checked.xlsx")
    assert orders.read_bytes() == before
    names = sheet_names(checked)
    assert names[names.index("Orders") + 1] == "Check of Orders"
    assert "constant variance" in result.stdout
    assert f'Wrote the sheet "Check of Orders" in {checked}' in result.stdout
    with open_book(checked) as book:
        assert book.active_sheet == "Orders"


def test_a_second_run_replaces_the_sheet_and_keeps_the_decision(orders):
    run("check", orders)
    checked = orders.with_name("order-hours-unequal-spread-checked.xlsx")
    decide(checked, "Check of Orders", "Use it for panels up to 3 m²")
    result = run("check", orders)
    assert f'Wrote the sheet "Check of Orders" in {checked}' in result.stdout
    assert f"sheetfuncs undo {checked} brings it back" in result.stderr
    assert sheet_names(checked).count("Check of Orders") == 1
    assert decision_of(checked, "Check of Orders") == "Use it for panels up to 3 m²"


def test_in_place_keeps_the_decision_and_undo_brings_the_file_back(orders):
    before = orders.read_bytes()
    run("check", orders, "--in-place")
    decide(orders, "Check of Orders", "Not yet")
    with_decision = orders.read_bytes()
    result = run("check", orders, "--in-place")
    assert "Replaced the sheet" in result.stdout
    assert decision_of(orders, "Check of Orders") == "Not yet"
    assert sheet_names(orders).count("Check of Orders") == 1
    run("undo", orders)
    assert orders.read_bytes() == with_decision != before
    run("undo", orders, exit_code=1)


def test_another_range_gets_another_sheet(orders):
    run("check", orders, "--in-place")
    run("check", orders, "Orders!D4:F74", "--in-place")
    names = sheet_names(orders)
    assert [n for n in names if n.startswith("Check of")] == ["Check of Orders (2)", "Check of Orders"]


def test_a_copy_with_the_check_of_another_range_is_not_written_over(orders):
    run("check", orders)
    checked = orders.with_name("order-hours-unequal-spread-checked.xlsx")
    before = checked.read_bytes()
    refusal = run("check", orders, "Orders!D4:F74", exit_code=1).stderr
    assert "also holds the check of another range (Check of Orders)" in refusal
    assert checked.read_bytes() == before
    run("check", checked, "Orders!D4:F74", "--in-place")
    assert [n for n in sheet_names(checked) if n.startswith("Check of")] == ["Check of Orders (2)", "Check of Orders"]


def test_a_workbook_that_opens_on_our_sheet_is_checked_again_as_before(orders):
    run("check", orders, "Panels", "--predictors", "Panel area (m²)", "--level", "0.9", "--in-place")
    open_on(orders, "Check of Orders")
    figures = json.loads(run("check", orders, "--in-place", "--json", "-").stdout)
    assert figures["settings"]["predictors"] == ["Panel area (m²)"]
    assert figures["settings"]["level"] == 0.9
    assert figures["settings"]["area"] == "D4:G74"
    assert "made again with its settings" in figures["remarks"][0]
    assert sheet_names(orders).count("Check of Orders") == 1


def open_on(path: Path, sheet: str) -> None:
    """Save the workbook with another sheet in front."""
    place = sheet_names(path).index(sheet)
    with zipfile.ZipFile(path) as old:
        entries = {info: old.read(info) for info in old.infolist()}
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as new:
        for info, data in entries.items():
            if info.filename == "xl/workbook.xml":
                data = re.sub(rb'activeTab="\d+"', b'activeTab="%d"' % place, data)
            new.writestr(info, data)


def test_a_file_that_is_not_ours_is_left_alone(orders):
    other = orders.with_name("order-hours-unequal-spread-checked.xlsx")
    shutil.copy(templates_folder() / "kiln-energy-clean.xlsx", other)
    before = other.read_bytes()
    result = run("check", orders, exit_code=1)
    assert "holds no diagnostics sheet of ours" in result.stderr
    assert other.read_bytes() == before
    assert "--in-place" in run("check", orders, "--out", orders, exit_code=1).stderr


def test_a_workbook_that_someone_has_open(orders):
    (orders.parent / f"~${orders.name}").write_bytes(b"\x05Bobby" + b" " * 100)
    assert "is open" in run("check", orders).stderr
    before = orders.read_bytes()
    assert "is open" in run("check", orders, "--in-place", exit_code=1).stderr
    assert orders.read_bytes() == before


def test_names_letters_and_an_order_choose_columns(orders):
    by_name = run("check", orders, "--response", "Work time (h)", "--predictors", "Panel area (m²),Cut pieces",
                  "--no-sheet", "--json", "-")
    by_letter = run("check", orders, "Orders!D4:G74", "--response", "D", "--predictors", "E,G", "--no-sheet",
                    "--json", "-")
    one, other = json.loads(by_name.stdout), json.loads(by_letter.stdout)
    assert one["fit"] == other["fit"]
    assert one["settings"]["predictors"] == ["Panel area (m²)", "Cut pieces"]
    assert not list(orders.parent.glob("*-checked*"))


def test_a_date_column_serves_as_predictor_when_named(tmp_path):
    book = Path(shutil.copy(templates_folder() / "dryer-gas-time-order.xlsx", tmp_path))
    figures = json.loads(run("check", book, "--no-sheet", "--json", "-").stdout)
    assert (figures["settings"]["order"], len(figures["settings"]["predictors"])) == ("Date", 3)
    figures = json.loads(run("check", book, "--no-sheet", "--date-predictor", "Date", "--json", "-").stdout)
    assert "Date" in figures["settings"]["predictors"]


def test_json_goes_to_a_file_too(orders):
    target = orders.parent / "figures.json"
    run("check", orders, "--no-sheet", "--json", target)
    figures = json.loads(target.read_text(encoding="utf-8"))
    assert figures["schema"] == "sheetfuncs-check-1"
    assert figures["rows"]["used"] == 66
    assert {row["row"] for row in figures["rows"]["excluded"]} == {15, 38, 62, 73}


def test_predictions_at_a_place(orders):
    place = "Panel area (m²)=2.5,Glaze colours=3,Cut pieces=12"
    result = run("check", orders, "--no-sheet", "--at", place, "--json", "-")
    prediction = json.loads(result.stdout)["predictions"][0]
    assert prediction["new_low"] < prediction["average_low"] < prediction["value"] < prediction["average_high"]
    assert "average between" in run("check", orders, "--no-sheet", "--at", place).stdout
    assert "does not name" in run("check", orders, "--no-sheet", "--at", "Cut pieces=12", exit_code=1).stderr


@pytest.mark.parametrize(("arguments", "says"), [
    (["Nowhere!A1:B9"], "Nowhere"),
    (["Orders!D4:G4"], "Orders!D4:G4"),
    (["Orders!ZZZZ1"], "ZZZZ1"),
    (["--response", "Weight"], "Weight"),
    (["--base", "Kiln"], "NAME=VALUE"),
    (["--level", "1.5"], "level"),
    (["--order", "Size class"], "Size class"),
])
def test_refusals_are_one_sentence(orders, arguments, says):
    assert says in run("check", orders, *arguments, exit_code=1).stderr
    assert not list(orders.parent.glob("*-checked*"))


@pytest.mark.parametrize("content", [b"", b"PK", b"a,b\n1,2\n", b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(600)])
def test_files_that_are_no_workbooks_are_refused_in_a_sentence(tmp_path, content):
    path = tmp_path / "data.xlsx"
    path.write_bytes(content)
    run("check", path, exit_code=1)
    run("cell", "=FIT_VIF(A1:B9)", path, exit_code=1)


def test_a_mistake_of_ours_is_a_sentence_too(orders, monkeypatch):
    def broken(*_):
        raise ZeroDivisionError("division by zero")

    monkeypatch.setattr("sheetfuncs.hosts.files.check_book", broken)
    assert "made a mistake (ZeroDivisionError" in run("check", orders, exit_code=1).stderr
    monkeypatch.setenv("SHEETFUNCS_TRACEBACK", "1")
    with pytest.raises(ZeroDivisionError):
        run("check", orders)


def test_a_folder_is_no_workbook(tmp_path):
    assert "is a folder" in run("check", tmp_path, exit_code=1).stderr


def test_a_missing_file(tmp_path):
    assert "none.xlsx" in run("check", tmp_path / "none.xlsx", exit_code=1).stderr


def test_wrong_usage_exits_with_2(orders):
    for arguments in (["check"], ["check", orders, "--in-place", "--no-sheet"], ["nothing"], ["check", orders, "--x"]):
        assert CliRunner().invoke(main, [str(a) for a in arguments]).exit_code == 2


def test_cell_evaluates_a_formula(orders):
    value = float(run("cell", "=FIT_DURBIN_WATSON(Orders!D4:D74,Orders!E4:G74)", orders).stdout)
    assert value == pytest.approx(1.780, abs=0.001)
    table = run("cell", "=FIT_COEFFICIENTS(Orders!D4:D74,Orders!E4:G74)", orders).stdout.splitlines()
    assert [line.split("\t")[0] for line in table] == ["intercept", "Panel area (m²)", "Glaze colours", "Cut pieces"]
    assert run("cell", "=FIT_VIF(Orders!D4:D74)", orders).stdout.strip() == "1.0"
    run("cell", "=SUM(A1:A3)", orders, exit_code=1)


def test_functions_lists_and_explains():
    assert "FIT_VIF" in run("functions").stdout
    assert "response" in run("functions", "FIT_DURBIN_WATSON").stdout
    run("functions", "FIT_NOTHING", exit_code=1)


def test_demo_writes_its_workbooks_and_leaves_existing_ones(tmp_path):
    folder = tmp_path / "demo"
    assert "sheetfuncs check" in run("demo", folder).stdout
    functions = "order-hours-functions.xlsm"
    assert (folder / functions).read_bytes() == (templates_folder() / functions).read_bytes()
    books = sorted(folder.glob("*.xlsx"))
    assert len(books) == 3
    books[0].write_bytes(b"mine")
    run("demo", folder)
    assert books[0].read_bytes() == b"mine"
    for book in books[1:]:
        run("check", book)
