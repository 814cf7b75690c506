"""Differently-built workbooks to insert a sheet into. Their first sheet is "Data", with numbers to compare."""

from __future__ import annotations

import io
import struct
import zlib
from collections.abc import Callable
from functools import cache

import openpyxl
import xlsxwriter
from openpyxl.chart import BarChart, Reference
from openpyxl.comments import Comment
from openpyxl.formatting.rule import CellIsRule, ColorScaleRule
from openpyxl.styles import Font, NamedStyle, PatternFill
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.table import Table
from workbook_build import SHEET_ML, unzipped, zipped, zipped_by_hand
from workbook_handmade import BY_HAND

ROWS = [["load", "hours"], [1.5, 2], [2.5, 3], [4.0, 5.25], [8.0, 9.5]]


def _with_xlsxwriter(fill: Callable[[xlsxwriter.Workbook, xlsxwriter.worksheet.Worksheet], None], **options) -> bytes:
    buffer = io.BytesIO()
    book = xlsxwriter.Workbook(buffer, options)
    sheet = book.add_worksheet("Data")
    for place, row in enumerate(ROWS):
        sheet.write_row(place, 0, row)
    fill(book, sheet)
    book.close()
    return buffer.getvalue()


def _picture() -> io.BytesIO:
    def chunk(kind: bytes, data: bytes) -> bytes:
        return struct.pack(">L", len(data)) + kind + data + struct.pack(">L", zlib.crc32(kind + data))

    head = chunk(b"IHDR", struct.pack(">2L5B", 2, 2, 8, 2, 0, 0, 0))
    pixels = chunk(b"IDAT", zlib.compress(b"\0\0\x72\xb2\xd5\x5e\0" * 2))
    return io.BytesIO(b"\x89PNG\r\n\x1a\n" + head + pixels + chunk(b"IEND", b""))


def plain(book, sheet):
    book.add_worksheet("Other").write_formula(0, 0, "=SUM(Data!A2:A5)", None, 16)


def numbers_only() -> bytes:
    """No text at all: a package without shared strings."""
    buffer = io.BytesIO()
    book = xlsxwriter.Workbook(buffer)
    book.add_worksheet("Data").write_column(0, 0, [1, 2, 3])
    book.close()
    return buffer.getvalue()


def charts_and_pictures(book, sheet):
    for kind in ("line", "pie", "scatter"):
        chart = book.add_chart({"type": kind})
        chart.add_series({"categories": "=Data!$A$2:$A$5", "values": "=Data!$B$2:$B$5"})
        sheet.insert_chart(1, 4, chart)
    sheet.insert_image(10, 4, "dot.png", {"image_data": _picture()})
    page = book.add_chartsheet("Chart page")
    chart = book.add_chart({"type": "bar"})
    chart.add_series({"values": "=Data!$A$2:$A$5"})
    page.set_chart(chart)
    book.add_worksheet("After the chart page").write(0, 0, "text")


def active_and_hidden(book, sheet):
    first, second, third = (book.add_worksheet(name) for name in ("Hidden one", "Quiet", "Front"))
    first.hide()
    second.very_hidden()
    third.activate()
    third.set_first_sheet()
    for name, area in (("local", "=Front!$A$1"), ("local2", "=Front!$B$2")):
        book.define_name(f"Front!{name}", area)
    book.define_name("everywhere", "=Data!$A$2:$A$5")
    third.repeat_rows(0, 1)
    sheet.print_area("A1:B5")
    third.autofilter("A1:B3")


def tables(book, sheet):
    sheet.add_table(
        "A1:B5", {"name": "Loads", "columns": [{"header": "load"}, {"header": "hours"}], "total_row": False}
    )
    book.add_worksheet("It's a name").add_table("B2:C6", {"name": "Second"})


def notes_and_rules(book, sheet):
    sheet.write_comment("A2", "first reading")
    sheet.data_validation("B2:B5", {"validate": "decimal", "criteria": ">", "value": 0})
    sheet.conditional_format("A2:A5", {"type": "2_color_scale"})
    sheet.conditional_format("B2:B5", {"type": "data_bar", "data_bar_2010": True})
    warm = book.add_format({"bg_color": "#FFEEDD", "num_format": "0.000"})
    sheet.conditional_format("B2:B5", {"type": "cell", "criteria": "<", "value": 4, "format": warm})
    sheet.add_sparkline("D2", {"range": "Data!A2:B2"})
    sheet.insert_checkbox("E9", True)
    sheet.insert_textbox("E12", "remember")
    sheet.insert_button("E20", {"caption": "press"})


def macros(book, sheet):
    book.add_vba_project(io.BytesIO(b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(504)), True)
    book.set_vba_name("ThisBook")
    sheet.set_vba_name("FirstSheet")


def dynamic_arrays(book, sheet):
    sheet.write_dynamic_array_formula("D2:D5", "=SORT(A2:A5)", None, 1.5)
    sheet.write_formula("F1", "=LET(a,A2,a+1)", None, 2.5)


def dressed(book, sheet):
    sheet.set_header("&L&G", {"image_left": "dot.png", "image_data_left": _picture()})
    sheet.set_background(_picture())
    sheet.protect("word")
    sheet.set_row(2, 20, book.add_format({"italic": True}))
    book.set_properties({"title": "Loads", "company": "invented"})
    book.set_custom_property("Checked", True)
    book.set_calc_mode("manual")


def many_formats(book, sheet):
    for place in range(60):
        style = {"font_size": 8 + place % 7, "bg_color": f"#{place * 4:02X}88CC", "num_format": f'0.0" u{place}"'}
        sheet.write_number(place, 6, place, book.add_format(style))


def _with_openpyxl(fill: Callable[[openpyxl.Workbook], None]) -> bytes:
    book = openpyxl.Workbook()
    book.active.title = "Data"
    for row in ROWS:
        book.active.append(row)
    fill(book)
    buffer = io.BytesIO()
    book.save(buffer)
    return buffer.getvalue()


def openpyxl_plain(book):
    book.create_sheet("Second")["A1"] = "=Data!A2*2"
    book.active = 1


def openpyxl_styled(book):
    style = NamedStyle("Meter", font=Font(name="Verdana", bold=True), number_format='0.00 "m³"')
    book.add_named_style(style)
    scale = ColorScaleRule(start_type="min", end_type="max", start_color="FFFFFF", end_color="0072B2")
    book["Data"]["B2"].style = "Meter"
    book["Data"]["A2"].style = "Comma"
    book["Data"].conditional_formatting.add("A2:A5", CellIsRule("lessThan", ["3"], fill=PatternFill(bgColor="FFD0D0")))
    book["Data"].conditional_formatting.add("B2:B5", scale)


def openpyxl_objects(book):
    sheet = book["Data"]
    chart = BarChart()
    chart.add_data(Reference(sheet, min_col=2, min_row=1, max_row=5), titles_from_data=True)
    sheet.add_chart(chart, "E5")
    sheet["A3"].comment = Comment("see the log", "invented")
    sheet.add_table(Table(displayName="Loads", ref="A1:B5"))
    sheet["B2"].hyperlink = "https://example.org/"
    rule = DataValidation(type="list", formula1='"yes,no"')
    rule.add("D2")
    sheet.add_data_validation(rule)
    page = BarChart()
    page.add_data(Reference(sheet, min_col=1, min_row=1, max_row=5), titles_from_data=True)
    book.create_chartsheet("Chart only").add_chart(page)


def openpyxl_names(book):
    book.create_sheet("Tail")
    book.defined_names["all_loads"] = DefinedName("all_loads", attr_text="Data!$A$2:$A$5")
    book["Tail"].defined_names["here"] = DefinedName("here", attr_text="Tail!$A$1")
    book["Data"].print_title_rows = "1:1"
    book["Data"].auto_filter.ref = "A1:B5"
    book.security.lockStructure = True
    book["Tail"].sheet_state = "hidden"
    book.epoch = openpyxl.utils.datetime.CALENDAR_MAC_1904


def _restyled(data: bytes, **changes: Callable[[bytes], bytes]) -> bytes:
    files = unzipped(data)
    for name, change in changes.items():
        part = {"workbook": "xl/workbook.xml", "styles": "xl/styles.xml", "types": "[Content_Types].xml"}[name]
        files[part] = change(files[part])
    return zipped(files)


def _template(data: bytes) -> bytes:
    old, new = f"{SHEET_ML}sheet.main+xml".encode(), f"{SHEET_ML}template.main+xml".encode()
    return _restyled(data, types=lambda text: text.replace(old, new))


def _utf16(text: bytes) -> bytes:
    return text.decode().replace("UTF-8", "UTF-16").encode("utf-16")


def _with_bom(text: bytes) -> bytes:
    return b"\xef\xbb\xbf" + text.replace(b"\n", b"\r\n", 1)


def _single_quoted(text: bytes) -> bytes:
    return b"<?xml version='1.0' encoding='utf-8'?>" + text.split(b"?>", 1)[1]


def _plain() -> bytes:
    return _with_xlsxwriter(plain)


_DRAWN = [
    plain, charts_and_pictures, active_and_hidden, tables, notes_and_rules, macros, dynamic_arrays, dressed,
    many_formats,
]  # fmt: skip
_OPENPYXL = [openpyxl_plain, openpyxl_styled, openpyxl_objects, openpyxl_names]

HOSTS: dict[str, Callable[[], bytes]] = {
    **{f"xlsxwriter: {fill.__name__}": lambda fill=fill: _with_xlsxwriter(fill) for fill in _DRAWN},
    "xlsxwriter: numbers_only": numbers_only,
    "xlsxwriter: inline strings": lambda: _with_xlsxwriter(plain, constant_memory=True),
    "xlsxwriter: 1904 dates": lambda: _with_xlsxwriter(plain, date_1904=True),
    "xlsxwriter: zip64": lambda: _with_xlsxwriter(plain, use_zip64=True),
    **{fill.__name__.replace("_", ": ", 1): lambda fill=fill: _with_openpyxl(fill) for fill in _OPENPYXL},
    "a template": lambda: _template(_plain()),
    "utf-16 workbook and styles": lambda: _restyled(_plain(), workbook=_utf16, styles=_utf16),
    "byte order marks": lambda: _restyled(_plain(), workbook=_with_bom, styles=_with_bom, types=_with_bom),
    "declarations in single quotes": lambda: _restyled(_plain(), workbook=_single_quoted, styles=_single_quoted),
    "zip: stored": lambda: zipped(unzipped(_plain()), method=0),
    "zip: descriptors": lambda: zipped_by_hand(unzipped(_plain()), descriptors=True),
    "zip: zip64 extras": lambda: zipped_by_hand(unzipped(_plain()), zip64=True),
    "zip: comment": lambda: zipped(unzipped(_plain()), comment=b"kept by the archive tool"),
    "zip: reversed order": lambda: zipped(dict(reversed(unzipped(_plain()).items()))),
    **{f"by hand: {name}": build for name, build in BY_HAND.items()},
}
HOSTS = {name: cache(build) for name, build in HOSTS.items()}
