"""Our VBA compiled and run by LibreOffice, from formulas in cells: a second opinion beside pyopenvba's interpreter.

LibreOffice shows an error value of VBA as "Error" and its number. The Python process is played by a class in VBA.
"""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import zipfile
from pathlib import Path
from xml.sax.saxutils import escape

import pytest
from vba_world import MODULES

READER = Path(__file__).with_name("cells_by_libreoffice.py")
WITH_UNO = next((path for path in ("/usr/bin/python3", shutil.which("python3") or "") if path), "")

PLAYED_LINK = """Option Explicit
Public Function Server() As Object
    Set Server = New PlayedPython
End Function
"""
PLAYED_PYTHON = """Option Explicit
Public Function CallUDF(ByVal moduleName As String, ByVal functionName As String, ByVal given As Variant) As Variant
    Dim table(0 To 1, 0 To 1) As Variant
    Select Case functionName
        Case "FIT_ROWS"
            table(0, 0) = "head"
            table(0, 1) = 2.5
            table(1, 0) = "#N/A"
            table(1, 1) = "#NUM!"
            CallUDF = table
        Case "FIT_BOX_COX"
            CallUDF = Array(1.5, "#DIV/0!", "term")
        Case "FIT_RESIDUAL_MEAN"
            Err.Raise 1004, , "Traceback (most recent call last)"
        Case "FIT_VIF"
            CallUDF = UBound(given) + 1
        Case Else
            CallUDF = given(0).Value
    End Select
End Function
"""
READ_SETTING = """
Public Function READ_SETTING(ByVal key As Variant) As Variant
    On Error GoTo Failed
    READ_SETTING = Setting(CStr(key))
    Exit Function
Failed:
    READ_SETTING = Err.Description
End Function
"""
# Cells by row: a value, or a formula; a formula with a range after it is an array formula.
CELLS = [
    ["#N/A", "=FIT_PRESS(A1,A1)", "=FIT_WHY(A1,A1)", ("=FIT_ROWS(A1,A1)", "D1:E2"), None],
    ["#NUM!", "=FIT_PRESS(A2,A2)", "=FIT_WHY(A2,A2)", None, None],
    ["ok, so far", "=FIT_PRESS(A3,A3)", "=FIT_WHY(A3,A3)", "=FIT_RESIDUAL_MEAN(A1,A1)", "=FIT_VIF(A1)"],
    [2.5, "=FIT_PRESS(A4,A4)", "=FIT_WHY(A4,A4)", None, None],
    ["#SPILL!", "=FIT_PRESS(A5,A5)", ("=FIT_BOX_COX(A1,A1)", "C5:E5"), None, None],
    ["=READ_SETTING(\"INTERPRETER_WIN\")", "=READ_SETTING(\"NOT_THERE\")", None, None, None],
]
SHOWN = [
    ["#N/A", "Error 2042", "Error 2042", "head", "2.5"],
    ["#NUM!", "Error 2036", "Error 2036", "Error 2042", "Error 2036"],
    ["ok, so far", "Error 2015", "ok, so far", "Error 2015", "3"],
    ["2.5", "2.5", "2.5", "", ""],
    ["#SPILL!", "Error 2015", "1.5", "Error 2007", "term"],
]


ALWAYS_CALCULATE = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema">
<item oor:path="/org.openoffice.Office.Calc/Formula/Load"><prop oor:name="OOXMLRecalcMode" oor:op="fuse">
<value>0</value></prop></item></oor:items>"""


def cell_xml(place, content):
    if isinstance(content, tuple):
        return f'<c r="{place}"><f t="array" ref="{content[1]}">{escape(content[0][1:])}</f></c>'
    if isinstance(content, str) and content.startswith("="):
        return f'<c r="{place}"><f>{escape(content[1:])}</f></c>'
    if isinstance(content, str):
        return f'<c r="{place}" t="inlineStr"><is><t>{escape(content)}</t></is></c>'
    return f'<c r="{place}"/>' if content is None else f'<c r="{place}"><v>{content}</v></c>'


def row_xml(row, cells):
    inside = "".join(cell_xml(f"{column}{row}", cell) for column, cell in zip("ABCDE", cells, strict=True))
    return f'<row r="{row}">{inside}</row>'


def sheet_xml():
    rows = "".join(row_xml(row, cells) for row, cells in enumerate(CELLS, start=1))
    return (
        '<?xml version="1.0" encoding="UTF-8"?><worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main">'
        f'<sheetPr codeName="Sheet1"/><sheetData>{rows}</sheetData></worksheet>'
    )


def setting_module():
    """What PythonLink reads the user's file with, in an ordinary module, with this system's sign between folders."""
    source = MODULES["PythonLink"].source
    constants = source[source.index("Private Const REFUSED") : source.index("#If Mac Then")]
    reading = source[source.index("Private Function Setting") : source.index("#End If\n\nPublic Sub Perform")]
    return "Option Explicit\n" + constants + reading.replace('"\\.', '"/.').replace("\\sheet", "/sheet") + READ_SETTING


def write_book(path):
    from pyopenvba import ExcelFile, VBAModuleKind

    added = {
        "FitFunctions": (MODULES["FitFunctions"].source, VBAModuleKind.standard),
        "Settings": (setting_module(), VBAModuleKind.standard),
        "FunctionHelp": (MODULES["FunctionHelp"].source, VBAModuleKind.standard),
        "RibbonActions": (MODULES["RibbonActions"].source, VBAModuleKind.standard),
        "TrueLink": (MODULES["PythonLink"].source, VBAModuleKind.other),
        "PythonLink": (PLAYED_LINK, VBAModuleKind.other), "PlayedPython": (PLAYED_PYTHON, VBAModuleKind.other),
    }
    with ExcelFile.create_new(path) as book:
        for name, (source, kind) in added.items():
            book.vba_project().add_module(name, source.replace("\n", "\r\n"), kind=kind)
        book.save()
    with zipfile.ZipFile(path) as package:
        parts = {name: package.read(name) for name in package.namelist()}
    parts["xl/worksheets/sheet1.xml"] = sheet_xml().encode()
    with zipfile.ZipFile(path, "w") as package:
        for name, content in parts.items():
            package.writestr(name, content)


def has_uno():
    return bool(WITH_UNO) and subprocess.run([WITH_UNO, "-c", "import uno"], capture_output=True).returncode == 0


@pytest.mark.libreoffice
@pytest.mark.skipif(not has_uno(), reason="no Python here has LibreOffice's module uno")
def test_formulas_in_cells_get_what_the_wrappers_promise(tmp_path):
    book, home = tmp_path / "book.xlsm", tmp_path / "home"
    write_book(book)
    (tmp_path / "profile" / "user").mkdir(parents=True)
    (tmp_path / "profile" / "user" / "registrymodifications.xcu").write_text(ALWAYS_CALCULATE)
    (home / ".sheetfuncs").mkdir(parents=True)
    (home / ".sheetfuncs" / "sheetfuncs.conf").write_bytes(
        b'"INTERPRETER_WIN","C:\\my env, (2)\\python.exe"\r\n"ADD_WORKBOOK_TO_PYTHONPATH","False"\r\n'
    )
    run = subprocess.run(
        [WITH_UNO, READER, book, tmp_path / "profile", str(len(CELLS)), "5"], capture_output=True, text=True,
        env={**os.environ, "USERPROFILE": str(home)}, timeout=120,
    )
    assert run.returncode == 0, run.stderr
    *shown, settings = json.loads(run.stdout)
    assert shown == SHOWN
    assert settings[0] == "C:\\my env, (2)\\python.exe"
    file = f"{home}/.sheetfuncs/sheetfuncs.conf"
    assert settings[1].startswith(f"The file {file} is not there or does not hold NOT_THERE.")
