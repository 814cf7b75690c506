"""How a range that stands in a formula is read: exactly, once, and no further than the sheet is used."""

from __future__ import annotations

from functools import cache
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import xlwings as xw

MANY_AREAS = "#VALUE!"


@cache
def range_reader() -> type:
    """The converter for `xlwings.arg`: xlwings' own way to read values, with our reading in place of its first step.

    A bare error value or a single constant in place of a range stays what it is.
    """
    from xlwings.conversion import ReadValueFromRangeStage, ValueAccessor

    class RangeArgument(ValueAccessor):
        @classmethod
        def reader(cls, options: dict[str, Any]) -> Any:
            steps = ValueAccessor.reader(options)
            steps.insert_stage(_read, replace=ReadValueFromRangeStage)
            return steps.append_stage(_unwrap)

    return RangeArgument


def _read(context: Any) -> None:
    if context.range is None:
        context.meta["bare"] = not isinstance(context.value, list | tuple)
    elif context.range.api.Areas.Count > 1:  # "(B2:B9,D2:D9)", of which Excel would give the first part only
        context.value, context.meta["bare"] = MANY_AREAS, True
    else:
        context.value = read_exactly(within_used_rows(context.range))


def _unwrap(context: Any) -> None:
    if context.meta.get("bare"):
        context.value = context.value[0][0]


def within_used_rows(cells: xw.Range) -> xw.Range:
    """Whole columns cut behind the sheet's last used row; any other range as it is."""
    from sheetfuncs.cells.address import MAX_ROWS

    if cells.row + cells.shape[0] - 1 < MAX_ROWS:
        return cells
    used = cells.sheet.used_range
    last = used.row + used.shape[0] - 1
    return cells.resize(max(1, last - cells.row + 1), cells.shape[1])


def read_exactly(cells: xw.Range) -> Any:
    """What the cells hold: dates and currency as their numbers, error values as Excel's numbers for them."""
    return cells.api.Value2
