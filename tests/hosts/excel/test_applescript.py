"""The script that macOS starts Python with: what it knows, and what it never hands on."""

from __future__ import annotations

from pathlib import Path

from sheetfuncs.hosts.excel import macros
from sheetfuncs.hosts.excel.applescript import script_text, statements
from sheetfuncs.hosts.excel.folders import SCRIPT_NAME
from sheetfuncs.hosts.excel.vba_project import modules


def test_script_knows_every_button_and_nothing_else(tmp_path):
    assert statements() == [
        f"import sheetfuncs.hosts.excel.macros; sheetfuncs.hosts.excel.macros.{name}()" for name in macros.MACROS
    ]
    script = script_text("/Users/ida/venv/bin/python", Path("/Users/ida/log"))
    assert all(f'"{statement}"' in script for statement in statements())
    assert script.count("do shell script") == 1
    assert script.count("import ") == len(macros.MACROS)


def test_script_is_the_one_that_the_add_in_asks_for():
    link = next(module for module in modules("0.1") if module.name == "PythonLink")
    assert f'AppleScriptTask "{SCRIPT_NAME}", "VbaHandler"' in link.source
    assert link.source.count("AppleScriptTask") == 1


def test_script_holds_plain_letters_only():
    script = script_text('/Users/Jürgen "J"/venv\\x/bin/python', Path("/Users/Jürgen/log"))
    assert script.isascii()
    assert r'("/Users/J" & (character id 252) & "rgen \"J\"/venv\\x/bin/python")' in script


def test_script_hands_no_name_to_the_shell_without_quotes():
    script = script_text("/python", Path("/log"))
    fields = [line.strip() for line in script.splitlines() if " of theFields" in line]
    assert fields == [
        'if (count of theFields) is not 6 then error "The name of this workbook cannot be handed to Python."',
        "set theStatement to item 3 of theFields",
        'set bookOption to quoted form of ("--wb=" & item 4 of theFields)',
        'set applicationOption to quoted form of ("--app=" & item 5 of theFields)',
    ]


# What an installation reaches.
