"""What a run reaches: files in the workbook's folder alone, no network, no other program."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
# Prints every event by which Python reaches out; hooks cannot be taken off again (PEP 578).
WATCHED = """
import os, sys
OUT = ("socket.", "subprocess.", "os.system", "os.exec", "os.spawn", "os.posix_spawn", "os.startfile", "winreg.")
CHANGES = {"os.remove": 0, "os.rename": 1, "os.mkdir": 0, "os.rmdir": 0, "os.link": 1, "os.symlink": 1}
def watch(event, args):
    if event.startswith(OUT):
        print("reached:", event, args, file=sys.stderr)
    elif event == "open" and not isinstance(args[0], int) and args[2] & (os.O_WRONLY | os.O_RDWR):
        print("wrote:", os.path.abspath(args[0]), file=sys.stderr)
    elif event in CHANGES:
        print("wrote:", os.path.abspath(args[CHANGES[event]]), file=sys.stderr)
sys.addaudithook(watch)
"""
RUN = WATCHED + "from sheetfuncs.cli import main\nmain(sys.argv[1:])"


def reached(program: str, folder: Path, *arguments: str) -> tuple[list[str], set[Path]]:
    """What was reached outside, and which files were written."""
    command = [sys.executable, "-B", "-c", f"import sys; sys.path.insert(0, {str(ROOT)!r}){program}", *arguments]
    run = subprocess.run(command, capture_output=True, text=True, cwd=folder)
    assert run.returncode == 0, run.stderr
    lines = run.stderr.splitlines()
    written = {Path(line.removeprefix("wrote: ")) for line in lines if line.startswith("wrote:")}
    return [line for line in lines if line.startswith("reached:")], written


@pytest.mark.slow
def test_commands_reach_nothing_outside_the_workbooks_folder(tmp_path):
    book = "books/order-hours-unequal-spread.xlsx"
    for arguments in (
        ["demo", "books"],
        ["check", book, "Panels", "--json", "books/figures.json"],
        ["check", book, "Panels", "--in-place"],
        ["undo", book],
        ["cell", "=FIT_VIF(Orders!E4:G74)", book],
        ["functions"],
    ):
        outside, written = reached(RUN, tmp_path, *arguments)
        assert outside == []
        assert all(path.is_relative_to(tmp_path / "books") for path in written), written
        assert written or arguments[0] in ("cell", "functions")


def test_watch_sees_what_it_is_for(tmp_path):
    program = WATCHED + (
        "import socket, subprocess\n"
        "socket.socket().close()\n"
        "subprocess.run([sys.executable, '-c', ''])\n"
        "open('left.txt', 'w').close()\n"
    )
    outside, written = reached(program, tmp_path)
    assert any("socket." in line for line in outside)
    assert any("subprocess." in line for line in outside)
    assert tmp_path / "left.txt" in written
