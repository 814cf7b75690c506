"""Installing and removing start no program and write nowhere else."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

import sheetfuncs

SYSTEMS = ["Windows", "macOS"]


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
