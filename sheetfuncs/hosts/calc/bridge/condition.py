"""The state of what stands behind the functions, in words."""

from __future__ import annotations

from sheetfuncs_bridge import protocol
from sheetfuncs_bridge.client import CELLS, WorkerTrouble, read_settings

OTHER_VERSION = (
    "The extension and sheetfuncs have different versions: close LibreOffice and run `sheetfuncs calc install`."
)


def condition() -> str:
    """Which versions work together here, or what is wrong and its cure."""
    try:
        settings = read_settings()
        worker = CELLS.request("hello", {}).head
    except WorkerTrouble as trouble:
        return str(trouble)
    together = worker.get("sheetfuncs") == settings.get("version")
    return "\n".join([
        "LibreOffice, the extension and sheetfuncs work together." if together else OTHER_VERSION,
        f"sheetfuncs {worker.get('sheetfuncs')}, in Python {worker.get('python')}: {settings.get('interpreter')}",
        f"Extension: version {settings.get('version')}, protocol {protocol.VERSION}; the longest wait for one value is "
        f"{settings.get('seconds')} seconds.",
    ])
