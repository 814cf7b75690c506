"""What all tests share: how hypothesis runs, and skipping what needs a program that is not there."""

from __future__ import annotations

import os
import shutil

import pytest
from hypothesis import settings

# Tests run beside each other on few cores: a slow example is no failure. In CI the same examples every time.
settings.register_profile("sheetfuncs", deadline=None, derandomize="CI" in os.environ)
settings.load_profile("sheetfuncs")


def pytest_runtest_setup(item):
    if item.get_closest_marker("libreoffice") and shutil.which("soffice") is None:
        pytest.skip("the soffice program is not installed")
