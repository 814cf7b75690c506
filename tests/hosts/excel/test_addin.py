"""The built add-in as a package: reproducible, clean, complete, ours; and what it says of its own versions."""

from __future__ import annotations

import io
import posixpath
import re
import zipfile
from importlib.metadata import version
from pathlib import Path

import pytest
from lxml import etree
from openxml_audit import FileFormat, OpenXmlValidator

import sheetfuncs
from sheetfuncs.hosts.excel.addin import addin_versions, build_addin

RELATIONSHIPS = "{http://schemas.openxmlformats.org/package/2006/relationships}"
TYPES = "{http://schemas.openxmlformats.org/package/2006/content-types}"


@pytest.fixture(scope="module")
def addin(tmp_path_factory):
    path = tmp_path_factory.mktemp("addin") / "sheetfuncs.xlam"
    build_addin(path)
    return path


@pytest.fixture(scope="module")
def parts(addin):
    with zipfile.ZipFile(addin) as package:
        return {name: package.read(name) for name in package.namelist()}


def test_a_second_build_gives_the_same_bytes(addin):
    again = io.BytesIO()
    build_addin(again)
    assert again.getvalue() == addin.read_bytes()


def test_only_the_version_of_xlwings_that_was_asked_for_is_called(parts):
    other = io.BytesIO()
    build_addin(other, xlwings_version="0.99.1")
    with zipfile.ZipFile(other) as package:
        changed = {name for name in package.namelist() if package.read(name) != parts[name]}
    assert changed == {"xl/vbaProject.bin", "docProps/custom.xml"}


def test_the_audit_finds_nothing(addin):
    findings = OpenXmlValidator(FileFormat.OFFICE_2019).validate(addin)
    assert findings.is_valid, findings.errors


def test_every_part_has_a_content_type_and_every_relationship_a_target(parts):
    types = etree.fromstring(parts["[Content_Types].xml"])
    defaults = {one.get("Extension") for one in types.iter(f"{TYPES}Default")}
    overrides = {one.get("PartName").lstrip("/") for one in types.iter(f"{TYPES}Override")}
    names = parts.keys() - {"[Content_Types].xml"}
    assert overrides <= names
    assert all(name in overrides or name.rpartition(".")[2] in defaults for name in names)
    reached = set()
    for name, content in parts.items():
        if name.endswith(".rels"):
            base = posixpath.dirname(posixpath.dirname(name))
            for one in etree.fromstring(content).iter(f"{RELATIONSHIPS}Relationship"):
                assert one.get("TargetMode") is None
                reached.add(posixpath.normpath(posixpath.join(base, one.get("Target"))))
    assert reached == {name for name in names if not name.endswith(".rels")}


def test_it_is_an_addin_with_a_ribbon(parts):
    assert b"application/vnd.ms-excel.addin.macroEnabled.main+xml" in parts["[Content_Types].xml"]
    assert b"http://schemas.microsoft.com/office/2007/relationships/ui/extensibility" in parts["_rels/.rels"]


def test_author_and_texts_are_ours_and_no_place_of_a_machine_is_named(parts):
    core = parts["docProps/core.xml"].decode()
    assert re.findall(r"<(?:dc:creator|cp:lastModifiedBy)>([^<]*)<", core) == ["sheetfuncs", "sheetfuncs"]
    for name, content in parts.items():
        assert not re.search(rb"/home/|/root/|/tmp/|/Users/|\\Users\\", content), name
        if name != "xl/vbaProject.bin":  # which names, as every project does, where Windows keeps Office's libraries
            assert b":\\" not in content, name


def test_it_says_from_which_versions_it_was_built(addin):
    assert addin_versions(addin) == {
        "sheetfuncs": sheetfuncs.__version__, "xlwings": version("xlwings"), "pyopenvba": version("pyopenvba"),
    }


@pytest.mark.parametrize("content", [b"", b"no package", None])
def test_a_file_that_is_no_addin_of_ours_has_no_versions(tmp_path, content):
    path = tmp_path / "other.xlam"
    if content is not None:
        path.write_bytes(content)
    assert addin_versions(path) == {}


def test_another_package_has_no_versions():
    assert addin_versions(Path(__file__).parents[3] / "templates" / "kiln-energy-clean.xlsx") == {}


def test_xml_that_is_not_safe_gives_no_versions(tmp_path):
    path = tmp_path / "other.xlam"
    with zipfile.ZipFile(path, "w") as package:
        package.writestr("docProps/custom.xml", '<!DOCTYPE p [<!ENTITY e "x">]><p>&e;</p>')
    assert addin_versions(path) == {}
