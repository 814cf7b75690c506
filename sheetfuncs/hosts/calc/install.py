"""Put the extension into LibreOffice, and take it out again."""

from __future__ import annotations

import contextlib
import json
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any, BinaryIO

from sheetfuncs import __version__
from sheetfuncs.errors import InstallError
from sheetfuncs.hosts.calc import office
from sheetfuncs.hosts.calc.build import build_extension

SECONDS = 20  # the longest wait for one value in a cell
LONGEST_SECONDS = 180
HAND_OVER_SECONDS = 1.5
NO_ANSWER = "LibreOffice did not answer within three minutes; try again."
SCRIPT = Path(__file__).parent / "extension_script.py"


def install(profile: Path | None = None, *, seconds: float = SECONDS) -> str:
    """Install or replace the extension in a profile (None: the user's own); returns a sentence on what to do next.

    It records this interpreter, which the worker runs in from then on. Works as root too, where LibreOffice's own
    command refuses. Raises InstallError where LibreOffice is not there, runs, or refuses.
    """
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "sheetfuncs.oxt"
        file.write_bytes(build_extension(settings(seconds)))
        found = ask_office(profile, "add", str(file))
    if not found.get("registered"):
        raise InstallError("LibreOffice took the extension but does not list it; try `sheetfuncs calc install` again.")
    return (
        f"The extension (version {found['registered']}) is in LibreOffice and runs {sys.executable}. Start Calc: the "
        "functions FIT_... are in the function wizard under Statistical, the check is in the menu Regression check."
    )


def remove(profile: Path | None = None) -> str:
    """Take the extension out of a profile; workbooks stay as they are."""
    ask_office(profile, "remove")
    return "The extension is no longer in LibreOffice; formulas with FIT_... keep their text and show #NAME?."


def settings(seconds: float = SECONDS) -> dict[str, object]:
    """What the bridge needs to know: which Python, where sheetfuncs is, its version, the limit in seconds."""
    return {
        "interpreter": sys.executable,
        "package_folder": str(Path(__file__).resolve().parents[3]),
        "version": __version__,
        "seconds": seconds,
    }


def ask_office(profile: Path | None, *action: str) -> dict[str, Any]:
    """Start LibreOffice without a window, let it add, remove or list the extension, and end it."""
    folder = office.find_office()
    python = office.find_uno_python(folder)
    if python is None:
        raise InstallError(
            f"LibreOffice in {folder} has no Python that knows it: install its Python part (Debian: python3-uno)."
        )
    with office.Office(profile, folder=folder) as program, tempfile.TemporaryFile() as said:
        command = [str(python), str(SCRIPT), program.address, *action]
        asking = subprocess.Popen(
            command, env=office.clean_environment(), stdin=subprocess.PIPE, stdout=said, stderr=subprocess.STDOUT
        )
        try:
            _wait_for(lambda: _lines(said) or asking.poll() is not None)
            # Where LibreOffice runs already, the new one hands everything over to that one and ends at once.
            if program.wait(HAND_OVER_SECONDS):
                raise InstallError("LibreOffice is running with this profile: close all its windows, then try again.")
            with contextlib.suppress(OSError):
                asking.communicate(b"go\n", timeout=LONGEST_SECONDS)
        except subprocess.TimeoutExpired:
            raise InstallError(NO_ANSWER) from None
        finally:
            asking.kill()
            asking.communicate()
        return _answer(_lines(said))


def _wait_for(condition: Callable[[], object]) -> None:
    until = time.monotonic() + LONGEST_SECONDS
    while not condition():
        if time.monotonic() > until:
            raise InstallError(NO_ANSWER)
        time.sleep(0.1)


def _lines(said: BinaryIO) -> list[str]:
    said.seek(0)
    return said.read().decode("utf-8", "replace").split("\n")[:-1]


def _answer(lines: list[str]) -> dict[str, Any]:
    try:
        answer: dict[str, Any] = json.loads(lines[-1])
    except (ValueError, IndexError):
        last = lines[-1] if lines else "no message"
        raise InstallError(f"LibreOffice could not be asked ({last[:200]}); start it once by hand, close it, and try "
                            "again.") from None
    if "trouble" in answer:
        raise InstallError(f"LibreOffice refused: {answer['trouble']}")
    return answer
