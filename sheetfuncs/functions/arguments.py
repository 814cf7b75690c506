"""Arguments of worksheet functions: how each is declared, and how a given option is read."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from numbers import Real
from typing import Literal

import numpy as np

from sheetfuncs.cells.block import ERROR_TEXTS, Block, Kind
from sheetfuncs.errors import ArgumentError

Option = float | int | bool | str | None
ArgumentKind = Literal["range", "number", "whole number", "yes or no", "choice", "column"]


@dataclass(frozen=True)
class Argument:
    """One argument of a worksheet function.

    name: lower case, as in `evaluate(..., name=value)`. help: at most 255 characters, which hosts show.
    kind: "range" for blocks of cells; "column" is a header or a place counted from 1.
    default: what an omitted option means. choices: the words a "choice" may be, in lower case.
    lowest, highest: limits of a number, both included.
    """

    name: str
    help: str
    kind: ArgumentKind = "range"
    optional: bool = False
    default: Option = None
    choices: tuple[str, ...] = ()
    lowest: float | None = None
    highest: float | None = None


RESPONSE = Argument("response", "Column to be explained. Where its first cell is text above numbers, every range has a "
                                "header row. Rows with a blank or an error in any used column are left out.")
PREDICTORS = Argument("predictors", "Columns that explain it, side by side, as high as the response. A column of text "
                                    "is a category; its first level is the base.")
INTERCEPT = Argument("intercept", "TRUE (default) fits a constant term; FALSE fits through the origin.",
                     "yes or no", optional=True, default=True)
ORDER = Argument("order", "Column that says the time order, as high as the response. Omitted: the order of the rows.",
                 optional=True)
LEVEL = Argument("level", "Level of the intervals, 0.5 to 0.9999. Default 0.95.", "number", optional=True, default=0.95,
                 lowest=0.5, highest=0.9999)


def choice(name: str, help: str, choices: tuple[str, ...]) -> Argument:
    """An option that is one of a few words; the first is the default."""
    return Argument(name, help, "choice", optional=True, default=choices[0], choices=choices)


def on_rows(*own: Argument) -> tuple[Argument, ...]:
    """Arguments of a function on a regression: the data, the function's own options, then intercept and order."""
    return RESPONSE, PREDICTORS, *own, INTERCEPT, ORDER


def read_option(argument: Argument, given: object) -> Option:
    """The value of an option as given; a single cell's range counts as its cell, a blank one as omitted.

    Raises ArgumentError, whose cell_error is the error value itself where that is what was given.
    """
    value = _single_cell(argument, given)
    if value is None or value == "":
        return argument.default
    if isinstance(value, str) and value in ERROR_TEXTS:
        raise _error_given(argument, value)
    if argument.kind == "number":
        return _number(argument, value)
    if argument.kind == "whole number":
        return _whole_number(argument, value)
    if argument.kind == "yes or no":
        return _yes_or_no(argument, value)
    if argument.kind == "choice":
        return _choice(argument, value)
    return value if isinstance(value, str) else _whole_number(argument, value)


def is_error(given: object) -> bool:
    """Whether a bare error value stands in place of an argument."""
    return isinstance(given, str) and given in ERROR_TEXTS


def _single_cell(argument: Argument, given: object) -> object:
    if isinstance(given, Block):
        if (given.row_count, given.column_count) != (1, 1):
            raise _refused(argument, f"a range of {given.row_count} x {given.column_count} cells")
        return _cell(given)
    if isinstance(given, list | tuple):
        row = given[0] if len(given) == 1 else None
        if not isinstance(row, list | tuple) or len(row) != 1:
            raise _refused(argument, "a range of several cells")
        return row[0]
    return given


def _cell(block: Block) -> object:
    kind, number = block.kinds[0, 0], float(block.numbers[0, 0])
    if kind in (Kind.TEXT, Kind.ERROR):
        return block.text(0, 0)
    if kind == Kind.BOOLEAN:
        return bool(number)
    return None if kind == Kind.BLANK else number


def _number(argument: Argument, value: object) -> float:
    if isinstance(value, bool) or not isinstance(value, Real):
        raise _refused(argument, _shown(value))
    try:
        number = float(value)
    except OverflowError:
        number = math.inf
    low, high = argument.lowest, argument.highest
    if not math.isfinite(number) or (low is not None and number < low) or (high is not None and number > high):
        raise _refused(argument, _shown(value))
    return number


def _whole_number(argument: Argument, value: object) -> int:
    number = _number(argument, value)
    if number != math.floor(number):
        raise _refused(argument, _shown(value))
    return int(number)


def _yes_or_no(argument: Argument, value: object) -> bool:
    if isinstance(value, Real | np.bool_) and value in (0, 1):
        return bool(value)
    raise _refused(argument, _shown(value))


def _choice(argument: Argument, value: object) -> str:
    word = " ".join(value.lower().split()) if isinstance(value, str) else None
    if word not in argument.choices:
        raise _refused(argument, _shown(value))
    return str(word)


_ALLOWED: Mapping[str, str] = {
    "number": "a number",
    "whole number": "a whole number",
    "yes or no": "TRUE or FALSE",
    "column": "a header, or a column's place counted from 1",
}


def allowed(argument: Argument) -> str:
    """What an option may be, in words: "a number from 0.5 to 0.9999"."""
    if argument.kind == "choice":
        words = [f'"{word}"' for word in argument.choices]
        return words[0] if len(words) == 1 else ", ".join(words[:-1]) + " or " + words[-1]
    text = _ALLOWED.get(argument.kind, "a range")
    if argument.kind == "column" or argument.lowest is None:
        return text
    return f"{text} from {argument.lowest:g}" + (f" to {argument.highest:g}" if argument.highest is not None else "")


def _refused(argument: Argument, found: str) -> ArgumentError:
    return ArgumentError(f"The argument {argument.name} is {found}; it may be {allowed(argument)}.")


def _error_given(argument: Argument, error: str) -> ArgumentError:
    refusal = ArgumentError(f"The argument {argument.name} is the error {error}: mend the cell that it comes from.")
    refusal.cell_error = error
    return refusal


def _shown(value: object) -> str:
    if isinstance(value, bool | np.bool_):
        return "TRUE" if value else "FALSE"
    if isinstance(value, str):
        return f'the text "{value if len(value) <= 40 else value[:37] + "..."}"'
    if isinstance(value, Real):
        try:
            return f"{float(value):g}"
        except OverflowError:
            return "a number beyond what a cell can hold"
    return "not a number, a text, TRUE or FALSE"
