"""Workbooks for the tests: a small packer that knows nothing of the code under test, and the sheet to insert."""

from __future__ import annotations

import io
import posixpath
import struct
import warnings
import zipfile
import zlib
from dataclasses import dataclass, field

import openpyxl
import xlsxwriter

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
RELATIONSHIPS = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
PACKAGE = "http://schemas.openxmlformats.org/package/2006"
SHEET_ML = "application/vnd.openxmlformats-officedocument.spreadsheetml."
DECLARATION = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\r\n'
SETTINGS = '="{""range"":""Data!A1:B4""}"'


@dataclass
class Parts:
    """A package in the making: parts by name, their types, and relationships by source."""

    content: dict[str, bytes] = field(default_factory=dict)
    types: dict[str, str] = field(default_factory=dict)
    defaults: dict[str, str] = field(default_factory=lambda: {"xml": "application/xml"})
    arrows: dict[str, list[tuple[str, str, str, bool]]] = field(default_factory=dict)

    def add(self, part: str, content: str | bytes, type_: str | None = None) -> None:
        self.content[part] = content.encode() if isinstance(content, str) else content
        if type_:
            self.types[part] = type_

    def relate(self, source: str, kind: str, target: str, *, outside: bool = False) -> str:
        """`kind` is the last word of an office relationship, or a whole type; returns the id."""
        arrows = self.arrows.setdefault(source, [])
        id_ = f"rId{len(arrows) + 1}"
        arrows.append((id_, kind if "/" in kind else f"{RELATIONSHIPS}/{kind}", target, outside))
        return id_

    def files(self) -> dict[str, bytes]:
        """Every zip entry, content types first."""
        types = f'{DECLARATION}<Types xmlns="{PACKAGE}/content-types">'
        defaults = {"rels": "application/vnd.openxmlformats-package.relationships+xml", **self.defaults}
        types += "".join(f'<Default Extension="{ext}" ContentType="{t}"/>' for ext, t in defaults.items())
        types += "".join(f'<Override PartName="/{part}" ContentType="{t}"/>' for part, t in self.types.items())
        files = {"[Content_Types].xml": (types + "</Types>").encode()}
        for source, arrows in self.arrows.items():
            folder, name = posixpath.split(source)
            lines = "".join(
                f'<Relationship Id="{id_}" Type="{type_}" Target="{target}"'
                + (' TargetMode="External"' if outside else "")
                + "/>"
                for id_, type_, target, outside in arrows
            )
            text = f'{DECLARATION}<Relationships xmlns="{PACKAGE}/relationships">{lines}</Relationships>'
            files[posixpath.join(folder, "_rels", name + ".rels")] = text.encode()
        return files | self.content


def zipped(files: dict[str, bytes], *, method: int = zipfile.ZIP_DEFLATED, comment: bytes = b"") -> bytes:
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", method) as archive:
        for name, data in files.items():
            archive.writestr(zipfile.ZipInfo(name, (2024, 2, 29, 12, 30, 4)), data, method)
        archive.comment = comment
    return buffer.getvalue()


def unzipped(data: bytes) -> dict[str, bytes]:
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        return {info.filename: archive.read(info) for info in archive.infolist()}


def opened(data: bytes, **options) -> openpyxl.Workbook:
    """The workbook as openpyxl reads it; its warnings tell what it could not write again, and it only reads here."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        return openpyxl.load_workbook(io.BytesIO(data), **options)


def zipped_by_hand(files: dict[str, bytes], *, descriptors: bool = False, zip64: bool = False) -> bytes:
    """A zip as streaming writers make it: sizes behind the data (flag bit 3), or in zip64 extra fields."""
    out, directory = bytearray(), bytearray()
    for place, (name, data) in enumerate(files.items()):
        deflate = zlib.compressobj(9, zlib.DEFLATED, -15)
        packed, method = (data, 0) if place % 3 == 2 else (deflate.compress(data) + deflate.flush(), 8)
        crc, flags, offset, raw = zlib.crc32(data), 0x0808 if descriptors else 0x0800, len(out), name.encode()
        kept = struct.pack("<HHBL", 0x5455, 5, 1, 1_700_000_000)
        local_extra = kept + (struct.pack("<HHQQ", 1, 16, len(data), len(packed)) if zip64 else b"")
        central_extra = kept + (struct.pack("<HHQQQ", 1, 24, len(data), len(packed), offset) if zip64 else b"")
        sizes = (0xFFFFFFFF,) * 2 if zip64 else (len(packed), len(data))
        local_sizes = (0, 0, 0) if descriptors else (crc, *sizes)
        need = 45 if zip64 else 20
        out += struct.pack("<4s5H3L2H", b"PK\3\4", need, flags, method, 0x6000, 0x5A00, *local_sizes, len(raw),
                           len(local_extra)) + raw + local_extra + packed  # fmt: skip
        if descriptors:
            out += struct.pack("<4s3L", b"PK\7\x08", crc, len(packed), len(data))
        directory += struct.pack("<4s6H3L5H2L", b"PK\1\2", need, need, flags, method, 0x6000, 0x5A00, crc, *sizes,
                                 len(raw), len(central_extra), 0, 0, 0, 0o644 << 16,
                                 0xFFFFFFFF if zip64 else offset) + raw + central_extra  # fmt: skip
    start, count = len(out), len(files)
    out += directory
    if zip64:
        end = len(out)
        out += struct.pack("<4sQ2H2L4Q", b"PK\6\6", 44, 45, 45, 0, 0, count, count, len(directory), start)
        out += struct.pack("<4sLQL", b"PK\6\7", 0, end, 1)
        count, start = 0xFFFF, 0xFFFFFFFF
    out += struct.pack("<4s4H2LH", b"PK\5\6", 0, 0, count, count, len(directory), start, 0)
    return bytes(out)


def sheet_to_insert(name: str = "Check of Data", *, rows: int = 12, plain: bool = False, inline: bool = False) -> bytes:
    """One sheet as a report draws it: formats, charts, conditional formats, links, formulas, settings."""
    buffer = io.BytesIO()
    book = xlsxwriter.Workbook(buffer, {"constant_memory": inline})
    sheet = book.add_worksheet(name)
    base = {"font_name": "Arial", "font_size": 10, "font_color": "#1F2933"}
    title = book.add_format({**base, "bold": True, "font_size": 14, "bottom": 1, "bottom_color": "#D5DAE0"})
    number = book.add_format({**base, "num_format": '0.000 "kWh"', "bg_color": "#CFE3F1"})
    percent = book.add_format({**base, "num_format": "0.0%", "border": 1})
    link = book.add_format({**base, "font_color": "#0072B2", "underline": 1})
    flagged = book.add_format({"font_color": "#D55E00", "num_format": "0.00"})
    sheet.set_column("A:A", 30, title)
    sheet.set_column("B:D", 14)
    sheet.hide_gridlines(2)
    sheet.write(0, 0, "Do the errors grow with the size?", title)
    sheet.write_rich_string(1, 0, "evidence ", book.add_format({"bold": True}), "against", " it ", title)
    sheet.write_url(2, 0, "internal:'Data'!A2", link, "row 2 of the data")
    sheet.write_url(3, 0, f"internal:'{name}'!B6", link, "further down")
    sheet.write_url(4, 0, "https://example.org/notes?x=1&y=2", link, "a published note")
    for row in range(5, 5 + rows):
        sheet.write_row(row, 1, [row, row**0.5], number)
        sheet.write_formula(row, 3, f"=C{row + 1}/SUM($C$6:$C${5 + rows})", percent, row**0.5 / 30)
    sheet.write_string(5 + rows, 1, "=not a formula <&> ☃", percent)
    if not plain:
        book.define_name(f"'{name}'!_sheetfuncs_settings", SETTINGS)
        book.define_name(f"'{name}'!span", f"='{name}'!$B$6:$B${5 + rows}")
        sheet.print_area(0, 0, 5 + rows, 8)
        sheet.conditional_format(5, 1, 4 + rows, 2, {"type": "cell", "criteria": ">", "value": 3, "format": flagged})
        sheet.conditional_format(5, 3, 4 + rows, 3, {"type": "data_bar", "data_bar_2010": True})
        for kind in ("scatter", "column"):
            chart = book.add_chart({"type": kind})
            cells = [[name, 5, column, 4 + rows, column] for column in (1, 2)]
            chart.add_series({"name": [name, 0, 0], "categories": cells[0], "values": cells[1]})
            chart.set_title({"name": f"='{name}'!$A$1"})
            sheet.insert_chart(2, 5, chart)
    book.close()
    return buffer.getvalue()
