"""One build of the add-in for all tests of its installation."""

import io

import pytest

from sheetfuncs.hosts.excel import addin_file
from sheetfuncs.hosts.excel.addin import build_addin


@pytest.fixture(scope="session")
def built() -> bytes:
    file = io.BytesIO()
    build_addin(file)
    return file.getvalue()


@pytest.fixture
def built_once(monkeypatch, built):
    """Every build gives the same bytes (test_addin.py), so one does for all installations."""
    monkeypatch.setattr(addin_file, "build_addin", lambda file: file.write(built))
