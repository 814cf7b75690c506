"""Installing and removing the add-in in the homes of users who are not there: trees of folders on any system."""

from __future__ import annotations

import errno
import io
import json
import os
import subprocess
import sys
import zipfile
from dataclasses import replace
from pathlib import Path

import pytest
from click.testing import CliRunner
from fake_homes import mac, place_on, tree, windows

import sheetfuncs
from sheetfuncs import __version__
from sheetfuncs.cli import main
from sheetfuncs.errors import InstallError, WorkbookBusyError
from sheetfuncs.hosts.excel import addin_file, macros, swapping
from sheetfuncs.hosts.excel import install as install_module
from sheetfuncs.hosts.excel.addin import addin_versions, build_addin
from sheetfuncs.hosts.excel.applescript import script_text, statements
from sheetfuncs.hosts.excel.configuration import configuration_bytes, interpreter_text, parsed_configuration
from sheetfuncs.hosts.excel.folders import SCRIPT_NAME, find_place
from sheetfuncs.hosts.excel.install import install, remove
from sheetfuncs.hosts.excel.record import digest
from sheetfuncs.hosts.excel.vba_project import modules

pytestmark = pytest.mark.usefixtures("built_once")

SYSTEMS = ["Windows", "macOS"]


def changed_package(content: bytes, **parts: bytes) -> bytes:
    """The package with other bytes in these parts (__ for /, one underscore for a dot), or with these parts added."""
    wanted = {name.replace("__", "/").replace("_", "."): data for name, data in parts.items()}
    file = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(file, "w") as new:
        for name in {**dict.fromkeys(old.namelist()), **wanted}:
            new.writestr(name, wanted[name] if name in wanted else old.read(name))
    return file.getvalue()


def of_version(content: bytes, old: str, new: str) -> bytes:
    with zipfile.ZipFile(io.BytesIO(content)) as package:
        properties = package.read("docProps/custom.xml")
    assert properties.count(f">{old}<".encode()) == 1
    return changed_package(content, docProps__custom_xml=properties.replace(f">{old}<".encode(), f">{new}<".encode()))


def signed(content: bytes) -> bytes:
    return changed_package(content, xl__vbaProjectSignature_bin=b"somebody's signature")


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


def refuse_to_replace(monkeypatch, held: Path, number: int = errno.EACCES) -> None:
    """As the system answers; EACCES: what Python makes of Windows' answer for a file that another program holds."""
    real = os.replace

    def refuse(old, new):
        if Path(new) == held:
            raise OSError(number, os.strerror(number), str(old), None, str(new))
        real(old, new)

    monkeypatch.setattr(swapping.os, "replace", refuse)


@pytest.mark.parametrize("system", SYSTEMS)
def test_add_in_that_excel_holds_open_stops_an_upgrade_with_nothing_half_done(tmp_path, system, monkeypatch, built):
    place = place_on(system, tmp_path)
    install(place)
    place.addin.write_bytes(of_version(built, __version__, "0.0.9"))
    before = tree(tmp_path)
    other = find_place(replace(place.environment, executable=str(tmp_path / "python")))
    with monkeypatch.context() as patch:
        refuse_to_replace(patch, place.addin)
        with pytest.raises(WorkbookBusyError, match="close every Excel window"):
            install(other)
    assert tree(tmp_path) == before
    install(other)  # the cure: Excel closed
    assert place.addin.read_bytes() == built


@pytest.mark.parametrize("system", SYSTEMS)
@pytest.mark.parametrize("part", ["configuration", "record"])
@pytest.mark.parametrize("earlier", [False, True])
def test_failure_half_way_takes_everything_back(tmp_path, system, part, earlier, monkeypatch):
    place = place_on(system, tmp_path)
    if earlier:
        install(place)
    before = tree(tmp_path)
    other = find_place(replace(place.environment, executable=str(tmp_path / "python")))
    with monkeypatch.context() as patch:
        refuse_to_replace(patch, getattr(place, part), errno.ENOSPC)
        with pytest.raises(InstallError, match=rf"{getattr(place, part)} could not be written .*No space left"):
            install(other)
    assert tree(tmp_path) == before


def test_add_in_that_excel_holds_open_is_not_removed_and_all_else_stays(tmp_path, monkeypatch):
    place = place_on("Windows", tmp_path)
    install(place)
    before = tree(tmp_path)
    real = Path.unlink

    def refuse(path, missing_ok=False):
        if path == place.addin:
            raise PermissionError(13, "The process cannot access the file", str(path))
        real(path, missing_ok)

    monkeypatch.setattr(Path, "unlink", refuse)
    with pytest.raises(WorkbookBusyError, match="close every Excel window"):
        remove(place)
    assert tree(tmp_path) == before


def test_add_in_that_excel_keeps_to_itself_is_not_taken_for_a_foreign_one(tmp_path, monkeypatch):
    place = place_on("Windows", tmp_path)
    install(place)
    before = tree(tmp_path)
    real = Path.read_bytes

    def refuse(path):
        if path == place.addin:
            raise PermissionError(13, "The process cannot access the file", str(path))
        return real(path)

    with monkeypatch.context() as patch:
        patch.setattr(Path, "read_bytes", refuse)
        for job in (install, remove):
            with pytest.raises(WorkbookBusyError, match="close every Excel window"):
                job(place)
    assert tree(tmp_path) == before


def test_start_folder_that_may_not_be_written_to_is_not_laid_at_excels_door(tmp_path, monkeypatch):
    place = place_on("Windows", tmp_path)
    refuse_to_replace(monkeypatch, place.addin)
    with pytest.raises(InstallError, match="see that you may write to its folder"):
        install(place)


def test_macos_folder_without_the_hidden_ending_is_used_where_it_is_the_one_there_is(tmp_path):
    environment = mac(tmp_path)
    start = environment.home / "Library/Group Containers/UBF8T346G9.Office/User Content/Startup.localized/Excel"
    start.mkdir(parents=True)
    assert find_place(environment).addin.parent == start


def test_macos_that_lets_nobody_into_excels_folders_is_said_in_a_sentence(tmp_path, monkeypatch):
    environment = mac(tmp_path)
    place = find_place(environment)
    with monkeypatch.context() as patch:
        refuse_to_replace(patch, place.configuration)
        with pytest.raises(InstallError, match="Privacy & Security"):
            install(place)

    def denied(path):
        raise PermissionError(1, "Operation not permitted", str(path))

    monkeypatch.setattr(Path, "is_dir", denied)
    with pytest.raises(InstallError, match="Privacy & Security"):
        find_place(environment)


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


def test_signed_copy_is_installed_as_it_is(tmp_path, built):
    place, file = place_on("Windows", tmp_path), tmp_path / "from the firm.xlam"
    file.write_bytes(signed(built))
    assert install(place, xlam=file).notes == ()
    assert place.addin.read_bytes() == file.read_bytes()
    assert file.exists()


def test_add_in_that_was_signed_where_it_stands_can_be_given(tmp_path, built):
    place = place_on("Windows", tmp_path)
    install(place)
    place.addin.write_bytes(signed(built))
    assert install(place, xlam=place.addin).notes == ()
    assert place.addin.read_bytes() == signed(built)


def test_unsigned_copy_is_installed_and_said_to_be_unsigned(tmp_path, built):
    place, file = place_on("Windows", tmp_path), tmp_path / "copy.xlam"
    file.write_bytes(built)
    assert ["no signature" in note for note in install(place, xlam=file).notes] == [True]


def test_copy_with_other_macros_is_said_to_have_them(tmp_path, built):
    place, file = place_on("Windows", tmp_path), tmp_path / "copy.xlam"
    other = addin_file.built_addin().content
    with zipfile.ZipFile(io.BytesIO(other)) as package:
        project = package.read("xl/vbaProject.bin")
    file.write_bytes(signed(changed_package(built, xl__vbaProject_bin=with_another_macro(project, tmp_path))))
    assert ["not those that this version builds" in note for note in install(place, xlam=file).notes] == [True]


def with_another_macro(project: bytes, folder: Path) -> bytes:
    from pyopenvba import ExcelFile

    path = folder / "other.xlam"
    build_addin(path)
    with ExcelFile(os.fspath(path)) as book:
        book.vba_project().add_module("Extra", "Public Sub Extra()\r\nEnd Sub\r\n")
        book.save()
    with zipfile.ZipFile(path) as package:
        changed = package.read("xl/vbaProject.bin")
    assert changed != project
    return changed


def test_macros_are_the_same_whatever_their_case_and_spaces(built):
    assert addin_file._bare("Sub  A( x )\r\n  b=1\r\n") == addin_file._bare("sub a(X)\n    B = 1\n")
    assert addin_file.says_the_same(built, signed(built))


@pytest.mark.parametrize("content", [b"", b"no package", b"PK\x03\x04 cut off"])
def test_file_that_is_no_add_in_of_ours_is_refused(tmp_path, content):
    file = tmp_path / "given.xlam"
    file.write_bytes(content)
    with pytest.raises(InstallError, match="is not the add-in of sheetfuncs"):
        install(place_on("Windows", tmp_path), xlam=file)


def test_copy_whose_macros_cannot_be_read_is_refused(tmp_path, built):
    file = tmp_path / "given.xlam"
    file.write_bytes(changed_package(built, xl__vbaProject_bin=b"nothing"))
    with pytest.raises(InstallError, match="is not the add-in of sheetfuncs"):
        install(place_on("Windows", tmp_path), xlam=file)


def test_copy_that_unpacks_to_far_too_much_is_refused(tmp_path, built, monkeypatch):
    file = tmp_path / "given.xlam"
    file.write_bytes(built)
    monkeypatch.setattr(addin_file, "LARGEST", len(built) - 1)
    with pytest.raises(InstallError, match="is not the add-in of sheetfuncs"):
        install(place_on("Windows", tmp_path), xlam=file)


def test_copy_that_is_not_there_is_refused(tmp_path):
    with pytest.raises(InstallError, match="is not there"):
        install(place_on("Windows", tmp_path), xlam=tmp_path / "given.xlam")


@pytest.mark.parametrize("name", ["sheetfuncs", "xlwings"])
def test_copy_for_another_version_is_refused(tmp_path, built, name):
    file = tmp_path / "given.xlam"
    file.write_bytes(built)
    file.write_bytes(signed(of_version(built, addin_versions(file)[name], "0.0.1")))
    with pytest.raises(InstallError, match=rf"was built for {name} 0\.0\.1"):
        install(place_on("Windows", tmp_path), xlam=file)


def test_signed_add_in_is_not_replaced_by_an_unsigned_one(tmp_path, built):
    place, file = place_on("Windows", tmp_path), tmp_path / "from the firm.xlam"
    file.write_bytes(signed(built))
    install(place, xlam=file)
    with pytest.raises(InstallError, match="--xlam FILE"):
        install(place)
    assert place.addin.read_bytes() == file.read_bytes()
    remove(place)  # the cure
    install(place)
    assert place.addin.read_bytes() == built


# The list of what was written.


@pytest.mark.parametrize("text", ["", "{", "[]", '{"schema": 9}', '{"schema": 1, "files": {}}'])
def test_damaged_list_is_refused_and_its_cure_works(tmp_path, text):
    place = place_on("Windows", tmp_path)
    install(place)
    place.record.write_text(text)
    for job in (install, remove):
        with pytest.raises(InstallError, match="delete it"):
            job(place)
    place.record.unlink()
    install(place)
    remove(place)
    assert not place.addin.exists()


def test_list_that_names_other_files_removes_none_of_them(tmp_path):
    place = place_on("Windows", tmp_path)
    install(place)
    theirs = [tmp_path / "Users/Ida/letter.txt", place.addin.parent / "theirs.xlam"]
    stored = json.loads(place.record.read_text())
    for path in theirs:
        path.write_bytes(b"theirs")
        stored["files"][str(path)] = digest(b"theirs")
    (tmp_path / "empty").mkdir()
    stored["folders"].append(str(tmp_path / "empty"))
    place.record.write_text(json.dumps(stored))
    remove(place)
    assert all(path.exists() for path in (*theirs, tmp_path / "empty"))


def test_installation_that_was_cut_off_is_cleared_up_by_the_next(tmp_path):
    place = place_on("Windows", tmp_path)
    left = place.addin.parent.parent / f"{swapping.WAITING}0123456789abcdef.tmp"
    left.write_bytes(b"half")
    assert install_module.waiting_files(place) == [left]
    install(place)
    assert not left.exists()


def test_nothing_ever_waits_in_the_folder_that_excel_opens(tmp_path, monkeypatch):
    place = place_on("Windows", tmp_path)
    seen = []
    real = os.replace
    monkeypatch.setattr(swapping.os, "replace", lambda old, new: (seen.append(Path(old)), real(old, new)))
    install(place)
    assert len(seen) == 3
    assert all(path.parent != place.addin.parent for path in seen)


# The script for macOS. Whether macOS runs it nobody has seen yet; what it may be asked is fixed here.


def test_script_knows_every_button_and_nothing_else(tmp_path):
    assert statements() == [
        f"import sheetfuncs.hosts.excel.macros; sheetfuncs.hosts.excel.macros.{name}()" for name in macros.MACROS
    ]
    script = script_text("/Users/ida/venv/bin/python", Path("/Users/ida/log"))
    assert all(f'"{statement}"' in script for statement in statements())
    assert script.count("do shell script") == 1
    assert script.count("import ") == len(macros.MACROS)


def test_script_is_the_one_that_the_add_in_asks_for():
    link = next(module for module in modules("0.1") if module.name == "PythonLink")
    assert f'AppleScriptTask "{SCRIPT_NAME}", "VbaHandler"' in link.source
    assert link.source.count("AppleScriptTask") == 1


def test_script_holds_plain_letters_only():
    script = script_text('/Users/Jürgen "J"/venv\\x/bin/python', Path("/Users/Jürgen/log"))
    assert script.isascii()
    assert r'("/Users/J" & (character id 252) & "rgen \"J\"/venv\\x/bin/python")' in script


def test_script_hands_no_name_to_the_shell_without_quotes():
    script = script_text("/python", Path("/log"))
    fields = [line.strip() for line in script.splitlines() if " of theFields" in line]
    assert fields == [
        'if (count of theFields) is not 6 then error "The name of this workbook cannot be handed to Python."',
        "set theStatement to item 3 of theFields",
        'set bookOption to quoted form of ("--wb=" & item 4 of theFields)',
        'set applicationOption to quoted form of ("--app=" & item 5 of theFields)',
    ]


# What an installation reaches.

WATCHED = """
import os, sys
from pathlib import Path
from fake_homes import place_on
from sheetfuncs.hosts.excel.health import health
from sheetfuncs.hosts.excel.install import install, remove
place = place_on({system!r}, Path({folder!r}))
def watch(event, args):
    if event.startswith(("socket.", "subprocess.", "os.system", "os.exec", "os.spawn", "os.posix_spawn", "os.startfile",
                         "winreg.")):
        print("reached:", event, args)
    elif event in ("os.remove", "os.rmdir") and args[1] != -1:
        pass  # relative to an open folder, whose own name came by before: so a temporary folder is emptied
    elif event in ("os.rename", "os.remove", "os.mkdir", "os.rmdir") or event == "open" and not isinstance(
        args[0], int) and args[2] & (os.O_WRONLY | os.O_RDWR):
        path = Path(os.fsdecode(args[1] if event == "os.rename" else args[0])).absolute()
        if not path.is_relative_to({folder!r}):
            print("wrote:", path)
sys.addaudithook(watch)
{job}
"""


def reached(folder: Path, system: str, job: str) -> list[str]:
    """What these lines of Python started, or wrote outside the folder of the test; temporary files lie in it too."""
    (folder / "tmp").mkdir()
    program = WATCHED.format(system=system, folder=str(folder), job=job)
    paths = os.pathsep.join([str(Path(sheetfuncs.__file__).parents[1]), str(Path(__file__).parent)])
    run = subprocess.run(
        [sys.executable, "-B", "-c", program], capture_output=True, text=True,
        env={**os.environ, "PYTHONPATH": paths, "TMPDIR": str(folder / "tmp"), "TEMP": str(folder / "tmp")},
    )
    assert run.returncode == 0, run.stderr
    return run.stdout.splitlines()


@pytest.mark.parametrize("system", SYSTEMS)
def test_nothing_is_started_and_nothing_written_elsewhere(tmp_path, system):
    assert reached(tmp_path, system, "install(place)\nhealth(place)\nremove(place)") == []


def test_watch_sees_what_it_is_for(tmp_path):
    job = "import subprocess\nsubprocess.run([sys.executable, '-c', ''])\nopen('/dev/null', 'w').close()"
    lines = reached(tmp_path, "Windows", job)
    assert any(line.startswith("reached: subprocess.Popen") for line in lines)
    assert any(line.startswith("wrote:") for line in lines)
