"""Where a new printed page begins, so that no heading ends a page and no row of charts is cut."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from sheetfuncs.report.layout import COLUMN_PIXELS, COUNT, MARGIN_PIXELS, ROW_POINTS

MARGIN_LEFT_RIGHT, MARGIN_TOP, MARGIN_BOTTOM = 0.45, 0.4, 0.5  # inches
_A4 = (297 / 25.4, 210 / 25.4)
_WIDTH_POINTS = (COUNT * COLUMN_PIXELS + MARGIN_PIXELS) * 72 / 96
# Landscape A4 is the tightest of the usual papers; a little is kept back for hosts that round rows up.
_SCALE = (_A4[0] - 2 * MARGIN_LEFT_RIGHT) * 72 / _WIDTH_POINTS
PAGE_POINTS = (_A4[1] - MARGIN_TOP - MARGIN_BOTTOM) * 72 / _SCALE * 0.98


def page_breaks(
    heights: Mapping[int, float], rows: int, kept: Sequence[tuple[int, int]], repeated: float
) -> tuple[int, ...]:
    """Rows after which a page begins.

    kept: stretches of rows, first to last, that stay on one page if they fit on one. repeated: points that the rows
    printed on every page take.
    """
    breaks: list[int] = []
    used, row, room = 0.0, 1, PAGE_POINTS - repeated
    while row <= rows:
        last, block = _block(heights, row, rows, kept, room)
        if used and used + block > room:
            breaks.append(row - 1)
            used = 0.0
        used += block
        row = last + 1
    return tuple(breaks)


def _block(
    heights: Mapping[int, float], row: int, rows: int, kept: Sequence[tuple[int, int]], room: float
) -> tuple[int, float]:
    """Last row and height of what stays together from this row on: stretches that overlap count as one."""
    last = row
    block = heights.get(row, ROW_POINTS)
    for first, end in sorted(kept):
        if first < row or first > last or end <= last:
            continue
        end = min(end, rows)
        longer = block + sum(heights.get(r, ROW_POINTS) for r in range(last + 1, end + 1))
        if longer <= room:
            last, block = end, longer
    return last, block
