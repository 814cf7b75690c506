"""One LibreOffice for all tests of a process, in a private profile with the extension installed."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import pytest
from office import Calc, installed_profile, load_uno


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
