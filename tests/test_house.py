"""The house keeps its shape: what stands at the top, how long a module is, docstrings, no traces of a machine."""

from __future__ import annotations

import ast
import re
import zipfile
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
TOP = {"README.md", "DEVELOPERS.md", "pyproject.toml", "sheetfuncs", "tests", "templates"}
MADE_BY_RUNNING = {"demo", "sheetfuncs-demo", "build", "dist", "venv", "__pycache__"}  # .gitignore names them too
MODULES = sorted((ROOT / "sheetfuncs").rglob("*.py"))
# Folders of this machine, whichever it is, and of machines like those on which such projects are built.
OWN_FOLDERS = "|".join(re.escape(str(folder)) for folder in (ROOT, Path.home()) if len(folder.parts) > 1)
MACHINE_FOLDER = re.compile(rf"(?<![\w.~])(?:{OWN_FOLDERS}|/(?:root|work|mnt|srv))/\w")


def texts() -> Iterator[tuple[str, str]]:
    """(where, text) of every text file of the project, and of the parts inside its workbooks."""
    folders = [ROOT / name for name in ("sheetfuncs", "tests", "templates", ".ci", ".deploy")]
    files = [path for folder in folders for path in folder.rglob("*")] + list(ROOT.glob("*.*"))
    for path in files:
        if not path.is_file() or "__pycache__" in path.parts or path == Path(__file__):
            continue
        if zipfile.is_zipfile(path):
            with zipfile.ZipFile(path) as package:
                parts = [name for name in package.namelist() if name.endswith((".xml", ".rels", ".vml"))]
                yield from ((f"{path}: {name}", package.read(name).decode("utf-8", "replace")) for name in parts)
        else:
            yield str(path), path.read_bytes().decode("utf-8", "replace")


def test_top_level_holds_nothing_else():
    names = {path.name for path in ROOT.iterdir() if not path.name.startswith(".")}
    assert {name for name in names - TOP - MADE_BY_RUNNING if not name.endswith(".egg-info")} == set()


def test_no_file_names_a_folder_of_some_machine():
    found = [(where, hit.group()) for where, text in texts() for hit in MACHINE_FOLDER.finditer(text)]
    assert found == []


def test_folder_pattern_finds_what_it_is_for():
    assert MACHINE_FOLDER.search(f'open("{ROOT / "book.xlsx"}")')
    assert MACHINE_FOLDER.search("cd /mn" + "t/builds")
    assert not MACHINE_FOLDER.search("xl/wo" + "rk/sheet1.xml")


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_module_is_short_and_explained(path):
    source = path.read_text("utf-8")
    assert source.count("\n") < 500, "Does it hold two subjects?"
    tree = ast.parse(source)
    public = [
        node for node in tree.body
        if isinstance(node, ast.FunctionDef | ast.ClassDef) and not node.name.startswith("_")
    ]
    assert [node.name for node in public if not ast.get_docstring(node)] == []
    assert ast.get_docstring(tree)
