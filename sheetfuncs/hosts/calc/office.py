"""LibreOffice as a program: where it is, starting it without a window, and stopping it."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import tempfile
import threading
import uuid
from pathlib import Path

from sheetfuncs.errors import InstallError

USUAL_FOLDERS = (
    "/usr/lib/libreoffice/program", "/usr/lib64/libreoffice/program", "/opt/libreoffice*/program",
    "/Applications/LibreOffice.app/Contents/MacOS", "C:/Program Files/LibreOffice/program",
)
ASKS_FOR_RESTART = 81
NOT_FOUND = (
    "LibreOffice was not found: install it with its Calc and Python parts (Debian: libreoffice-calc python3-uno), or "
    "put its program folder on PATH."
)


def find_office() -> Path:
    """The folder of the programs. Raises InstallError where LibreOffice is not found."""
    on_path = shutil.which("soffice") or shutil.which("libreoffice")
    folders = [Path(on_path).resolve().parent] if on_path else []
    for pattern in USUAL_FOLDERS:
        anchor = Path(Path(pattern).anchor)
        folders += sorted(anchor.glob(str(Path(pattern).relative_to(anchor))), reverse=True)
    for folder in folders:
        if _program(folder) is not None:
            return folder
    raise InstallError(NOT_FOUND)


def _program(folder: Path) -> Path | None:
    names = ("soffice.bin", "soffice.exe", "soffice")
    return next((folder / name for name in names if (folder / name).is_file()), None)


def clean_environment() -> dict[str, str]:
    """The environment for LibreOffice: another Python first on PATH, or Python's settings, would break its own."""
    unwanted = ("PYTHON", "URE_", "UNO_", "VIRTUAL_ENV", "LD_LIBRARY_PATH", "DYLD_")
    kept = {name: value for name, value in os.environ.items() if not name.startswith(unwanted)}
    return kept if sys.platform == "win32" else {**kept, "PATH": "/usr/bin:/bin:/usr/sbin:/sbin"}


class Office:
    """A LibreOffice without a window that accepts one pipe; a context manager that stops it.

    profile: the user profile's folder; None is the user's own.
    """

    def __init__(self, profile: Path | None, *, folder: Path | None = None, environment: dict[str, str] | None = None):
        self.folder = folder or find_office()
        self.pipe = f"sheetfuncs-{uuid.uuid4().hex[:12]}"
        command = [str(_program(self.folder)), "--headless", "--norestore", "--nologo", "--nodefault",
                   f"--accept=pipe,name={self.pipe};urp;StarOffice.ComponentContext"]
        if profile is not None:
            command.append(f"-env:UserInstallation={profile.resolve().as_uri()}")
        self._command, self._environment = command, {**clean_environment(), **(environment or {})}
        self._stopping = False
        self._messages = tempfile.TemporaryFile()  # noqa: SIM115 (closed in stop)
        self.process = self._start()
        self._ended = threading.Event()
        threading.Thread(target=self._start_again, daemon=True).start()

    def _start(self) -> subprocess.Popen[bytes]:
        return subprocess.Popen(
            self._command, env=self._environment, stdin=subprocess.DEVNULL, stdout=self._messages,
            stderr=self._messages,
        )

    def _start_again(self) -> None:
        """In a new profile the program ends at once and asks to be started again; only then it stays."""
        while self.process.wait() == ASKS_FOR_RESTART and not self._stopping:
            self.process = self._start()
        self._ended.set()

    @property
    def address(self) -> str:
        """What a UNO client resolves to get the component context."""
        return f"uno:pipe,name={self.pipe};urp;StarOffice.ComponentContext"

    def wait(self, seconds: float) -> bool:
        """Whether it ended by itself within this time."""
        return self._ended.wait(seconds)

    def stop(self) -> None:
        """End it, by force if it does not end by itself; asking it to terminate is the client's part."""
        self._stopping = True
        if not self.wait(5):
            self.process.terminate()
            if not self.wait(5):
                self.process.kill()
                self._ended.wait()
        if not self._messages.closed:
            self._messages.close()

    def __enter__(self) -> Office:
        return self

    def __exit__(self, *exception: object) -> None:
        self.stop()


def find_uno_python(folder: Path) -> Path | None:
    """A Python that can `import uno`: LibreOffice's own, or the system's."""
    candidates = [folder / "python.exe", folder / "python", folder.parent / "Resources" / "python",
                  Path("/usr/bin/python3")]
    for path in candidates:
        if path.is_file() and _can_import_uno(path):
            return path
    return None


def _can_import_uno(python: Path) -> bool:
    command = [str(python), "-c", "import uno"]
    try:
        run = subprocess.run(command, env=clean_environment(), capture_output=True, timeout=60)
    except (OSError, subprocess.TimeoutExpired):
        return False
    return run.returncode == 0
