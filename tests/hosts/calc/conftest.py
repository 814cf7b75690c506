"""One LibreOffice for all tests of a process, in a private profile with the extension installed."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from office import Calc, installed_profile, load_uno
from press import workers_ended

BOOK = Path(__file__).parents[3] / "templates" / "order-hours-unequal-spread.xlsx"


@pytest.fixture(scope="session")
def calc(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Calc]:
    """The running program. A test that stops or changes it starts one of its own instead."""
    load_uno()
    program = Calc(installed_profile(tmp_path_factory.mktemp("calc")))
    try:
        yield program
    finally:
        program.stop()


@pytest.fixture
def document(calc: Calc) -> Iterator[Any]:
    """An empty spreadsheet document, closed after the test."""
    made = calc.new_document()
    try:
        yield made
    finally:
        made.close(True)


@pytest.fixture(scope="module")
def orders(calc: Calc, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Any]:
    """A copy of the demo workbook in a window that nobody sees, for the tests of one file; none may change it."""
    book = tmp_path_factory.mktemp("orders") / BOOK.name
    shutil.copy(BOOK, book)
    document = calc.open(book, Hidden=False)
    with workers_ended(calc):
        yield document
        document.close(True)
