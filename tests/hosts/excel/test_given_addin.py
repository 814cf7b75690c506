"""A copy of the add-in that a firm gives out: signed, changed, of another version, or none of ours."""

from __future__ import annotations

import io
import os
import zipfile
from pathlib import Path

import pytest
from addin_copies import changed_package, of_version, signed
from fake_homes import place_on

from sheetfuncs.errors import InstallError
from sheetfuncs.hosts.excel import addin_file
from sheetfuncs.hosts.excel.addin import addin_versions, build_addin
from sheetfuncs.hosts.excel.install import install, remove

pytestmark = pytest.mark.usefixtures("built_once")

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
