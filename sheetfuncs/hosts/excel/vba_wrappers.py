"""The VBA module with the worksheet functions: one public function for each entry of the registry."""

from __future__ import annotations

from sheetfuncs.cells.block import ERROR_TEXTS
from sheetfuncs.functions.registry import REGISTRY, Argument, WorksheetFunction
from sheetfuncs.hosts.excel.vba_text import identifier, in_lines, literal

PYTHON_MODULE = "sheetfuncs.hosts.excel.functions"
# Only these exist in every version of Excel; the newer ones become #VALUE!.
NAMED_IN_VBA = ("#N/A", "#NUM!", "#VALUE!", "#REF!", "#NAME?", "#DIV/0!", "#NULL!")

HEADING = f"""Option Explicit

' The worksheet functions, made from the list of functions in sheetfuncs. Excel for macOS has no way to call them:
' there they stay unknown, and cells keep the values that were stored with them.
#If Mac Then
#Else

Private Const PYTHON_MODULE As String = "{PYTHON_MODULE}"

Private mLink As PythonLink
"""


def functions_module(answers: str) -> str:
    """The module's source: a wrapper for each function, then `answers`, which turns answers into cells."""
    wrappers = [wrapper(function) for function in REGISTRY.values()]
    others = ", ".join(literal(text) for text in sorted(ERROR_TEXTS.difference(NAMED_IN_VBA)))
    return "\n".join([HEADING, *wrappers, answers.replace("{other_errors}", others).rstrip(), "#End If"]) + "\n"


def wrapper(function: WorksheetFunction) -> str:
    """The VBA function of this name: it hands its arguments on as they are, and never shows more than an error value.

    An omitted argument reaches Python as omitted. The workbook and the calling cell are not handed over: no answer
    depends on them, and xlwings would look into the workbook for Python of its own.
    """
    name = function.name
    given = f"Array({', '.join(identifier(argument.name) for argument in function.arguments)})"
    may_be_text = "True" if function.returns == "text" else "False"
    return (
        in_lines(f"Public Function {name}(", map(_parameter, function.arguments), ") As Variant")
        + f"""
    On Error GoTo Failed
    {name} = ForCell(Server().CallUDF(PYTHON_MODULE, "{name}", {given}), {may_be_text})
    Exit Function
Failed:
    {name} = CVErr(xlErrValue)
End Function
"""
    )


def _parameter(argument: Argument) -> str:
    return f"{'Optional ' if argument.optional else ''}ByVal {identifier(argument.name)} As Variant"
