"""Build the add-in, sheetfuncs.xlam: VBA, ribbon and help made from the registry, the same bytes at each build."""

from __future__ import annotations

import struct
import tempfile
import zipfile
from collections.abc import Mapping
from importlib.metadata import version
from io import BytesIO
from pathlib import Path
from typing import TYPE_CHECKING, BinaryIO
from xml.sax.saxutils import escape, quoteattr

from sheetfuncs import __version__
from sheetfuncs.errors import SheetfuncsError
from sheetfuncs.hosts.excel.ribbon import ribbon_xml
from sheetfuncs.hosts.excel.vba_project import modules
from sheetfuncs.workbook.saving import written_beside
from sheetfuncs.workbook.xml import parse

if TYPE_CHECKING:
    from pyopenvba.vba import VBAProject

PROJECT_NAME = "SheetfuncsAddin"
_VBA = "xl/vbaProject.bin"
_RIBBON = "customUI/customUI14.xml"
_CUSTOM = "docProps/custom.xml"
# [MS-OVBA] 2.3.4.1: the mark, the version 0xFFFF and no cache, so that the application compiles from the sources.
_NO_CACHE = bytes.fromhex("CC61FFFF000000")
_NAME_RECORD = 0x0004  # [MS-OVBA] 2.3.4.2.1.6
_OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006"
_CORE = "http://schemas.openxmlformats.org/package/2006/metadata/core-properties"
_DECLARATION = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'
_DATE = "2026-01-01T00:00:00Z"  # any fixed date: the day of the build would change the bytes


def build_addin(out: Path | BinaryIO, *, xlwings_version: str | None = None) -> None:
    """Write the add-in to a path (swapped in when it is whole) or a binary file.

    xlwings_version: the version whose library its VBA is to call; the installed one unless given. The same versions of
    sheetfuncs, xlwings and pyopenvba give the same bytes on every system.
    """
    called = xlwings_version or version("xlwings")
    parts = _template_with_modules(called)
    parts |= {
        _RIBBON: ribbon_xml().encode(), _CUSTOM: _versions_xml(called).encode(),
        "docProps/core.xml": _CORE_XML.encode(), "docProps/app.xml": _APP_XML.encode(),
    }
    parts["_rels/.rels"] = _with_relationships(parts["_rels/.rels"])
    parts["[Content_Types].xml"] = _with_content_type(parts["[Content_Types].xml"])
    package = packed(parts)
    if isinstance(out, Path):
        with written_beside(out) as file:
            file.write(package)
    else:
        out.write(package)


def addin_versions(addin: Path) -> dict[str, str]:
    """What an add-in was built from: {"sheetfuncs": "0.1.0", "xlwings": ..., "pyopenvba": ...}.

    Empty for a file that is no add-in of ours, or no package at all. Signing the add-in changes nothing of this.
    """
    try:
        with zipfile.ZipFile(addin) as package:
            if package.getinfo(_CUSTOM).file_size > 100_000:
                return {}
            properties = parse(package.read(_CUSTOM), _CUSTOM).root
    except (OSError, KeyError, SheetfuncsError, zipfile.BadZipFile):
        return {}
    named = {one.get("name", ""): "".join(str(text) for text in one.itertext()) for one in properties}
    return {name.removeprefix(_BUILT_FROM): text for name, text in named.items() if name.startswith(_BUILT_FROM)}


def packed(parts: Mapping[str, bytes]) -> bytes:
    """A zip package of these parts in this order: not compressed, one fixed date, so the same bytes everywhere."""
    file = BytesIO()
    with zipfile.ZipFile(file, "w", zipfile.ZIP_STORED) as package:
        for name, content in parts.items():
            entry = zipfile.ZipInfo(name, (1980, 1, 1, 0, 0, 0))
            entry.create_system = 0  # else Windows and the others write different codes here
            package.writestr(entry, content)
    return file.getvalue()


def _template_with_modules(xlwings_version: str) -> dict[str, bytes]:
    """The parts of an empty add-in as Excel writes it, which comes with pyopenvba, with our modules in it."""
    from pyopenvba import ExcelFile

    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder, "addin.xlam")
        with ExcelFile.create_new(path) as book:
            project = book.vba_project()
            _rename(project)
            _fill(project, xlwings_version)
            book.save()
        with zipfile.ZipFile(path) as package:
            parts = {name: package.read(name) for name in package.namelist()}
    parts[_VBA] = _without_cache(parts[_VBA])
    return parts


def _fill(project: VBAProject, xlwings_version: str) -> None:
    from pyopenvba import VBAModuleKind

    project.delete_module("Module1")
    for module in modules(xlwings_version):
        source = module.source.replace("\n", "\r\n")
        if module.kind == "workbook":
            project.get_module(module.name).body = source
        else:
            kind = VBAModuleKind.standard if module.kind == "module" else VBAModuleKind.other
            project.add_module(module.name, source, kind=kind)


def _rename(project: VBAProject) -> None:
    """Our own project name in the `dir` stream, in place of the one that every new project has."""
    old, new = (struct.pack("<HI", _NAME_RECORD, len(name)) + name.encode("ascii")
                for name in (project.name, PROJECT_NAME))
    if project.dir_raw.count(old) != 1:
        raise ValueError(f"the empty project of this pyopenvba does not hold its name {project.name!r} exactly once")
    project.dir_raw = project.dir_raw.replace(old, new)
    project.dir_modules_offset += len(new) - len(old)


def _without_cache(project: bytes) -> bytes:
    """The project with our name in its text too, and without compiled code."""
    from pyopenvba.cfb import CFB

    container = CFB.from_bytes(project)
    lines = container.get_stream("PROJECT").split(b"\r\n")
    named = [b'Name="%s"' % PROJECT_NAME.encode() if line.startswith(b"Name=") else line for line in lines]
    container.write_stream("PROJECT", b"\r\n".join(named))
    container.write_stream_in_storage("VBA", "_VBA_PROJECT", _NO_CACHE)
    return container.to_bytes()


_BUILT_FROM = "built from "
_CUSTOM_SET = "{D5CDD505-2E9C-101B-9397-08002B2CF9AE}"  # the set of custom properties, of ISO/IEC 29500-1 22.3
_CORE_XML = (
    f'{_DECLARATION}<cp:coreProperties xmlns:cp="{_CORE}" xmlns:dc="http://purl.org/dc/elements/1.1/" '
    'xmlns:dcterms="http://purl.org/dc/terms/" xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance">'
    "<dc:title>sheetfuncs</dc:title><dc:creator>sheetfuncs</dc:creator>"
    "<dc:description>Regression diagnostics inside the workbook: functions for cells, and a diagnostics sheet beside "
    "the data</dc:description><cp:lastModifiedBy>sheetfuncs</cp:lastModifiedBy>"
    f'<dcterms:created xsi:type="dcterms:W3CDTF">{_DATE}</dcterms:created>'
    f'<dcterms:modified xsi:type="dcterms:W3CDTF">{_DATE}</dcterms:modified></cp:coreProperties>'
)
_APP_XML = (
    f'{_DECLARATION}<Properties xmlns="{_OFFICE}/extended-properties">'
    "<Application>sheetfuncs</Application></Properties>"
)


def _versions_xml(xlwings_version: str) -> str:
    built_from = {"sheetfuncs": __version__, "xlwings": xlwings_version, "pyopenvba": version("pyopenvba")}
    properties = "".join(
        f'<property fmtid="{_CUSTOM_SET}" pid="{place}" name={quoteattr(_BUILT_FROM + name)}>'
        f"<vt:lpwstr>{escape(text)}</vt:lpwstr></property>"
        for place, (name, text) in enumerate(built_from.items(), start=2)
    )
    return (
        f'{_DECLARATION}<Properties xmlns="{_OFFICE}/custom-properties" xmlns:vt="{_OFFICE}/docPropsVTypes">'
        f"{properties}</Properties>"
    )


def _with_relationships(relationships: bytes) -> bytes:
    added = (
        '<Relationship Id="rIdRibbon" Type="http://schemas.microsoft.com/office/2007/relationships/ui/extensibility" '
        f'Target="{_RIBBON}"/><Relationship Id="rIdVersions" Type="{_OFFICE}/relationships/custom-properties" '
        f'Target="{_CUSTOM}"/></Relationships>'
    )
    return relationships.replace(b"</Relationships>", added.encode())


def _with_content_type(types: bytes) -> bytes:
    added = (
        f'<Override PartName="/{_CUSTOM}" ContentType="application/vnd.openxmlformats-officedocument.custom-properties'
        '+xml"/></Types>'
    )
    return types.replace(b"</Types>", added.encode())
