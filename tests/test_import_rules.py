"""Which module may import what: floors inside the package, third-party packages by folder, costly ones late.

A floor imports only from itself and from those listed before it. Costly packages take seconds to load; they are
imported inside functions, or for type checkers only.
"""

from __future__ import annotations

import ast
import subprocess
import sys
from collections.abc import Iterator
from graphlib import TopologicalSorter
from pathlib import Path
from typing import NamedTuple

import pytest

import sheetfuncs

PACKAGE = Path(sheetfuncs.__file__).parent
MODULES = sorted(PACKAGE.rglob("*.py"))

FLOORS = ["errors", "cells", "core", "judgement", "checking", "functions", "report", "workbook", "hosts", "cli"]
THIRD_PARTY = {
    "errors": set(),
    "cells": {"numpy"},
    "core": {"numpy", "scipy.fft", "scipy.linalg", "scipy.special", "threadpoolctl", "statsmodels"},
    "judgement": {"numpy", "scipy.special", "scipy.linalg"},
    "checking": {"numpy", "scipy", "pandas"},
    "functions": {"numpy"},
    "report": {"numpy", "xlsxwriter"},
    "workbook": {"numpy", "lxml", "python_calamine"},
    "hosts": {"numpy"},
    "hosts.excel": {"numpy", "xlwings", "pyopenvba"},
    "hosts.calc": {"numpy"},
    "hosts.calc.bridge": {"uno", "unohelper", "com", "org", "sheetfuncs_bridge"},  # inside LibreOffice
    "hosts.calc.extension_script": {"uno", "unohelper", "com"},
    "hosts.calc.protocol": set(),  # copied into LibreOffice's side too
    "cli": {"click"},
}
LATE_ONLY = {"statsmodels", "pandas", "xlwings", "scipy.stats"}
INSIDE_OFFICE = {"hosts.calc.bridge", "hosts.calc.extension_script", "hosts.calc.protocol"}  # without sheetfuncs
NEVER = {"xlwings.pro"}  # its licence is commercial


class Import(NamedTuple):
    name: str
    line: int
    late: bool


def imports(tree: ast.AST, late: bool = False) -> Iterator[Import]:
    """Every import in the tree, full dotted names; late: inside a function or for type checkers only."""
    for node in ast.iter_child_nodes(tree):
        if isinstance(node, ast.Import):
            yield from (Import(alias.name, node.lineno, late) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            base = "." * node.level + (node.module or "")
            yield from (Import(f"{base}.{alias.name}", node.lineno, late) for alias in node.names)
        elif isinstance(node, ast.Call) and ast.unparse(node.func).endswith(("import_module", "__import__")):
            name = ast.unparse(node.args[0])
            # A package may load its own modules at their first use.
            if not name.startswith(("f'{__name__}.", "f'{__package__}.")):
                yield Import(name.strip("'"), node.lineno, late)
        elif isinstance(node, ast.If) and "TYPE_CHECKING" in ast.unparse(node.test):
            yield from imports(ast.Module(node.body, []), late=True)
            yield from imports(ast.Module(node.orelse, []), late)
        else:
            yield from imports(node, late or isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda))


def within(name: str, packages: set[str]) -> bool:
    return any(name == package or name.startswith(package + ".") for package in packages)


def allowed_in(module: str) -> set[str]:
    """The third-party packages of the nearest folder, or of the module itself, that has an entry."""
    parts = module.split(".")
    names = (".".join(parts[:length]) for length in range(len(parts), 0, -1))
    return next((THIRD_PARTY[name] for name in names if name in THIRD_PARTY), set())


def broken_rules(module: str, source: str) -> list[str]:
    """One sentence for each import of this module (dotted, without the package's name) that breaks a rule."""
    top = module.split(".")[0]
    allowed = allowed_in(module)
    found = []
    for name, line, late in imports(ast.parse(source)):
        first, *inner = name.split(".")
        if first == "":
            found.append(f"{module}:{line} imports {name}: write the whole name")
        elif first == "sheetfuncs" and within(module, INSIDE_OFFICE):
            found.append(f"{module}:{line} imports {name}, which LibreOffice's own Python does not have")
        elif first == "sheetfuncs":
            if inner[0] in FLOORS and top in FLOORS and FLOORS.index(inner[0]) > FLOORS.index(top):
                found.append(f"{module}:{line} imports {name}, of a later floor")
        elif within(name, NEVER) or (first not in sys.stdlib_module_names and not within(name, allowed)):
            found.append(f"{module}:{line} imports {name}, which is not allowed in this folder")
        elif within(name, LATE_ONLY) and not late:
            found.append(f"{module}:{line} imports {name} at the top: import it inside the function that needs it")
    return found


def module_name(path: Path) -> str:
    parts = path.relative_to(PACKAGE).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def test_every_module_belongs_to_a_floor():
    assert {module_name(path).split(".")[0] for path in MODULES} - {""} <= set(FLOORS)


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_imports_keep_to_the_rules(path):
    assert broken_rules(module_name(path), path.read_text("utf-8")) == []


def test_modules_form_no_circle():
    paths = {module_name(path): path for path in MODULES if module_name(path)}
    needs: dict[str, set[str]] = {}
    for module, path in paths.items():
        names = [found.name for found in imports(ast.parse(path.read_text("utf-8")))]
        inner = {name.removeprefix("sheetfuncs.") for name in names if name.startswith("sheetfuncs.")}
        inner |= {name.rpartition(".")[0] for name in inner}  # from module import thing
        needs[module] = (inner & paths.keys()) - {module}
    TopologicalSorter(needs).prepare()  # raises CycleError, which names the circle


@pytest.mark.parametrize(
    ("module", "source", "sentence"),
    [
        ("core.fit", "from sheetfuncs.workbook import insert", "of a later floor"),
        ("cells", "def f():\n    import sheetfuncs.cli", "of a later floor"),
        ("core.fit", "from ..cells import block", "write the whole name"),
        ("core.fit", "from scipy import stats", "not allowed in this folder"),
        ("cells.block", "import scipy.special", "not allowed in this folder"),
        ("core.fit", "import statsmodels.api", "at the top"),
        ("core.fit", "def f():\n    import statsmodels.api", None),
        ("hosts.excel.book", "import xlwings", "at the top"),
        ("hosts.excel.book", "def f():\n    from xlwings import pro", "not allowed in this folder"),
        ("hosts.files", "def f():\n    import xlwings", "not allowed in this folder"),
        ("hosts.calc.worker", "import uno", "not allowed in this folder"),
        ("hosts.calc.bridge.ranges", "import numpy", "not allowed in this folder"),
        ("hosts.calc.bridge.ranges", "from sheetfuncs.cells import block", "does not have"),
        ("hosts.calc.bridge.ranges", "from com.sun.star.awt import XCallback", None),
        ("checking", "if TYPE_CHECKING:\n    import pandas", None),
        ("workbook.read", "import_module('requests')", "not allowed in this folder"),
        ("workbook.read", "import_module(name)", "not allowed in this folder"),
        ("checking", "from sheetfuncs import __version__", None),
    ],
)
def test_rules_find_what_they_are_for(module, source, sentence):
    found = broken_rules(module, source)
    assert (sentence is None and not found) or (sentence and sentence in found[0])


def loaded_after(program: str) -> set[str]:
    """The costly packages that a fresh interpreter has loaded after the program."""
    report = f"{program}\nimport sys\nprint(*({LATE_ONLY!r} & sys.modules.keys()))"
    run = subprocess.run([sys.executable, "-c", report], capture_output=True, text=True, cwd=PACKAGE.parent)
    assert run.returncode == 0, run.stderr
    return set(run.stdout.split())


def test_import_is_cheap():
    assert loaded_after("import sheetfuncs") == set()
    assert loaded_after("import scipy.stats") == {"scipy.stats"}  # so that the test above can fail


def test_first_answer_in_a_cell_is_cheap():
    program = (
        "import sheetfuncs\n"
        "rows = [[1.0], [2.5], [2.0], [4.5], [4.0], [6.5]]\n"
        "value = sheetfuncs.evaluate('FIT_DURBIN_WATSON', rows, [[float(i)] for i in range(6)])\n"
        "assert isinstance(value, float), value"
    )
    assert loaded_after(program) == set()
