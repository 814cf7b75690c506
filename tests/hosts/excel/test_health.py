"""Health: every trouble is brought about once, is said with its cause, and is gone once its cure was followed."""

from __future__ import annotations

import io
import json
import os
import sys
import zipfile
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest
from fake_homes import DLLS, VERSIONS, mac, place_on, windows

from sheetfuncs import __version__
from sheetfuncs.errors import InstallError
from sheetfuncs.hosts.excel import health, marks
from sheetfuncs.hosts.excel.folders import Place, find_place
from sheetfuncs.hosts.excel.health import BESIDE, headline, health_text
from sheetfuncs.hosts.excel.install import install
from sheetfuncs.hosts.excel.swapping import WAITING
from sheetfuncs.hosts.findings import Finding, finding_lines

pytestmark = pytest.mark.usefixtures("built_once")

SYSTEMS = ["Windows", "macOS"]
ASK_THE_SYSTEM = marks._has_attribute
PARTS = [
    "Python", "Packages", "The add-in", "The add-in's version", "The configuration",
    "The connection from Excel to Python", "The mark of a download", "Left-over files", "The list of installed files",
]


@pytest.fixture(autouse=True)
def quarantined(monkeypatch) -> set[Path]:
    """The files that carry macOS's mark; a new file at the same path does not, as it is another file."""
    marked: dict[Path, int] = {}

    class Marked(set):
        def add(self, path: Path) -> None:
            marked[path] = path.stat().st_ino

    def has(path: Path, name: str) -> bool:
        assert name == "com.apple.quarantine"
        return marked.get(path) == path.stat().st_ino

    monkeypatch.setattr(marks, "_has_attribute", has)
    return Marked()


def troubles(place: Place) -> dict[str, Finding]:
    return {finding.what: finding for finding in health.health(place) if not finding.ok}


def trouble(place: Place, what: str) -> Finding:
    """The only trouble there is, which must be this one, explained by one sentence of cause and one of cure."""
    found = troubles(place)
    assert list(found) == [what]
    assert found[what].found.endswith(".")
    assert found[what].cure
    return found[what]


def with_version(content: bytes, version: str) -> bytes:
    file = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(file, "w") as new:
        for name in old.namelist():
            data = old.read(name)
            new.writestr(name, data.replace(f">{__version__}<".encode(), f">{version}<".encode()))
    return file.getvalue()


@pytest.mark.parametrize("system", SYSTEMS)
def test_after_an_installation_all_is_in_order(tmp_path, system):
    place = place_on(system, tmp_path)
    install(place)
    findings = health.health(place)
    assert [finding.what for finding in findings] == PARTS
    assert [finding for finding in findings if not finding.ok or finding.cure] == []
    assert headline(findings) == "Everything that can be seen from outside Excel is in place."


@pytest.mark.parametrize("system", SYSTEMS)
def test_before_an_installation_what_is_missing_is_said_and_install_cures_it(tmp_path, system):
    place = place_on(system, tmp_path)
    found = troubles(place)
    missing = {"The add-in", "The add-in's version", "The configuration", "The list of installed files"}
    assert set(found) == missing | ({"The connection from Excel to Python"} if system == "macOS" else set())
    assert all("lose Excel and run `sheetfuncs excel install`" in finding.cure for finding in found.values())
    assert found["The add-in"].cure == "Close Excel and run `sheetfuncs excel install`."
    assert headline(list(found.values())).startswith(f"{len(found)} of {len(found)} parts need attention")
    install(place)
    assert troubles(place) == {}


@pytest.mark.parametrize("system", SYSTEMS)
def test_python_that_is_gone(tmp_path, system):
    place = place_on(system, tmp_path)
    gone = tmp_path / "old" / "python.exe"
    install(find_place(replace(place.environment, executable=str(gone))))
    found = troubles(place)
    assert str(gone) in found["Python"].found
    assert str(gone) in found["The configuration"].found
    assert "`sheetfuncs excel install`" in found["Python"].cure
    install(place)
    assert troubles(place) == {}


@pytest.mark.parametrize("system", SYSTEMS)
@pytest.mark.parametrize("missing", ["sheetfuncs", "numpy"])
def test_missing_package(tmp_path, system, missing):
    place = place_on(system, tmp_path)
    install(place)
    versions = {name: found for name, found in VERSIONS.items() if name != missing}
    poor = replace(place, environment=replace(place.environment, package_version=versions.get))
    finding = trouble(poor, "Packages")
    assert f"{missing} (missing)" in finding.found
    wanted = {"sheetfuncs": "sheetfuncs", "numpy": "numpy>=1.26"}[missing]
    assert finding.cure == f'Run "{place.interpreter}" -m pip install --upgrade "{wanted}"'


@pytest.mark.parametrize(("system", "name"), [(system, name) for system in SYSTEMS for name in BESIDE[system]])
def test_missing_package_of_the_system(tmp_path, system, name):
    place = place_on(system, tmp_path)
    install(place)
    versions = {one: found for one, found in VERSIONS.items() if one != name}
    poor = replace(place, environment=replace(place.environment, package_version=versions.get))
    assert f'"{name}"' in trouble(poor, "Packages").cure


def with_numpy(place: Place, version: str, least: str) -> Place:
    versions = {**VERSIONS, "numpy": version}
    environment = replace(place.environment, package_version=versions.get, requirements=lambda: [f"numpy>={least},<99"])
    return replace(place, environment=environment)


def test_package_that_is_too_old(tmp_path):
    place = place_on("Windows", tmp_path)
    install(place)
    for version, least in [("1.25.9", "1.26"), ("1.9", "1.10"), ("2.0.0", "2.0.1")]:
        assert f"numpy {version}" in trouble(with_numpy(place, version, least), "Packages").found
    for version, least in [("1.26.0", "1.26"), ("1.26", "1.26.0"), ("1.10", "1.9"), ("2.0.1.dev3", "2.0")]:
        assert troubles(with_numpy(place, version, least)) == {}


def test_what_xlwings_needs_on_each_system_is_what_its_metadata_say():
    from importlib.metadata import requires

    for system, marker in {"Windows": "'Windows'", "macOS": "'Darwin'"}.items():
        lines = [line for line in requires("xlwings") or [] if f"platform_system == {marker}" in line]
        assert {health._name_and_least(line)[0] for line in lines} == set(BESIDE[system])


def test_foreign_file_in_place_of_the_add_in(tmp_path):
    place = place_on("Windows", tmp_path)
    install(place)
    place.addin.write_bytes(b"somebody else's")
    found = troubles(place)
    assert set(found) == {"The add-in", "The add-in's version"}
    assert found["The add-in"].cure.startswith("Move it to another folder")
    place.addin.rename(tmp_path / "moved.xlam")
    install(place)
    assert troubles(place) == {}


def test_add_in_of_an_older_version(tmp_path, built):
    place = place_on("Windows", tmp_path)
    install(place)
    place.addin.write_bytes(with_version(built, "0.0.1"))
    finding = trouble(place, "The add-in's version")
    assert "sheetfuncs 0.0.1" in finding.found
    assert f"sheetfuncs {__version__}" in finding.found
    install(place)
    assert troubles(place) == {}


def test_add_in_that_is_not_what_this_version_builds(tmp_path, built):
    place = place_on("Windows", tmp_path)
    install(place)
    place.addin.write_bytes(other_ribbon(built))
    assert "not what this version builds" in trouble(place, "The add-in's version").found
    install(place)
    assert troubles(place) == {}


def other_ribbon(content: bytes) -> bytes:
    file = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(file, "w") as new:
        for name in old.namelist():
            new.writestr(name, old.read(name).replace(b"Check again", b"Check a gain"))
    return file.getvalue()


def test_signed_copy_counts_as_current_while_its_macros_are_and_says_how_to_renew_it(tmp_path, built):
    place, file = place_on("Windows", tmp_path), tmp_path / "from the firm.xlam"
    with_signature = io.BytesIO(built)
    with zipfile.ZipFile(with_signature, "a") as package:
        package.writestr("xl/vbaProjectSignature.bin", b"somebody's signature")
    file.write_bytes(with_signature.getvalue())
    install(place, xlam=file)
    assert troubles(place) == {}
    place.addin.write_bytes(with_version(file.read_bytes(), "0.0.1"))
    assert "`--xlam`" in trouble(place, "The add-in's version").cure
    install(place, xlam=file)
    assert troubles(place) == {}


@pytest.mark.parametrize("system", SYSTEMS)
def test_configuration_that_is_missing(tmp_path, system):
    place = place_on(system, tmp_path)
    install(place)
    place.configuration.unlink()
    trouble(place, "The configuration")
    install(place)
    assert troubles(place) == {}


@pytest.mark.parametrize("content", [b"", b"\x81\xff", b'"INTERPRETER","C:\\python.exe"\r\n'])
def test_configuration_that_names_no_python(tmp_path, content):
    place = place_on("Windows", tmp_path)
    install(place)
    place.configuration.write_bytes(content)
    assert trouble(place, "The configuration").cure.startswith("Delete it")
    place.configuration.unlink()
    install(place)
    assert troubles(place) == {}


def test_configuration_that_names_another_python(tmp_path):
    place = place_on("Windows", tmp_path)
    install(place)
    other = tmp_path / "other.exe"
    other.touch()
    place.configuration.write_text(f'"INTERPRETER_WIN","{other}"\n')
    finding = trouble(place, "The configuration")
    assert str(other) in finding.found
    with pytest.raises(InstallError):
        install(place)
    assert "delete it first" in finding.cure
    place.configuration.unlink()
    install(place)
    assert troubles(place) == {}


def test_configuration_in_other_capitals_and_short_form_is_this_python(tmp_path):
    python = tmp_path / "Ł" / "python.exe"
    place = place_on("Windows", tmp_path, executable=str(python), short_path=lambda path: path.replace("Ł", "L~1"))
    python.parent.mkdir()
    for file in (python, *(python.parent / name for name in DLLS)):
        file.touch()
    install(place)
    content = place.configuration.read_bytes()
    assert b"L~1" in content
    assert "The configuration" not in troubles(place)
    place.configuration.write_bytes(content.replace(b"python.exe", b"PYTHON.EXE"))
    assert "The configuration" not in troubles(place)


@pytest.mark.parametrize("name", DLLS)
@pytest.mark.parametrize("beside", ["Scripts", "."])
def test_library_that_stands_where_excel_does_not_look(tmp_path, name, beside):
    place = place_on("Windows", tmp_path)
    install(place)
    prefix = Path(place.environment.prefix)
    (prefix / name).rename(prefix.parent / name)
    finding = trouble(place, "The connection from Excel to Python")
    assert name in finding.found
    assert "`python -m venv`" in finding.cure
    (prefix.parent / name).rename(prefix / beside / name)  # as an installation into an environment does
    assert troubles(place) == {}


def test_script_that_is_missing_or_starts_another_python(tmp_path):
    place = place_on("macOS", tmp_path)
    install(place)
    assert place.script is not None
    place.script.unlink()
    trouble(place, "The connection from Excel to Python")
    install(place)
    assert troubles(place) == {}
    place.script.write_text("on VbaHandler(parameterString)\nend VbaHandler\n")
    assert "delete it first" in trouble(place, "The connection from Excel to Python").cure
    place.script.unlink()
    install(place)
    assert troubles(place) == {}


def mark_on_windows(path: Path, quarantined: set[Path]) -> None:
    path.with_name(f"{path.name}:Zone.Identifier").write_text("[ZoneTransfer]\nZoneId=3\n")


def mark_on_macos(path: Path, quarantined: set[Path]) -> None:
    quarantined.add(path)


@pytest.mark.parametrize(("system", "mark"), [("Windows", mark_on_windows), ("macOS", mark_on_macos)])
def test_mark_of_a_download(tmp_path, system, mark: Callable, quarantined):
    place = place_on(system, tmp_path)
    install(place)
    mark(place.addin, quarantined)
    assert "which writes it without the mark" in trouble(place, "The mark of a download").cure
    install(place)
    # On NTFS the mark is part of the file and goes with it; here it is a file of its own, which has to go by hand.
    place.addin.with_name(f"{place.addin.name}:Zone.Identifier").unlink(missing_ok=True)
    assert troubles(place) == {}


@pytest.mark.skipif(sys.platform != "linux", reason="asks the C library of Linux in place of that of macOS")
def test_attribute_of_a_file_is_found(tmp_path):
    path = tmp_path / "file"
    path.touch()
    assert not ASK_THE_SYSTEM(path, "user.mark")
    try:
        os.setxattr(path, "user.mark", b"0081;00000000;;")
    except OSError:
        pytest.skip("the disk of this machine keeps no attributes of files")
    assert ASK_THE_SYSTEM(path, "user.mark")
    assert not ASK_THE_SYSTEM(path, "user.other")


@pytest.mark.parametrize("system", SYSTEMS)
def test_files_of_an_installation_that_was_cut_off(tmp_path, system):
    place = place_on(system, tmp_path)
    install(place)
    left = place.staging(place.addin) / f"{WAITING}0123456789abcdef.tmp"
    left.write_bytes(b"half")
    assert str(left) in trouble(place, "Left-over files").found
    install(place)
    assert troubles(place) == {}


@pytest.mark.parametrize("where", ["start folder", "add-ins folder"])
def test_second_add_in_of_ours(tmp_path, where, built):
    place = place_on("Windows", tmp_path)
    install(place)
    place.also_loaded.mkdir()
    (place.addin.parent / "theirs.xlam").write_bytes(b"somebody else's")
    starts, loads = place.addin.parent / "sheetfuncs (1).xlam", place.also_loaded / "sheetfuncs.xlam"
    second = {"start folder": starts, "add-ins folder": loads}[where]
    second.write_bytes(built)
    finding = trouble(place, "Left-over files")
    assert finding.cure == f"Close Excel and delete {second}."
    second.unlink()
    assert troubles(place) == {}


@pytest.mark.parametrize("content", [None, b"{"])
def test_list_that_is_missing_or_damaged(tmp_path, content):
    place = place_on("Windows", tmp_path)
    install(place)
    if content is None:
        place.record.unlink()
    else:
        place.record.write_bytes(content)
    assert "`sheetfuncs excel install`" in trouble(place, "The list of installed files").cure
    place.record.unlink(missing_ok=True)
    install(place)
    assert json.loads(place.record.read_text())["schema"] == 1
    assert troubles(place) == {}


def test_text_has_troubles_first_each_with_its_cure(tmp_path, monkeypatch):
    environment = windows(tmp_path)
    monkeypatch.setattr("sheetfuncs.hosts.excel.folders.this_environment", lambda: environment)
    place = find_place(environment)
    install(place)
    place.configuration.unlink()
    lines = health_text().splitlines()
    assert lines[0] == "1 of 9 parts needs attention."
    assert lines[2].startswith("Not in order: The configuration. ")
    assert lines[3].startswith("    To do: ")
    assert sum(line.startswith("In order: ") for line in lines) == 8
    assert lines[2:] == finding_lines(health.health(place))


def test_text_is_refused_where_excel_cannot_be(monkeypatch, tmp_path):
    environment = mac(tmp_path, platform="linux")
    monkeypatch.setattr("sheetfuncs.hosts.excel.folders.this_environment", lambda: environment)
    with pytest.raises(InstallError, match="Windows and macOS only"):
        health_text()


def test_health_changes_nothing(tmp_path):
    from fake_homes import tree

    place = place_on("macOS", tmp_path)
    install(place)
    (place.addin.parent.parent / f"{WAITING}ab.tmp").write_bytes(b"half")
    before = tree(tmp_path)
    health.health(place)
    assert tree(tmp_path) == before
