"""Formulas of ours from other programs through the files host: carried as they are, and evaluated in every spelling.

The part of the round trip that needs a running spreadsheet program is in calc/test_files.py.
"""

from __future__ import annotations

import zipfile
from pathlib import Path

import formula_books as books
import pytest
from click.testing import CliRunner

import sheetfuncs
from sheetfuncs.cli import main
from sheetfuncs.hosts.files import Request, check_book, evaluate_cell
from sheetfuncs.workbook.formula_names import write_plain_names

RANGE = f"Orders!A1:C{books.LAST}"
FORMULA_PARTS = (
    "xl/worksheets/sheet1.xml", "xl/metadata.xml", "xl/externalLinks/externalLink1.xml",
    "xl/externalLinks/_rels/externalLink1.xml.rels",
)  # fmt: skip


def parts_of(path: Path) -> dict[str, bytes]:
    with zipfile.ZipFile(path) as package:
        return {name: package.read(name) for name in package.namelist()}


@pytest.mark.parametrize("spelling", books.SPELLINGS)
def test_a_check_carries_formulas_and_stored_values_as_they_were(tmp_path, spelling):
    book = books.write_book(tmp_path / "book.xlsx", spelling)
    before, name = parts_of(book), books.names_in(book)["Spread"]
    for _ in range(2):  # the second time our sheet is replaced
        check_book(Request(book=book, range_text=RANGE, in_place=True))
        after = parts_of(book)
        assert [part for part in FORMULA_PARTS if after[part] != before[part]] == []
        assert books.names_in(book)["Spread"] == name
    assert books.cells_in(book)["E2"] == (books.SINGLE.spelled(books.SPELLINGS[spelling]), str(books.STORED))


@pytest.mark.parametrize("spelling", books.SPELLINGS)
def test_a_formula_is_evaluated_as_the_file_spells_it(tmp_path, spelling):
    book = books.write_book(tmp_path / "book.xlsx", spelling)
    formulas = books.cells_in(book)
    assert evaluate_cell(f"={formulas['E2'][0]}".replace("A2:", "Orders!A2:"), book) == books.expected()["E2"]
    residuals = evaluate_cell(f"={{{formulas['G2'][0]}}}".replace("={", "{="), book)
    assert residuals == sheetfuncs.evaluate("FIT_RESIDUALS", books.HOURS, books.PANELS)


@pytest.mark.parametrize("spelling", books.SPELLINGS)
def test_plain_names_and_then_nothing_more_to_do(tmp_path, spelling):
    book = books.write_book(tmp_path / "book.xlsx", spelling)
    plain = books.write_book(tmp_path / "plain.xlsx", "plain")
    count = write_plain_names(book)
    assert count == (0 if spelling == "plain" else 8)
    assert parts_of(book) == parts_of(plain)
    assert write_plain_names(book) == 0


def test_calls_into_another_addin_stay_its_own(tmp_path):
    book = books.write_book(tmp_path / "book.xlsx", "linked", link="file:///C:\\Add-ins\\other.xlam")
    before = parts_of(book)
    assert write_plain_names(book) == 0
    assert parts_of(book) == before


def test_a_copy_gets_plain_names_by_the_command(tmp_path):
    book = books.write_book(tmp_path / "copy.xlsx", "unknown")
    done = CliRunner().invoke(main, ["calc", "plain-names", str(book)])
    assert (done.exit_code, done.output.count("as every program reads them.")) == (0, 1)
    again = CliRunner().invoke(main, ["calc", "plain-names", str(book)])
    assert (again.exit_code, "it was left as it is" in again.output) == (0, True)
    refused = CliRunner().invoke(main, ["calc", "plain-names", str(tmp_path / "none.xlsx")])
    assert refused.exit_code == 1
    assert refused.output.count("\n") == 1
