"""How a range that stands in a formula is read: exactly, once, and no further than the sheet is used."""

from __future__ import annotations

from functools import cache
from typing import Any

from sheetfuncs.hosts.excel.ranges import within_used

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
        context.value = within_used(context.range).api.Value2  # as the cells hold it, nothing rounded


def _unwrap(context: Any) -> None:
    if context.meta.get("bare"):
        context.value = context.value[0][0]
