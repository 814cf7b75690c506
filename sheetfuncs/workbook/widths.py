"""Column widths carried over: they count digits of a workbook's default font, so another default font shifts them.

ISO/IEC 29500-1, 18.3.1.13: a width of w takes about w times the width of the widest digit, in whole pixels, of the
font of the Normal style. A sheet drawn for one font would show #### under a smaller one.
"""

from __future__ import annotations

import math

from lxml import etree

from sheetfuncs.workbook.xml import child, children, main

_PIXELS_PER_POINT = 96 / 72
_USUAL_SHARE = 0.53
_DIGIT_SHARE = {
    "arial": 0.556, "liberation sans": 0.556, "helvetica": 0.556, "calibri": 0.507, "carlito": 0.507,
    "cambria": 0.554, "courier new": 0.600, "consolas": 0.550, "segoe ui": 0.539, "tahoma": 0.546,
    "times new roman": 0.500, "liberation serif": 0.500, "trebuchet ms": 0.524, "verdana": 0.636,
}  # fmt: skip
"""Width of a digit as a share of the font's size, from the fonts' own metrics (from memory, two to three digits)."""


def digit_pixels(font: etree._Element | None) -> int | None:
    """The width of a digit at 96 dots an inch; None where the font does not say its size."""
    if font is None:
        return None
    name, size = (child(font, tag) for tag in ("name", "sz"))
    try:
        points = float("" if size is None else size.get("val", ""))
    except ValueError:
        return None
    if not 1 <= points <= 409:
        return None
    share = _DIGIT_SHARE.get("" if name is None else name.get("val", "").casefold(), _USUAL_SHARE)
    return max(1, math.floor(points * _PIXELS_PER_POINT * share + 0.5))


def fit_widths(sheet: etree._Element, drawn_for: etree._Element | None, host: etree._Element | None) -> None:
    """Change the widths of a sheet's columns so that they take as many pixels as they were drawn for."""
    pixels, host_pixels = digit_pixels(drawn_for), digit_pixels(host)
    if pixels is None or host_pixels is None or pixels == host_pixels:
        return
    for columns in children(sheet, "cols"):
        for column in columns.iterchildren(main("col")):
            try:
                width = float(column.get("width", ""))
            except ValueError:
                continue
            column.set("width", f"{min(255.0, width * pixels / host_pixels):.6g}")
            column.set("customWidth", "1")
