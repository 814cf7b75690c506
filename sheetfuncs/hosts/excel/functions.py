"""The worksheet functions as Excel calls them: one module-level function for each entry of the registry.

They are made from the registry when this module is imported, under their worksheet names (FIT_VIF, ...), and marked
for xlwings, whose server looks them up here. Without Excel's COM interface (macOS, Linux) the marks do nothing and
the functions can be called all the same.
"""

from __future__ import annotations

import atexit
import inspect
import sys
from collections import OrderedDict
from collections.abc import Callable
from typing import Any

from sheetfuncs.functions.evaluate import evaluate
from sheetfuncs.functions.registry import REGISTRY, WorksheetFunction
from sheetfuncs.hosts.excel.arguments import range_reader
from sheetfuncs.hosts.excel.values import as_option, as_rows, for_excel

CATEGORY = "sheetfuncs"
_KEPT = 50
_unexpected: OrderedDict[str, str] = OrderedDict()


def answer(name: str, *given: object) -> object:
    """The value of a worksheet function for what Excel sent, in the shape that Excel takes. Never raises.

    A failure that nobody foresaw becomes "#VALUE!", and its sentence is kept for `unexpected_failure`.
    """
    try:
        kinds = [argument.kind for argument in REGISTRY[name].arguments]
        values = [as_rows(one) if kind == "range" else as_option(one) for one, kind in zip(given, kinds, strict=False)]
        return for_excel(evaluate(name, *values, *given[len(kinds) :]))
    except Exception as failure:
        _keep(name, failure)
        return "#VALUE!"


def unexpected_failure(name: str) -> str | None:
    """The sentence of this function's latest unforeseen failure in this process; None without one."""
    return _unexpected.get(name)


def failure_sentence(failure: BaseException) -> str:
    """An unforeseen failure in one sentence: what it was, and where in our code."""
    place = failure.__traceback__
    while place is not None and place.tb_next is not None:
        place = place.tb_next
    where = "" if place is None else f", {place.tb_frame.f_code.co_name}, line {place.tb_lineno}"
    said = " ".join(str(failure).split())[:200]
    return (
        f"Something that should not happen did ({type(failure).__name__}: {said}{where}): please report it with the "
        "data that led to it."
    )


def _keep(name: str, failure: Exception) -> None:
    _unexpected[name] = failure_sentence(failure)
    _unexpected.move_to_end(name)
    while len(_unexpected) > _KEPT:
        _unexpected.popitem(last=False)


def _made(function: WorksheetFunction) -> Callable[..., object]:
    """The function with the registry's name, signature and help. Optional arguments default to None: omitted."""

    def called(*given):  # without hints, which xlwings would take for converters
        return answer(function.name, *given)

    called.__name__ = called.__qualname__ = function.name
    called.__doc__ = function.summary
    called.__signature__ = inspect.Signature([  # type: ignore[attr-defined]
        inspect.Parameter(
            argument.name, inspect.Parameter.POSITIONAL_OR_KEYWORD,
            default=None if argument.optional else inspect.Parameter.empty,
        )
        for argument in function.arguments
    ])
    return called


def _marked(function: WorksheetFunction) -> Callable[..., object]:
    import xlwings as xw

    called = _made(function)
    for argument in function.arguments:
        # err_to_str: else errors look like blanks. ndim: else one row and one column look alike.
        options: dict[str, Any] = {"doc": argument.help, "err_to_str": True}
        if argument.kind == "range":
            options |= {"convert": range_reader(), "ndim": 2}
        called = xw.arg(argument.name, **options)(called)
    return xw.func(category=CATEGORY)(called)  # last, since arg sets the category back to its default


def _leave_other_excels_alone() -> None:
    """Take back what xlwings does on Windows when Python ends: it ends every Excel without a window.

    Such an Excel may be at work for another program of the user's. We start none, so there is none of ours to end.
    """
    windows_side = sys.modules.get("xlwings._xlwindows")
    if windows_side is not None:
        atexit.unregister(windows_side.cleanup)


globals().update({name: _marked(function) for name, function in REGISTRY.items()})
_leave_other_excels_alone()
