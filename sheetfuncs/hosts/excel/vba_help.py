"""The VBA module that tells Excel what each function and each argument is for."""

from __future__ import annotations

from sheetfuncs.functions.registry import REGISTRY, WorksheetFunction
from sheetfuncs.hosts.excel.vba_text import in_lines, literal

CATEGORY = "sheetfuncs"
"""Under this name the functions stand together in Excel's list of functions."""

HEADING = f"""Option Explicit

' Help texts for Excel's list of functions and its window for arguments. A sub, and private functions: no cell can
' call anything of this.
#If Mac Then
#Else

Private Const CATEGORY As String = {literal(CATEGORY)}

Private Sub Describe(ByVal name As String, ByVal summary As String, ByVal arguments As Variant)
    Application.MacroOptions Macro:="'" & ThisWorkbook.Name & "'!" & name, Description:=summary, _
        Category:=CATEGORY, ArgumentDescriptions:=arguments
End Sub
"""


def help_module() -> str:
    """The module's source: `DescribeFunctions`, and a sub for each group of functions."""
    groups = list(dict.fromkeys(function.group for function in REGISTRY.values()))
    calls = "\n".join(f"    {_sub_name(group)}" for group in groups)
    everything = f"Public Sub DescribeFunctions()\n{calls}\nEnd Sub\n"
    return "\n".join([HEADING, everything, *map(_group_sub, groups), "#End If"]) + "\n"


def _sub_name(group: str) -> str:
    return "Describe" + "".join(word.capitalize() for word in group.split())


def _group_sub(group: str) -> str:
    calls = [_call(function) for function in REGISTRY.values() if function.group == group]
    return f"Private Sub {_sub_name(group)}()\n" + "\n".join(calls) + "\nEnd Sub\n"


def _call(function: WorksheetFunction) -> str:
    helps = [literal(argument.help) for argument in function.arguments]
    return "    " + in_lines(f"Describe {literal(function.name)}, {literal(function.summary)}, Array(", helps, ")")
