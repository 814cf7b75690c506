"""Install, remove and health, in a private profile, through the command line."""

from __future__ import annotations

import json
import shutil
import sys

import pytest
from click.testing import CliRunner
from office import Calc, load_uno

from sheetfuncs import __version__
from sheetfuncs.cli import main
from sheetfuncs.errors import InstallError
from sheetfuncs.hosts.calc import health, install, office
from sheetfuncs.hosts.findings import finding_lines


def run(*arguments: str) -> tuple[int, str]:
    result = CliRunner().invoke(main, ["calc", *arguments])
    return result.exit_code, result.output


@pytest.mark.libreoffice
@pytest.mark.slow
def test_install_health_and_remove(tmp_path):
    load_uno()
    profile = ("--profile", str(tmp_path / "profile"))
    code, said = run("health", *profile)
    assert code == 1
    assert "Not in order: The extension. LibreOffice does not have it." in said
    assert "sheetfuncs calc install" in said

    for _ in range(2):  # the second one replaces the first
        code, said = run("install", *profile)
        assert code == 0, said
    code, said = run("health", *profile)
    assert code == 0, said
    assert "In order: The worker." in said

    code, said = run("remove", *profile)
    assert code == 0
    calc = Calc(tmp_path / "profile")
    try:
        document = calc.new_document()
        cell = document.Sheets.getByIndex(0).getCellRangeByName("A1")
        cell.setFormula("=FIT_DURBIN_WATSON_BOUNDS(40;3)")
        assert cell.getError() == 525  # an unknown name
        document.close(True)
    finally:
        calc.stop()


@pytest.mark.libreoffice
def test_a_running_program_is_asked_to_be_closed(calc):
    code, said = run("install", "--profile", str(calc.profile))
    assert code == 1
    assert "close all its windows" in said
    document = calc.new_document()  # it runs as before
    document.close(True)


@pytest.fixture
def extension(tmp_path):
    """A folder like that of the unpacked extension, with settings that can be changed."""
    path = tmp_path / "settings.json"
    path.write_text(json.dumps(install.settings()))

    def change(**values):
        path.write_text(json.dumps({**install.settings(), **values}))
        return tmp_path

    return change


def told(findings) -> str:
    return "\n".join(finding_lines(findings))


def test_health_starts_the_worker_and_compares_versions(extension, monkeypatch):
    said = told(health._worker(extension()))
    assert said == f"In order: The worker. Its version is {__version__}. It runs in {sys.executable}."
    monkeypatch.setattr(health, "__version__", "99.0")
    said = told(health._worker(extension()))
    assert f"Its version is {__version__}, that of sheetfuncs here 99.0" in said
    assert "To do: To bring both to one version" in said


@pytest.mark.parametrize(
    ("settings", "sentence"),
    [
        ({"interpreter": "/nowhere/python"}, "/nowhere/python, which is not there"),
        ({"interpreter": shutil.which("false") or "/bin/false"}, "it does not answer"),
    ],
)
def test_health_names_an_interpreter_that_is_no_use(extension, settings, sentence):
    said = told(health._worker(extension(**settings)))
    assert sentence in said
    assert "sheetfuncs calc install" in said


def test_health_names_settings_that_cannot_be_read(tmp_path):
    assert "cannot be read" in told(health._worker(tmp_path))


def test_health_without_libreoffice(monkeypatch):
    monkeypatch.setattr(office.shutil, "which", lambda name: None)
    monkeypatch.setattr(office, "USUAL_FOLDERS", ())
    (finding,) = health.health()
    assert not finding.ok
    assert "install it with its Calc and Python parts" in finding.cure
    with pytest.raises(InstallError, match="LibreOffice was not found"):
        install.install()


def test_programs_get_no_settings_of_another_python(monkeypatch):
    monkeypatch.setenv("PYTHONPATH", "/somewhere")
    monkeypatch.setenv("URE_BOOTSTRAP", "/somewhere")
    monkeypatch.setenv("PATH", "/somewhere")
    environment = office.clean_environment()
    assert "PYTHONPATH" not in environment
    assert "URE_BOOTSTRAP" not in environment
    assert sys.platform == "win32" or "/somewhere" not in environment["PATH"]
