"""Installing and removing the add-in in the homes of users who are not there: trees of folders on any system."""

from __future__ import annotations

import json
from dataclasses import replace

import pytest
from addin_copies import of_version, signed
from click.testing import CliRunner
from fake_homes import mac, place_on, tree, windows

from sheetfuncs import __version__
from sheetfuncs.cli import main
from sheetfuncs.errors import InstallError
from sheetfuncs.hosts.excel.configuration import configuration_bytes, interpreter_text, parsed_configuration
from sheetfuncs.hosts.excel.folders import find_place
from sheetfuncs.hosts.excel.install import install, remove
from sheetfuncs.hosts.excel.record import digest

pytestmark = pytest.mark.usefixtures("built_once")

SYSTEMS = ["Windows", "macOS"]


def test_on_windows_the_tree_is_as_expected(tmp_path, built):
    place = place_on("Windows", tmp_path)
    before = tree(tmp_path)
    install(place)
    new = {path: content for path, content in tree(tmp_path).items() if path not in before}
    assert list(new) == [
        "Users/Ida/.sheetfuncs", "Users/Ida/.sheetfuncs/installed.json", "Users/Ida/.sheetfuncs/sheetfuncs.conf",
        "Users/Ida/AppData/Roaming/Microsoft/Excel/XLSTART/sheetfuncs.xlam",
    ]
    assert new["Users/Ida/AppData/Roaming/Microsoft/Excel/XLSTART/sheetfuncs.xlam"] == built
    assert new["Users/Ida/.sheetfuncs/sheetfuncs.conf"] == (
        f'"INTERPRETER_WIN","{tmp_path}/tools/venv/Scripts/python.exe"\r\n'
        '"ADD_WORKBOOK_TO_PYTHONPATH","False"\r\n'
    ).encode()


def test_on_macos_the_tree_is_as_expected(tmp_path, built):
    place = place_on("macOS", tmp_path)
    before = tree(tmp_path)
    install(place)
    library = "Users/ida/Library"
    start = f"{library}/Group Containers/UBF8T346G9.Office/User Content.localized/Startup.localized/Excel"
    new = {path: content for path, content in tree(tmp_path).items() if path not in before}
    assert {path for path, content in new.items() if content is not None} == {
        f"{start}/sheetfuncs.xlam", f"{library}/Application Scripts/com.microsoft.Excel/sheetfuncs.applescript",
        f"{library}/Containers/com.microsoft.Excel/Data/sheetfuncs.conf",
        f"{library}/Containers/com.microsoft.Excel/Data/sheetfuncs-installed.json",
    }
    assert new[f"{start}/sheetfuncs.xlam"] == built
    assert new[f"{library}/Containers/com.microsoft.Excel/Data/sheetfuncs.conf"] == (
        f'"INTERPRETER_MAC","{place.interpreter}"\n"ADD_WORKBOOK_TO_PYTHONPATH","False"\n'
    ).encode()


@pytest.mark.parametrize("system", SYSTEMS)
def test_twice_is_as_once(tmp_path, system):
    place = place_on(system, tmp_path)
    install(place)
    once = tree(tmp_path)
    again = install(place)
    assert tree(tmp_path) == once
    assert again.notes == ()


@pytest.mark.parametrize("system", SYSTEMS)
def test_remove_leaves_exactly_what_was_before(tmp_path, system):
    place = place_on(system, tmp_path)
    place.addin.parent.mkdir(parents=True, exist_ok=True)
    (place.addin.parent / "someone-else.xlam").write_bytes(b"not ours")
    (place.configuration.parent / "other.txt").parent.mkdir(exist_ok=True)
    (place.configuration.parent / "other.txt").write_text("kept")
    before = tree(tmp_path)
    install(place)
    install(place)  # what the first one made is still ours after the second
    assert tree(tmp_path) != before
    remove(place)
    assert tree(tmp_path) == before


@pytest.mark.parametrize("system", SYSTEMS)
def test_remove_takes_the_folders_that_were_made(tmp_path, system):
    place = place_on(system, tmp_path)
    before = tree(tmp_path)
    install(place)
    install(replace(place, environment=replace(place.environment, executable=place.interpreter + "3")))
    remove(place)
    assert tree(tmp_path) == before


def test_remove_takes_the_log_that_the_script_left(tmp_path):
    place = place_on("macOS", tmp_path)
    before = tree(tmp_path)
    install(place)
    place.log.write_text("an error")
    remove(place)
    assert tree(tmp_path) == before


def test_remove_leaves_a_folder_in_which_something_else_stands_by_now(tmp_path):
    place = place_on("Windows", tmp_path)
    install(place)
    notes = place.configuration.parent / "my notes.txt"
    notes.write_text("mine")
    remove(place)
    assert [path.name for path in notes.parent.iterdir()] == ["my notes.txt"]


def test_remove_leaves_a_configuration_that_was_changed_and_says_so(tmp_path):
    place = place_on("Windows", tmp_path)
    install(place)
    place.configuration.write_text('"INTERPRETER_WIN","D:\\mine\\python.exe"\n')
    removed = remove(place)
    assert place.configuration.read_text() == '"INTERPRETER_WIN","D:\\mine\\python.exe"\n'
    assert str(place.configuration) in removed.notes[0]
    assert not place.addin.exists()


def test_remove_takes_an_add_in_that_was_signed_where_it_stands(tmp_path, built):
    place = place_on("Windows", tmp_path)
    install(place)
    place.addin.write_bytes(signed(built))
    remove(place)
    assert not place.addin.exists()


@pytest.mark.parametrize("system", SYSTEMS)
def test_remove_without_an_installation_is_refused(tmp_path, system, built):
    place = place_on(system, tmp_path)
    place.addin.parent.mkdir(parents=True, exist_ok=True)
    place.addin.write_bytes(built)
    before = tree(tmp_path)
    with pytest.raises(InstallError, match="put there by other means"):
        remove(place)
    assert tree(tmp_path) == before


def test_upgrade_replaces_an_older_version(tmp_path, built):
    place = place_on("Windows", tmp_path)
    old = of_version(built, __version__, "0.0.9")
    install(place)
    place.addin.write_bytes(old)
    stored = json.loads(place.record.read_text())
    stored["versions"]["sheetfuncs"] = "0.0.9"
    stored["files"][str(place.addin)] = digest(old)
    older = place.addin.with_name("sheetfuncs-charts.xlam")
    older.write_bytes(b"a part that only the older version wrote")
    stored["files"][str(older)] = digest(older.read_bytes())
    place.record.write_text(json.dumps(stored))
    done = install(place)
    assert done.earlier is not None
    assert done.earlier["sheetfuncs"] == "0.0.9"
    assert place.addin.read_bytes() == built
    assert not older.exists()


def test_upgrade_from_a_copy_that_was_put_there_by_hand(tmp_path, built):
    place = place_on("Windows", tmp_path)
    place.addin.write_bytes(of_version(built, __version__, "0.0.9"))
    assert install(place).earlier is None
    assert place.addin.read_bytes() == built


def test_another_environment_takes_over_and_says_so(tmp_path):
    place = place_on("Windows", tmp_path)
    install(place)
    other = find_place(replace(place.environment, executable="C:\\other\\python.exe"))
    notes = install(other).notes
    assert "C:\\other\\python.exe" in notes[0]
    assert place.interpreter in notes[0]
    assert b"C:\\other\\python.exe" in place.configuration.read_bytes()


@pytest.mark.parametrize(("system", "part"), [
    ("Windows", "addin"), ("Windows", "configuration"), ("macOS", "addin"), ("macOS", "configuration"),
    ("macOS", "script"),
])  # fmt: skip
def test_foreign_file_in_the_way_is_never_written_over(tmp_path, system, part):
    place = place_on(system, tmp_path)
    path = getattr(place, part)
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_bytes(b"somebody else's")
    before = tree(tmp_path)
    with pytest.raises(InstallError, match="not ours, so it is left alone") as refusal:
        install(place)
    assert str(path) in str(refusal.value)
    assert tree(tmp_path) == before
    path.rename(path.with_name("moved away"))
    install(place)  # the cure


def test_folder_and_link_in_the_way_are_foreign(tmp_path, built):
    place = place_on("Windows", tmp_path)
    for target in ("nowhere.xlam", "elsewhere.xlam"):
        (tmp_path / "elsewhere.xlam").write_bytes(built)
        place.addin.symlink_to(tmp_path / target)
        with pytest.raises(InstallError, match="not ours"):
            install(place)
        place.addin.unlink()
    place.addin.mkdir()
    with pytest.raises(InstallError, match="not ours"):
        install(place)


def test_configuration_changed_by_hand_is_not_written_over(tmp_path):
    place = place_on("Windows", tmp_path)
    install(place)
    place.configuration.write_text("mine")
    with pytest.raises(InstallError, match="changed since it was installed"):
        install(place)
    assert place.configuration.read_text() == "mine"


@pytest.mark.parametrize(("make", "missing"), [
    (windows, "AppData/Roaming/Microsoft/Excel"),
    (mac, "Library/Containers/com.microsoft.Excel"),
    (mac, "Library/Group Containers/UBF8T346G9.Office"),
])  # fmt: skip
def test_without_excels_folders_it_is_refused(tmp_path, make, missing):
    environment = make(tmp_path)
    (environment.home / missing).rename(tmp_path / "away")
    with pytest.raises(InstallError, match="start it once") as refusal:
        find_place(environment)
    assert str(environment.home / missing) in str(refusal.value)


def test_start_folder_is_made_where_only_that_is_missing(tmp_path):
    place = place_on("Windows", tmp_path)
    place.addin.parent.rmdir()
    before = tree(tmp_path)
    install(place)
    assert place.addin.is_file()
    remove(place)
    assert tree(tmp_path) == before


@pytest.mark.parametrize(("changes", "sentence"), [
    ({"variables": {}}, "APPDATA is not set"),
    ({"base_prefix": r"C:\Program Files\WindowsApps\PythonSoftwareFoundation.Python.3.11_3.11.2544.0_x64"}, "Store"),
    ({"executable": ""}, "does not say where its program stands"),
    ({"platform": "linux"}, "Windows and macOS only"),
])  # fmt: skip
def test_environments_without_a_place_are_refused(tmp_path, changes, sentence):
    with pytest.raises(InstallError, match=sentence):
        find_place(windows(tmp_path, **changes))


@pytest.mark.parametrize("command", ["install", "remove", "health"])
def test_on_linux_the_command_refuses_with_one_sentence(command, monkeypatch):
    monkeypatch.setattr("sys.platform", "linux")
    result = CliRunner().invoke(main, ["excel", command])
    assert (result.exit_code, result.stdout) == (1, "")
    assert result.stderr.count("\n") == 1
    assert result.stderr.startswith("Excel runs on Windows and macOS only")


def test_commands_say_what_they_did(tmp_path, monkeypatch):
    environment = windows(tmp_path)
    monkeypatch.setattr("sheetfuncs.hosts.excel.folders.this_environment", lambda: environment)
    runs = [CliRunner().invoke(main, ["excel", command]) for command in ("install", "health", "remove")]
    assert [run.exit_code for run in runs] == [0, 0, 0]
    assert str(find_place(environment).addin) in runs[0].stdout
    assert "Not in order" not in runs[0].stdout
    assert runs[1].stdout.endswith("Everything that can be seen from outside Excel is in place.\n")
    assert str(find_place(environment).addin) in runs[2].stdout
    unwell = CliRunner().invoke(main, ["excel", "health"])
    assert (unwell.exit_code, unwell.stderr.count("\n")) == (1, 1)


def test_commands_say_what_is_to_be_known(tmp_path, monkeypatch, built):
    environment = windows(tmp_path, package_version={}.get)
    monkeypatch.setattr("sheetfuncs.hosts.excel.folders.this_environment", lambda: environment)
    file = tmp_path / "copy.xlam"
    file.write_bytes(built)
    said = CliRunner().invoke(main, ["excel", "install", "--xlam", str(file)]).stdout
    assert "carries no signature" in said
    assert "Not in order: Packages." in said
    again = CliRunner().invoke(main, ["excel", "install"]).stdout
    assert f"in place of that of version {__version__}" in again
    find_place(environment).configuration.write_text("mine")
    assert "was changed since it was installed" in CliRunner().invoke(main, ["excel", "remove"]).stdout


# The configuration: what VBA can read of it.


def test_path_that_the_code_page_cannot_hold_is_written_in_its_short_form(tmp_path):
    place = place_on(
        "Windows", tmp_path, executable="C:\\Łukasz\\venv\\Scripts\\python.exe",
        short_path={"C:\\Łukasz\\venv\\Scripts\\python.exe": "C:\\UKASZ~1\\venv\\Scripts\\python.exe"}.get,
    )
    install(place)
    found = parsed_configuration(place.configuration.read_bytes(), "cp1252")
    assert found["INTERPRETER_WIN"] == "C:\\UKASZ~1\\venv\\Scripts\\python.exe"


def test_path_that_the_code_page_cannot_hold_and_without_short_form_is_refused(tmp_path):
    place = place_on("Windows", tmp_path, executable="C:\\Łukasz\\python.exe")
    before = tree(tmp_path)
    with pytest.raises(InstallError, match="plain letters"):
        install(place)
    assert tree(tmp_path) == before
    install(find_place(replace(place.environment, executable="C:\\sheetfuncs\\python.exe")))  # the cure


def test_letters_of_the_code_page_are_written_in_it(tmp_path):
    place = place_on("Windows", tmp_path, executable="C:\\Büro\\python.exe")
    assert b'"C:\\B\xfcro\\python.exe"' in configuration_bytes(place)
    polish = replace(place.environment, executable="C:\\Łukasz\\python.exe", code_page="cp1250")
    assert b'"C:\\\xa3ukasz\\python.exe"' in configuration_bytes(find_place(polish))


@pytest.mark.parametrize("path", ["/Users/ida/a|b/python", "/Users/ida/it's/python", '/Users/ida/"a"/python'])
def test_marks_that_the_macros_cannot_hand_on_are_refused(tmp_path, path):
    with pytest.raises(InstallError, match="holds the character"):
        interpreter_text(place_on("macOS", tmp_path, executable=path))


# A copy that the firm has signed.
