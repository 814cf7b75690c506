"""All VBA modules of the add-in, by name: those written by hand, in the folder vba, and those made here."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from sheetfuncs.hosts.excel.folders import PROJECT, SCRIPT_NAME
from sheetfuncs.hosts.excel.vba_help import help_module
from sheetfuncs.hosts.excel.vba_wrappers import functions_module

_SOURCES = Path(__file__).parent / "vba"


@dataclass(frozen=True)
class Module:
    """One VBA module. source: without the header of attributes. kind "workbook": the code behind the workbook."""

    name: str
    source: str
    kind: Literal["module", "class", "workbook"]


def modules(xlwings_version: str) -> list[Module]:
    """The add-in's modules, in the order in which they stand in the project.

    xlwings_version: the version whose library the add-in calls; its file's name holds it.
    """
    return [
        Module("ThisWorkbook", _written("ThisWorkbook.cls"), "workbook"),
        Module("FitFunctions", functions_module(_written("answers.bas")), "module"),
        Module("FunctionHelp", help_module(), "module"),
        Module("RibbonActions", _written("RibbonActions.bas"), "module"),
        Module("PythonLink", _link(xlwings_version), "class"),
    ]


def _written(file: str) -> str:
    return (_SOURCES / file).read_text("ascii")


def _link(xlwings_version: str) -> str:
    source = _written("PythonLink.cls")
    for mark, text in {"xlwings_version": xlwings_version, "project": PROJECT, "script_name": SCRIPT_NAME}.items():
        source = source.replace(f"{{{mark}}}", text)
    return source
