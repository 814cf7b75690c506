"""Number formats that show the digits that mean something; the stored value stays whole."""

from __future__ import annotations

import math
from collections.abc import Iterable

import numpy as np

WHOLE = "#,##0"
PVALUE = '[<0.001]"< 0.001";[<0.1]0.000;0.00'
SCIENTIFIC = "0.00E+00"
_LARGE, _SMALL = 1e9, 1e-4
# What a column of the sheet takes: 82 pixels of nine-point figures.
MOST_CHARACTERS, MOST_IN_POWERS = 11, 6


def digits_format(value: float, digits: int = 4) -> str:
    """So many significant digits of this value; beyond a billion and below a ten-thousandth in powers of ten."""
    if value == 0 or not math.isfinite(value):
        return "0"
    if not _SMALL <= abs(value) < _LARGE:
        return "0." + "0" * (min(digits, MOST_IN_POWERS) - 1) + "E+00"
    return decimals_format(_that_fit(value, decimals(value, digits)))


def _that_fit(value: float, count: int) -> int:
    """At most so many decimals that the number stands in one column of the sheet, sign and separators included."""
    whole = len(f"{abs(value):,.0f}") + 1
    return max(min(count, MOST_CHARACTERS - whole - 1), 0)


def decimals(value: float, digits: int) -> int:
    """How many decimals show so many significant digits of this value."""
    if value == 0 or not math.isfinite(value):
        return 0
    return max(digits - 1 - math.floor(math.log10(abs(value))), 0)


def decimals_format(count: int) -> str:
    """Thousands separated, so many decimals."""
    return WHOLE + ("." + "0" * count if count else "")


def estimate_format(estimate: float, error: float) -> str:
    """An estimate to the decimals at which its standard error has three digits, so that no digit is mere noise."""
    if not math.isfinite(error) or error == 0:
        return digits_format(estimate, 6)
    count = decimals(error, 3)
    if abs(estimate) >= _LARGE or count > 8:
        return digits_format(estimate, 6 if abs(estimate) >= _LARGE else 4)
    return decimals_format(_that_fit(estimate, count))


def column_format(values: Iterable[float], digits: int = 4) -> str:
    """One format for a column: so many significant digits of its largest value."""
    sizes = [abs(v) for v in values if math.isfinite(v)]
    return digits_format(max(sizes), digits) if sizes else "0"


def data_format(values: Iterable[float]) -> str:
    """A column of data as entered: whole numbers stay whole, others get the digits that are in use, at most six."""
    sizes = [v for v in values if math.isfinite(v)]
    if not sizes:
        return "0"
    largest = max(abs(v) for v in sizes)
    if largest >= _LARGE or 0 < largest < _SMALL:
        return digits_format(largest, 6)
    most = _that_fit(largest, decimals(largest, 6))
    table = np.asarray(sizes)
    for count in range(most):
        if (np.abs(table - table.round(count)) <= 1e-9 * largest).all():
            return decimals_format(count)
    return decimals_format(most)
