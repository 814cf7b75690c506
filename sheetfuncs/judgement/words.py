"""Numbers as a person would say them."""

from __future__ import annotations

import math


def number(value: float, digits: int = 3) -> str:
    """A figure with so many significant digits, thousands separated: 12,300; 0.0456; 3.10e-07."""
    if value == 0 or not math.isfinite(value):
        return "0" if value == 0 else "not a number"
    size = math.floor(math.log10(abs(float(f"{value:.{digits - 1}e}"))))  # of the rounded figure: 9.999 is 10.0
    if size >= 9 or size < -4:
        return f"{value:.{digits - 1}e}"
    decimals = max(digits - 1 - size, 0)
    rounded = round(value, digits - 1 - size)
    return f"{rounded:,.{decimals}f}"


def pvalue(p: float) -> str:
    """"p = 0.032"; below a thousandth "p < 0.001", and below a millionth its power of ten."""
    if p < 1e-6:
        return f"p < 1e{math.ceil(math.log10(p)) if p > 0 else -300}"
    if p < 0.001:
        return "p < 0.001"
    return f"p = {p:.2g}"


def signed(value: float) -> str:
    """"+0.58", "-1.20"; a value that rounds to nothing is "0.00", without a sign that would say more than it knows."""
    return f"{value:+.2f}" if abs(value) >= 0.005 else "0.00"


def times(ratio: float) -> str:
    """"2.4 times"."""
    return f"{ratio:.1f} times" if ratio < 10 else f"{ratio:,.0f} times"


def counted(count: int, noun: str, plural: str | None = None) -> str:
    """"1 row", "12 rows"."""
    return f"{count:,} {noun if count == 1 else plural or noun + 's'}"


def listed(items: list[str] | tuple[str, ...], last: str = "and") -> str:
    """"a, b and c"."""
    if not items:
        return "nothing"
    return items[0] if len(items) == 1 else f"{', '.join(items[:-1])} {last} {items[-1]}"
