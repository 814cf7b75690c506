"""Whether LibreOffice, the extension and the worker work together: what was found, and the cure of what is wrong."""

from __future__ import annotations

import json
import subprocess
import tempfile
import threading
from pathlib import Path
from typing import Any

from sheetfuncs import __version__
from sheetfuncs.errors import InstallError
from sheetfuncs.hosts.calc import office, protocol
from sheetfuncs.hosts.calc.install import ask_office
from sheetfuncs.hosts.findings import Finding

INSTALL = "close LibreOffice and run `sheetfuncs calc install`"
SECONDS = 60.0


def health(profile: Path | None = None) -> list[Finding]:
    """Look at one part after the other, up to the first without which the rest cannot be looked at."""
    try:
        folder = office.find_office()
    except InstallError as refusal:
        return [Finding("LibreOffice", False, "It was not found.", str(refusal))]
    findings = [Finding("LibreOffice", True, f"It is in {folder}.")]
    try:
        extension = ask_office(profile, "list")
    except InstallError as refusal:
        return [*findings, Finding("The extension", False, "LibreOffice cannot be asked.", str(refusal))]
    if not extension["registered"]:
        return [*findings, Finding("The extension", False, "LibreOffice does not have it.", f"To have it, {INSTALL}.")]
    findings.append(_version("The extension", extension["registered"]))
    return [*findings, *_worker(Path(extension["folder"] or ""))]


def headline(findings: list[Finding]) -> str:
    """One sentence on all findings."""
    troubles = sum(not finding.ok for finding in findings)
    if not troubles:
        return "LibreOffice, the extension and sheetfuncs work together."
    return f"{troubles} {'part needs' if troubles == 1 else 'parts need'} attention."


def _version(what: str, found: str) -> Finding:
    if found == __version__:
        return Finding(what, True, f"Its version is {found}.")
    return Finding(what, False, f"Its version is {found}, that of sheetfuncs here {__version__}.",
                   f"To bring both to one version, {INSTALL}.")


def _worker(extension: Path) -> list[Finding]:
    """The interpreter that the extension was told of, and whether a worker in it answers."""
    what = "The worker"
    try:
        settings = json.loads((extension / "settings.json").read_text("utf-8"))
        command = protocol.worker_command(settings)
    except (OSError, ValueError, KeyError):
        return [Finding("The extension's settings", False, f"They cannot be read in {extension}.",
                        f"To write them again, {INSTALL}.")]
    if not Path(command[0]).is_file():
        return [Finding(what, False, f"It is to run in {command[0]}, which is not there.",
                        f"From an environment that is there, {INSTALL}.")]
    answer = _hello(command)
    if isinstance(answer, str):
        return [Finding(what, False, f"In {command[0]} it does not answer ({answer}).",
                        f"Install sheetfuncs there again; or, from another environment, {INSTALL}.")]
    version = _version(what, str(answer.get("sheetfuncs")))
    return [Finding(what, version.ok, f"{version.found} It runs in {command[0]}.", version.cure)]


def _hello(command: list[str]) -> dict[str, Any] | str:
    """What a new worker answers to "hello", or what it says instead."""
    with tempfile.TemporaryFile() as errors:
        try:
            child = subprocess.Popen(
                command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=errors, cwd=tempfile.gettempdir(),
                env=office.clean_environment(),
            )
        except OSError as trouble:
            return trouble.strerror or str(trouble)
        timer = threading.Timer(SECONDS, child.kill)
        timer.start()
        try:
            assert child.stdin
            protocol.write_message(child.stdin, protocol.REQUEST, {"kind": "hello", "head": {}})
            message = protocol.read_message(child.stdout)
        except (OSError, protocol.ProtocolError) as trouble:
            message = None
            said = str(trouble)
        else:
            said = "it ended"
        finally:
            timer.cancel()
            child.kill()
            child.communicate()
        errors.seek(0)
        lines = errors.read().decode("utf-8", "replace").strip().splitlines()
    if message is None:
        return lines[-1][:200] if lines else said
    answer: dict[str, Any] = message[1].get("head", {})
    return answer
