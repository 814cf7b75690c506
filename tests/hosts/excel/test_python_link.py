"""The one way from VBA to Python: which program is started, how, and what a workbook's name cannot do."""

from __future__ import annotations

import re

import pytest
from pyopenvba.interpreter import VBAObject, VBARuntimeError, method
from vba_world import Python, Workbook, as_compiled_on, running

from sheetfuncs.hosts.excel.folders import SCRIPT_NAME


class System(VBAObject):
    """What PythonLink asks of the system: a setting, a file, xlwings' library, Apple's scripts."""

    vba_type_name = "System"

    def __init__(self, python, settings, libraries):
        self.python, self.settings, self.libraries, self.asked = python, settings, libraries, []
        self.script_is_there = True

    @method(name="Setting")
    def setting(self, key):
        return self.settings[key]

    @method(name="LoadLibrary")
    def load_library(self, path):
        self.asked.append(path)
        return int(path in self.libraries)

    @method(name="Activate")
    def activate(self, command, mode):
        self.asked.append((command, int(mode)))
        return int(self.python is None)

    @method(name="Server")
    def server(self):
        return self.python

    @method(name="AppleScriptTask")
    def apple_script_task(self, script, handler, parameter):
        if not self.script_is_there:
            raise VBARuntimeError(5, "Invalid procedure call or argument")
        self.asked.append((script, handler, parameter))


PLAYED = """
Private Function Setting(ByVal key As String) As String
    Setting = System.Setting(key)
End Function
Private Sub RequireFile(ByVal path As String)
End Sub
Private Sub ForgetLog()
End Sub
Private Function LogPath() As String
    LogPath = "/Log"
End Function
Private Function LoadLibraryW(ByVal path As String) As Long
    LoadLibraryW = System.LoadLibrary(path)
End Function
Private Function StrPtr(ByVal text As String) As String
    StrPtr = text
End Function
Private Function XLPyDLLActivateAuto(ByRef answer As Variant, ByVal command As String, ByVal mode As Long) As Long
    XLPyDLLActivateAuto = System.Activate(command, mode)
    If XLPyDLLActivateAuto = 0 Then
        Set answer = System.Server()
    Else
        answer = "No Python." & vbLf & "Command: x"
    End If
End Function
Private Sub AppleScriptTask(ByVal script As String, ByVal handler As String, ByVal parameter As String)
    System.AppleScriptTask script, handler, parameter
End Sub
"""
INTERPRETERS = {"INTERPRETER_WIN": "C:\\my env\\Scripts\\python.exe"}


def link(system, *, python=None, libraries=(), book="orders.xlsx", settings=INTERPRETERS):
    """PythonLink as compiled on this system; what it asks of the system is answered by the test."""
    source = re.sub(r"(?m)^ *Private Declare .*$", "", as_compiled_on(system, "PythonLink"))
    source = re.sub(r"(?ms)^Private (Sub|Function) (RequireFile|ForgetLog|Setting|LogPath)\(.*?^End \1$", "", source)
    vba, excel = running(active=Workbook(book))
    excel.books["system"] = System(python, settings, libraries)
    vba.add_module(source + PLAYED, name="Link")
    return vba, excel.books["system"], excel


@pytest.mark.parametrize(("system", "bits"), [("Windows, 64 bits", 64), ("Windows, 32 bits", 32)])
@pytest.mark.parametrize("folder", ["C:\\my env\\Scripts", "C:\\my env"])
def test_python_is_started_by_its_whole_path_and_with_a_safe_module_path(system, bits, folder):
    python = Python()
    library = f"{folder}\\xlwings{bits}-0.37.8.dll"
    vba, asked, _ = link(system, python=python, libraries=[library])
    assert vba.run("Server", []) is python
    assert vba.run("Server", []) is python
    start = """"C:\\my env\\Scripts\\python.exe" -P -B -c "import xlwings; xlwings.serve('$(CLSID)')\""""
    loaded = [one for one in asked.asked if isinstance(one, str)]
    assert loaded == [f"C:\\my env\\Scripts\\xlwings{bits}-0.37.8.dll", library][: 1 + (folder == "C:\\my env")]
    assert asked.asked[len(loaded) :] == [(start, 1), (start, 1)]


def failure(vba, *call):
    with pytest.raises(VBARuntimeError) as caught:
        vba.run(*call)
    return caught.value.description


def test_a_missing_library_and_a_python_that_does_not_start_are_said_with_their_cure():
    vba, *_ = link("Windows, 64 bits", python=Python())
    sentence = failure(vba, "Server", [])
    assert sentence.startswith("The file xlwings64-0.37.8.dll does not stand beside Python, in C:\\my env\\Scripts.")
    vba, *_ = link("Windows, 64 bits", libraries=["C:\\my env\\xlwings64-0.37.8.dll"])
    sentence = failure(vba, "Server", [])
    assert sentence.startswith("Python could not be started (No Python. Command: x).")
    assert sentence.endswith('"sheetfuncs excel install" sets it up again.')


def test_on_windows_a_macro_gets_the_active_workbook_itself():
    python = Python()
    vba, _, excel = link("Windows, 64 bits", python=python, libraries=["C:\\my env\\xlwings64-0.37.8.dll"],
                         book="$(x) & `y` %PATH%.xlsx")  # fmt: skip
    vba.run("Perform", ["import m; m.f()"])
    assert python.statements == [
        ("xlwings._xlwindows", "BOOK_CALLER", excel.books["activeworkbook"]), "import m; m.f()",
    ]


def test_on_macos_a_macro_goes_through_the_script():
    book = "Ada's $(open x) `y` \"z\".xlsx"  # the script quotes it for the shell
    vba, asked, excel = link("macOS", book=book)
    vba.run("Perform", ["import m; m.f()"])
    ((script, handler, parameter),) = asked.asked
    assert (script, handler) == (SCRIPT_NAME, "VbaHandler")
    assert parameter.split("|") == ["", "", "import m; m.f()", book, "/Excel", ""]
    assert "at work" in excel.application.status


@pytest.mark.parametrize("name", ["a|b.xlsx", "a=b.xlsx"])
def test_on_macos_a_name_that_cannot_be_handed_on_is_refused(name):
    vba, asked, _ = link("macOS", book=name)
    sentence = failure(vba, "Perform", ["import m; m.f()"])
    assert sentence.startswith(f"The name of this workbook holds the character {name[1]}, with which")
    assert asked.asked == []


def test_on_macos_a_script_that_cannot_be_run_is_said_with_its_cure():
    vba, asked, excel = link("macOS")
    asked.script_is_there = False
    sentence = failure(vba, "Perform", ["import m; m.f()"])
    assert sentence.startswith("The script that starts Python could not be run.")
    assert excel.application.status == "busy"
