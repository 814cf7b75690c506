"""Which files are workbooks we can write into, and one clear sentence for each that is not.

Accepted: .xlsx and .xlsm, and the templates .xltx and .xltm. An add-in (.xlam) has no visible sheets and is refused.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from typing import BinaryIO

from sheetfuncs.errors import WorkbookBusyError, WorkbookError, WorkbookFormatError
from sheetfuncs.workbook.archive import Archive
from sheetfuncs.workbook.package import TYPES_PART, Package

Book = str | os.PathLike[str] | BinaryIO
"""A workbook: a path, or a binary file that can seek."""

EXTENSIONS = {
    "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet.main+xml": ".xlsx",
    "application/vnd.ms-excel.sheet.macroEnabled.main+xml": ".xlsm",
    "application/vnd.openxmlformats-officedocument.spreadsheetml.template.main+xml": ".xltx",
    "application/vnd.ms-excel.template.macroEnabled.main+xml": ".xltm",
}
_SAVE_AS = "Save it as an Excel workbook (.xlsx) and use that."
_STRICT = "http://purl.oclc.org/ooxml/"


@contextmanager
def open_package(book: Book) -> Iterator[Package]:
    """Open a workbook for reading; a file object that the caller gave stays open.

    Raises WorkbookFormatError for files of another format, encrypted or damaged ones, WorkbookUnsafeError for
    archives that are not safe to open, WorkbookError for files that cannot be read.
    """
    if isinstance(book, str | os.PathLike):
        path = os.fspath(book)
        with _open_file(path) as file:
            yield _package(file, os.path.basename(path))
    else:
        yield _package(book, "The workbook")


def workbook_part(package: Package) -> str:
    """The name of the main part, checked to be a workbook that we can write into."""
    for relationship in package.relationships(""):
        if relationship.kind == "officeDocument" and not relationship.external:
            if relationship.type.startswith(_STRICT):
                raise WorkbookFormatError(
                    f"{package.label} is a Strict Open XML workbook. Save it as 'Excel Workbook (.xlsx)', the ordinary "
                    f"kind, and use that."
                )
            name = package.find(relationship.part)
            _refuse_other_types(package, package.content_type(name) if name else None)
            assert name is not None
            return name
    raise WorkbookFormatError(f"{package.label} is a zip file, but no workbook. {_SAVE_AS}")


def extension_of(package: Package) -> str:
    """The file name extension that fits the package's content, for instance ".xlsm"."""
    return EXTENSIONS[package.content_type(workbook_part(package)) or ""]


def _open_file(path: str) -> BinaryIO:
    try:
        return open(path, "rb")
    except FileNotFoundError:
        raise WorkbookError(f"There is no file {path}. Check the name and the folder.") from None
    except IsADirectoryError:
        raise WorkbookError(f"{path} is a folder; give the workbook inside it.") from None
    except PermissionError:
        raise WorkbookBusyError(
            f"{path} cannot be read: another program holds it, or you have no permission. Close it there and try again."
        ) from None


def _package(file: BinaryIO, label: str) -> Package:
    _refuse_other_formats(file, label)
    package = Package(Archive(file, label))
    if package.find("mimetype") is not None:
        raise WorkbookFormatError(f"{label} is an OpenDocument file (.ods). {_SAVE_AS}")
    if package.find(TYPES_PART) is None:
        raise WorkbookFormatError(f"{label} is a zip file, but no workbook. {_SAVE_AS}")
    workbook_part(package)
    return package


def _refuse_other_types(package: Package, content_type: str | None) -> None:
    if content_type in EXTENSIONS:
        return
    label, kind = package.label, (content_type or "").lower()
    if "sheet.binary" in kind:
        raise WorkbookFormatError(f"{label} is a binary workbook (.xlsb). {_SAVE_AS}")
    if "addin" in kind:
        raise WorkbookFormatError(f"{label} is an add-in (.xlam), which shows no sheets. Give the workbook itself.")
    if "wordprocessing" in kind or "presentation" in kind or "ms-word" in kind or "powerpoint" in kind:
        raise WorkbookFormatError(f"{label} is an Office file, but no workbook. Give the workbook that holds the data.")
    raise WorkbookFormatError(f"{label} is damaged: its main part is no workbook ({content_type}). {_SAVE_AS}")


def _refuse_other_formats(file: BinaryIO, label: str) -> None:
    """Tell by the first bytes what a file is; the extension proves nothing."""
    file.seek(0)
    start = file.read(4096)
    if start[:4] == b"PK\3\4":
        return
    if not start:
        raise WorkbookFormatError(f"{label} is empty. Give a workbook (.xlsx or .xlsm).")
    if start[:8] == b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1":
        _refuse_compound_file(file, label)
    if start[:4] == b"PK\5\6":
        raise WorkbookFormatError(f"{label} is an empty zip file. Give a workbook (.xlsx or .xlsm).")
    text = start.removeprefix(b"\xef\xbb\xbf").lstrip().lower()
    if text.startswith((b"<?xml", b"<html", b"<!doctype", b"<table", b"<workbook")):
        raise WorkbookFormatError(f"{label} is a web page or XML text, whatever its extension says. {_SAVE_AS}")
    if b"\0" not in start:
        raise WorkbookFormatError(f"{label} is plain text, such as .csv. Open it in a spreadsheet program. {_SAVE_AS}")
    raise WorkbookFormatError(f"{label} is no workbook, or damaged: it does not begin as a zip file does. {_SAVE_AS}")


def _refuse_compound_file(file: BinaryIO, label: str) -> None:
    """An OLE compound file: a workbook under a password, or the format before 2007 ([MS-CFB], [MS-OFFCRYPTO] 2.3)."""
    file.seek(0)
    overlap, wanted = b"", "EncryptedPackage".encode("utf-16-le")
    while chunk := file.read(1 << 20):
        if wanted in overlap + chunk:
            raise WorkbookFormatError(
                f"{label} is encrypted with a password. Open it, remove the password under 'Protect Workbook', save a "
                f"copy, and use that."
            )
        overlap = chunk[-len(wanted) :]
    raise WorkbookFormatError(f"{label} is in the format of before 2007 (.xls). {_SAVE_AS}")
