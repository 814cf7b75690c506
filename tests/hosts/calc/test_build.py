"""The extension file: the same bytes each time, all functions of the registry, only what LibreOffice can load."""

from __future__ import annotations

import ast
import io
import json
import re
import zipfile
from pathlib import Path
from xml.etree import ElementTree

import pytest

from sheetfuncs.functions.registry import REGISTRY
from sheetfuncs.hosts.calc.build import SOURCES, build_extension, gives_matrix, method_name, programmatic_name

OOR = "{http://openoffice.org/2001/registry}"


@pytest.fixture(scope="module")
def parts():
    with zipfile.ZipFile(io.BytesIO(build_extension({"interpreter": "/some/python"}))) as package:
        return {name: package.read(name).decode() for name in package.namelist()}


def test_bytes_are_the_same_each_time():
    assert build_extension({"a": 1, "b": 2}) == build_extension({"b": 2, "a": 1})
    assert build_extension({"a": 1}) != build_extension({"a": 2})


def test_every_part_that_the_manifest_names_is_there(parts):
    manifest = ElementTree.fromstring(parts["META-INF/manifest.xml"])
    names = [value for entry in manifest for key, value in entry.attrib.items() if key.endswith("full-path")]
    assert len(names) == len(set(names)) == 7
    assert set(names) <= set(parts)


def test_every_function_is_declared_described_and_callable(parts):
    lines = re.findall(r"^  (\S.*) (fit\w+)\(", parts["functions.idl"], re.MULTILINE)
    declared = {method: kind for kind, method in lines}
    described = ElementTree.fromstring(parts["CalcAddIns.xcu"])
    nodes = {node.get(f"{OOR}name") for node in described.iter("node")}
    listed = {one["name"]: one for one in json.loads(parts["functions.json"])}
    assert set(listed) == set(REGISTRY)
    for name, function in REGISTRY.items():
        method = method_name(name)
        assert listed[name] == {"name": name, "method": method, "matrix": gives_matrix(function)}
        assert declared[method] == ("sequence< sequence<any> >" if gives_matrix(function) else "any")
        assert method in nodes
    assert len({method_name(name) for name in REGISTRY}) == len(REGISTRY)


def test_names():
    assert method_name("FIT_DURBIN_WATSON_P") == "fitDurbinWatsonP"
    assert programmatic_name("FIT_VIF") == "org.sheetfuncs.calc.Functions.fitVif"


def test_descriptions_carry_special_characters(parts):
    for name in (name for name in parts if name.endswith((".xcu", ".xml"))):
        ElementTree.fromstring(parts[name])
    texts = {value.text for value in ElementTree.fromstring(parts["CalcAddIns.xcu"]).iter("value")}
    assert {function.summary for function in REGISTRY.values()} <= texts


def test_every_module_of_the_bridge_is_in_the_extension_under_its_package(parts):
    modules = {path.name for path in (SOURCES / "bridge").glob("*.py")} - {"component.py"} | {"protocol.py"}
    assert {f"pythonpath/sheetfuncs_bridge/{name}" for name in modules} <= set(parts)
    assert {name.rpartition("/")[0] for name in parts} == {"", "META-INF", "pythonpath/sheetfuncs_bridge"}
    assert "component.py" in parts


@pytest.mark.parametrize(
    "path", [*sorted((SOURCES / "bridge").glob("*.py")), SOURCES / "protocol.py", SOURCES / "extension_script.py"],
    ids=lambda path: path.name,
)
def test_python_of_other_systems_can_read_it(path: Path):
    """LibreOffice brings a Python of its own, 3.8 or later; this finds syntax that 3.8 does not have."""
    ast.parse(path.read_text("utf-8"), feature_version=(3, 8))
