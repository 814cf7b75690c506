"""Copies of the add-in that a firm has changed or signed, for tests of installing them."""

from __future__ import annotations

import io
import zipfile


def changed_package(content: bytes, **parts: bytes) -> bytes:
    """The package with other bytes in these parts (__ for /, one underscore for a dot), or with these parts added."""
    wanted = {name.replace("__", "/").replace("_", "."): data for name, data in parts.items()}
    file = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(file, "w") as new:
        for name in {**dict.fromkeys(old.namelist()), **wanted}:
            new.writestr(name, wanted[name] if name in wanted else old.read(name))
    return file.getvalue()


def of_version(content: bytes, old: str, new: str) -> bytes:
    with zipfile.ZipFile(io.BytesIO(content)) as package:
        properties = package.read("docProps/custom.xml")
    assert properties.count(f">{old}<".encode()) == 1
    return changed_package(content, docProps__custom_xml=properties.replace(f">{old}<".encode(), f">{new}<".encode()))


def signed(content: bytes) -> bytes:
    return changed_package(content, xl__vbaProjectSignature_bin=b"somebody's signature")
