"""Where a workbook's external links lead to, read from the file itself: Calc does not tell."""

from __future__ import annotations

import posixpath
import zipfile
from pathlib import Path
from xml.etree import ElementTree

MAIN = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}"
OFFICE = "{http://schemas.openxmlformats.org/officeDocument/2006/relationships}"
RELATIONSHIPS = "{http://schemas.openxmlformats.org/package/2006/relationships}"
LARGEST_PART = 16 << 20


def linked_files(path: Path) -> list:
    """For each external link, in the order of their numbers from 1, the files it leads to; [] where there are none.

    A file that cannot be read as a workbook has no links.
    """
    try:
        with zipfile.ZipFile(path) as package:
            return _linked_files(package)
    except (OSError, ValueError, KeyError, NotImplementedError, RuntimeError, zipfile.BadZipFile,
            ElementTree.ParseError):
        return []


def _linked_files(package: zipfile.ZipFile) -> list:
    book = next(part for kind, part, _ in _arrows(package, "").values() if kind == "officeDocument")
    arrows = _arrows(package, book)
    found = []
    for reference in _root(package, book).iterfind(f"{MAIN}externalReferences/{MAIN}externalReference"):
        _, part, _ = arrows.get(reference.get(f"{OFFICE}id"), ("", "", False))
        found.append([target for _, target, outside in _arrows(package, part).values() if outside])
    return found


def _arrows(package: zipfile.ZipFile, part: str) -> dict:
    """The relationships of a part by their ids: (kind, part or outside target, outside)."""
    folder, name = posixpath.split(part)
    listed = posixpath.join(folder, "_rels", f"{name}.rels")
    if listed not in package.namelist():
        return {}
    found = {}
    for element in _root(package, listed).iterfind(f"{RELATIONSHIPS}Relationship"):
        outside = element.get("TargetMode") == "External"
        target = element.get("Target", "")
        if not outside:
            target = posixpath.normpath(posixpath.join("/", folder, target)).lstrip("/")
        found[element.get("Id")] = (element.get("Type", "").rsplit("/", 1)[-1], target, outside)
    return found


def _root(package: zipfile.ZipFile, part: str) -> ElementTree.Element:
    """The parsed part. Raises ValueError where it is too large, or has a DOCTYPE, which no part of a workbook has."""
    if package.getinfo(part).file_size > LARGEST_PART:
        raise ValueError(f"{part} is too large")
    data = package.read(part)
    if b"<!DOCTYPE" in data or b"\0" in data:
        raise ValueError(f"{part} is not plain XML")
    return ElementTree.fromstring(data)
