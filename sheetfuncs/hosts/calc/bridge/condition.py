"""The state of what stands behind the functions, in words."""

from __future__ import annotations

from sheetfuncs_bridge import protocol
from sheetfuncs_bridge.client import CELLS, WorkerTrouble, read_settings


def condition() -> str:
    """Which versions work together here, or what is wrong and its cure."""
    try:
        settings = read_settings()
        worker = CELLS.request("hello", {}).head
    except WorkerTrouble as trouble:
        return str(trouble)
    lines = [
        f"sheetfuncs {worker.get('sheetfuncs')} answers, in Python {worker.get('python')}.",
        f"Interpreter: {settings.get('interpreter')}",
        f"Extension: version {settings.get('version')}, protocol {protocol.VERSION}; one value may take "
        f"{settings.get('seconds')} seconds.",
    ]
    if worker.get("sheetfuncs") != settings.get("version"):
        lines.append("The extension and sheetfuncs have different versions: run `sheetfuncs calc install` again.")
    return "\n".join(lines)
