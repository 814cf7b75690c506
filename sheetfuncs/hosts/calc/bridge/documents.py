"""Small questions about a document and about what this extension brought."""

from __future__ import annotations

import json
from pathlib import Path

import uno
from sheetfuncs_bridge import client


def known_names() -> list:
    """The plain names of the functions that this extension brought."""
    return [one["name"] for one in json.loads((client.EXTENSION / "functions.json").read_text("utf-8"))]


def local_path(model):
    """The document's file on this machine as a Path, or None."""
    url = model.getURL()
    return Path(uno.fileUrlToSystemPath(url)) if url.startswith("file:") else None


def frame_of(model):
    """The frame of the document's window, or None."""
    controller = model.getCurrentController()
    return None if controller is None else controller.getFrame()
