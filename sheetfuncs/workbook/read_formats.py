"""Which cell formats show a number as a date or a time (ISO/IEC 29500-1, 18.8.30 and 18.8.31)."""

from __future__ import annotations

import re

import numpy as np

from sheetfuncs.workbook.package import Package
from sheetfuncs.workbook.xml import child, children, integer

# Built-in formats with dates and times: 14-22 and 45-47 everywhere, 27-36 and 50-58 in East Asian locales.
_BUILT_IN = frozenset({*range(14, 23), *range(27, 37), *range(45, 48), *range(50, 59)})

# What a format code may hold that is no placeholder: quoted text, escaped and padding characters, colours,
# conditions and locales in brackets, the word General, and the exponent of scientific notation.
_NO_PLACEHOLDER = re.compile(r'"[^"]*"?|[\\_*].|\[(?!(?:h+|m+|s+)\])[^\]]*\]?|general|e[+\-]', re.IGNORECASE)
_PLACEHOLDER = re.compile("[dmyhs]", re.IGNORECASE)


def is_date_code(code: str) -> bool:
    """Whether a number format shows days, months, years, hours, minutes or seconds, elapsed time included."""
    return _PLACEHOLDER.search(_NO_PLACEHOLDER.sub("", code)) is not None


def date_formats(package: Package, workbook_part: str) -> np.ndarray:
    """bool, one a cell format (the `s` of a cell): whether it shows a date or a time."""
    for relationship in package.relationships(workbook_part):
        if relationship.kind == "styles" and not relationship.external:
            name = package.find(relationship.part)
            if name is not None:
                return _from_styles(package, name)
    return np.zeros(1, bool)


def _from_styles(package: Package, name: str) -> np.ndarray:
    root = package.document(name).root
    codes = {
        integer(element, "numFmtId"): element.get("formatCode", "")
        for element in children(child(root, "numFmts"), "numFmt")
    }
    numbers = [integer(element, "numFmtId") for element in children(child(root, "cellXfs"), "xf")] or [0]
    dates = {number: is_date_code(codes[number]) if number in codes else number in _BUILT_IN for number in set(numbers)}
    return np.array([dates[number] for number in numbers])
