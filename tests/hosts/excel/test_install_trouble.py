"""Installations that fail half way, files that somebody holds, lists that are damaged: nothing is half done."""

from __future__ import annotations

import errno
import json
import os
from dataclasses import replace
from pathlib import Path

import pytest
from addin_copies import of_version
from fake_homes import mac, place_on, tree

from sheetfuncs import __version__
from sheetfuncs.errors import InstallError, WorkbookBusyError
from sheetfuncs.hosts.excel import install as install_module
from sheetfuncs.hosts.excel import swapping
from sheetfuncs.hosts.excel.folders import find_place
from sheetfuncs.hosts.excel.install import install, remove
from sheetfuncs.hosts.excel.record import digest

pytestmark = pytest.mark.usefixtures("built_once")

SYSTEMS = ["Windows", "macOS"]


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
