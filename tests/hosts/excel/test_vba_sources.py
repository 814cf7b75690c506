"""The VBA in the add-in: read back by olevba as it was written, within the editor's limits, open to no workbook.

The limits are Microsoft's, from memory (see sheetfuncs/hosts/excel/vba_text.py).
"""

from __future__ import annotations

import importlib
import re
import subprocess
import sys

import pytest

from sheetfuncs.cells.block import ERROR_TEXTS
from sheetfuncs.functions.registry import REGISTRY
from sheetfuncs.hosts.excel import folders, functions, macros
from sheetfuncs.hosts.excel.addin import PROJECT_NAME, build_addin
from sheetfuncs.hosts.excel.ribbon import BUTTONS
from sheetfuncs.hosts.excel.vba_project import modules
from sheetfuncs.hosts.excel.vba_text import (
    LONGEST_HELP,
    LONGEST_LINE,
    MOST_CONTINUATIONS,
    RESERVED,
    identifier,
    literal,
)
from sheetfuncs.hosts.excel.vba_wrappers import NAMED_IN_VBA

VERSION = "0.37.8"
MODULES = {module.name: module for module in modules(VERSION)}
CODE = {name: re.sub(r"(?m)^\s*'.*$", "", module.source) for name, module in MODULES.items()}
EVERYTHING = "\n".join(CODE.values())
PROCEDURE = re.compile(r"(?ms)^(Public|Private) (Sub|Function) (\w+)\((.*?)\).*?^End \2$")

READER = """
import sys, warnings
warnings.simplefilter("ignore")
from oletools.olevba import VBA_Parser
for _, stream, _, code in VBA_Parser(sys.argv[1]).extract_macros():
    print("\\x1e", stream, "\\x1f", code, end="")
"""


def procedures(name):
    return {found[3]: found for found in PROCEDURE.finditer(CODE[name])}


@pytest.fixture(scope="module")
def read_back(tmp_path_factory):
    """Every module as olevba finds it, without its header of attributes."""
    path = tmp_path_factory.mktemp("addin") / "sheetfuncs.xlam"
    build_addin(path, xlwings_version=VERSION)
    run = subprocess.run([sys.executable, "-c", READER, path], capture_output=True, text=True, check=True)
    found = dict(piece.split("\x1f") for piece in run.stdout.split("\x1e")[1:])
    return {
        stream.strip().removeprefix("VBA/"): re.sub(r"(?m)^ ?Attribute VB_.*\n", "", code).strip("\n ")
        for stream, code in found.items()
    }


def test_another_reader_finds_every_module_as_written(read_back):
    assert read_back == {"Sheet1": ""} | {name: module.source.strip("\n") for name, module in MODULES.items()}


def test_the_project_has_its_own_name_and_no_name_twice():
    names = [PROJECT_NAME.lower(), *(name.lower() for name in MODULES)]
    assert len(set(names)) == len(names)
    public = [name.lower() for module in MODULES for name, found in procedures(module).items()
              if found[1] == "Public" and MODULES[module].kind != "class"]
    assert len({*public, *names}) == len(public) + len(names)


@pytest.mark.parametrize("name", MODULES)
def test_sources_are_plain_declared_and_within_the_limits(name):
    source = MODULES[name].source
    assert source.isascii()
    assert source.startswith("Option Explicit\n")
    lines = source.split("\n")
    assert max(map(len, lines)) < LONGEST_LINE
    assert not any("\t" in line for line in lines)
    runs = re.split(r"(?m)^.*[^_\n]$|^$", source)
    assert max(run.count(" _\n") for run in runs) <= MOST_CONTINUATIONS
    assert all(len(found.group()) < 30_000 for found in procedures(name).values())
    assert not re.search(r"(?m)^\s*#(If|Else|ElseIf|End If).*'", source)  # a comment there stops other readers
    assert source.count("#If ") == source.count("#End If")


def test_identifiers_are_legal_and_no_word_of_the_language():
    named = set(re.findall(r"\b(?:Dim|ByVal|ByRef|,) (\w+)(?:\(\))? As\b", EVERYTHING))
    named |= {name for module in MODULES for name in procedures(module)}
    assert len(named) > 60
    assert all(re.fullmatch(r"[A-Za-z]\w{0,250}", name) for name in named)
    assert not {name.lower() for name in named} & RESERVED


def test_an_argument_with_a_reserved_name_gets_another():
    """Breusch-Pagan's argument `variant` would be taken for the type of that name."""
    assert identifier("variant") == "which_variant"
    assert "Optional ByVal which_variant As Variant" in CODE["FitFunctions"]
    assert identifier("level") == "level"


def test_library_calls_work_on_32_and_64_bits():
    declares = [line.strip() for line in CODE["PythonLink"].split("\n") if " Declare " in line]
    assert len(declares) == 4
    assert all(line.startswith("Private Declare PtrSafe Function ") for line in declares)
    assert sum(f'Lib "xlwings64-{VERSION}.dll"' in line for line in declares) == 1
    assert sum(f'Lib "xlwings32-{VERSION}.dll"' in line for line in declares) == 1
    assert not re.search(r"StrPtr|VarPtr", EVERYTHING.replace("LoadLibraryW(StrPtr(", ""))


def test_there_is_a_wrapper_for_every_function_with_its_arguments():
    wrappers = {name: found for name, found in procedures("FitFunctions").items() if found[1] == "Public"}
    assert list(wrappers) == list(REGISTRY)
    for name, function in REGISTRY.items():
        parameters = re.findall(r"(Optional )?ByVal (\w+) As Variant", wrappers[name][4])
        assert parameters == [("Optional " if a.optional else "", identifier(a.name)) for a in function.arguments]
        arguments = ", ".join(identifier(argument.name) for argument in function.arguments)
        assert f'Server().CallUDF(PYTHON_MODULE, "{name}", Array({arguments}))' in wrappers[name].group()
        assert wrappers[name].group().rstrip().endswith(f"Failed:\n    {name} = CVErr(xlErrValue)\nEnd Function")


def test_every_python_name_in_the_vba_exists():
    module = re.search(r'PYTHON_MODULE As String = "([\w.]+)"', CODE["FitFunctions"])[1]
    assert importlib.import_module(module) is functions
    assert all(callable(getattr(functions, name)) for name in re.findall(r'PYTHON_MODULE, "(\w+)"', EVERYTHING))
    statements = re.findall(r'"import ([\w.]+); ([\w.]+)\.(\w+)\(\)"', CODE["RibbonActions"])
    assert [one[2] for one in statements] == list(macros.MACROS)
    assert all(one[0] == one[1] == macros.__name__ and callable(getattr(macros, one[2])) for one in statements)


def test_every_button_has_its_sub():
    subs = procedures("RibbonActions")
    for button in BUTTONS:
        assert subs[button.action].group(1, 2, 4) == ("Public", "Sub", "ByVal control As IRibbonControl")


def test_a_cell_can_call_nothing_but_our_functions():
    """Formulas of every open workbook can call the public functions of ordinary modules, but no sub and no class."""
    for name, module in MODULES.items():
        public = {one for one, found in procedures(name).items() if found.group(1, 2) == ("Public", "Function")}
        assert public == (set(REGISTRY) if name == "FitFunctions" else set()) or module.kind == "class"
    assert not re.search(r"(?m)^(Function|Sub) ", EVERYTHING)  # without a word before it, it would be public


def test_no_workbook_has_a_say_in_what_runs():
    assert not re.search(r"(?i)\.conf\"|Sheets\(|Worksheets|\.Range\(|Evaluate|Application\.Run|Shell|CreateObject|"
                         r"PYTHONPATH|CurDir|\.Path\b(?! & \"\|\")", EVERYTHING.replace('.conf"\n', "\n"))
    assert EVERYTHING.count(".conf\"") == 1
    assert re.findall(r'[^.]Setting\("(\w+)"\)', EVERYTHING) == ["INTERPRETER_WIN"]
    # The active workbook is handed over as an object, or by its checked name on macOS, and nothing of it is read.
    uses = re.findall(r"ActiveWorkbook\S*(?: Is Nothing)?", EVERYTHING)
    assert {use.rstrip(",") for use in uses} == {"ActiveWorkbook", "ActiveWorkbook Is Nothing", "ActiveWorkbook.Name"}
    assert " -P -B -c " in CODE["PythonLink"]


def test_settings_and_script_are_where_the_installation_puts_them():
    assert f'"\\.{folders.PROJECT}\\{folders.PROJECT}.conf"' in CODE["PythonLink"]
    assert f'"/{folders.PROJECT}.log"' in CODE["PythonLink"]
    assert f'AppleScriptTask "{folders.SCRIPT_NAME}"' in CODE["PythonLink"]


def test_every_error_text_becomes_an_error_value():
    named = set(re.findall(r'"(#[^"]+)"', CODE["FitFunctions"]))
    assert named == ERROR_TEXTS
    assert set(NAMED_IN_VBA) <= ERROR_TEXTS


def test_help_is_within_excels_limit():
    texts = [function.summary for function in REGISTRY.values()]
    texts += [argument.help for function in REGISTRY.values() for argument in function.arguments]
    assert max(map(len, texts)) <= LONGEST_HELP
    assert all(literal(text) in CODE["FunctionHelp"] for text in texts)


@pytest.mark.parametrize(
    ("text", "expression"),
    [
        ("plain", '"plain"'),
        ('say "no"', '"say ""no"""'),
        ("n ≥ 2", '"n " & ChrW(8805) & " 2"'),
        ("µ", "ChrW(181)"),
        ("two\nlines", '"two" & ChrW(10) & "lines"'),
        ("", '""'),
    ],
)
def test_texts_are_written_in_plain_letters(text, expression):
    assert literal(text) == expression
