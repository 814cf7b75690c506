"""What Excel may send for every worksheet function, and what it means: two descriptions that share no code.

An argument is written here as Excel has it: a `Range` of cells that stands on a sheet, an `Array` that a calculation
inside the formula gave, one bare `Value`, or `MISSING`.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import datetime
from decimal import Decimal

from sheetfuncs.functions.registry import REGISTRY


@dataclass(frozen=True)
class Error:
    text: str


@dataclass(frozen=True)
class Date:
    """A cell with a date format: what Range.Value gives, and the number that the cell holds."""

    moment: datetime
    held: float


@dataclass(frozen=True)
class Currency:
    """A cell with a currency format: four decimals in Range.Value, all of them in the cell."""

    rounded: Decimal
    held: float


Cell = float | str | bool | Error | Date | Currency | None
Rows = tuple[tuple[Cell, ...], ...]


@dataclass(frozen=True)
class Range:
    """whole: the sheet's whole columns, of which these rows are the used part. parts: how many areas were selected."""

    rows: Rows
    whole: bool = False
    parts: int = 1


@dataclass(frozen=True)
class Array:
    rows: Rows


@dataclass(frozen=True)
class Value:
    value: Cell


class Missing:
    pass


MISSING = Missing()
Argument = Range | Array | Value | Missing
NOT_A_RANGE = "#VALUE!"


def meaning(argument: Argument) -> object:
    """What `sheetfuncs.evaluate` gets for it."""
    if isinstance(argument, Missing):
        return None
    if isinstance(argument, Value):
        return _held(argument.value, in_array=True)
    if isinstance(argument, Range) and argument.parts > 1:
        return NOT_A_RANGE
    return [[_held(cell, in_array=isinstance(argument, Array)) for cell in row] for row in argument.rows]


def _held(cell: Cell, *, in_array: bool) -> object:
    """A calculation gives dates and currency as VBA's types, so that the number in the cell is not to be had."""
    if isinstance(cell, Error):
        return cell.text
    if isinstance(cell, Currency):
        return float(cell.rounded) if in_array else cell.held
    return cell.held if isinstance(cell, Date) else cell


RESPONSE = ((23.1,), (29.9,), (31.2,), (38.4,), (37.0,), (44.9,), (50.3,), (49.1,), (57.2,), (58.8,), (66.0,), (64.7,),
            (71.9,), (75.5,), (73.8,), (80.4,))
PREDICTORS = ((1.0, 5.0), (2.0, 3.0), (3.0, 8.0), (4.0, 1.0), (5.0, 9.0), (6.0, 2.0), (7.0, 7.0), (8.0, 4.0),
              (9.0, 6.0), (10.0, 5.5), (11.0, 2.5), (12.0, 8.5), (13.0, 1.5), (14.0, 6.5), (15.0, 3.5), (16.0, 7.5))
ORDER = tuple((float(31 * i % 17),) for i in range(1, 17))
AT = ((2.5, 4.0), (20.0, 5.0))
NUMBERS = {"row_count": 40.0, "predictor_count": 3.0}
OPTIONS = {
    "standard_errors": "HC3", "level": 0.9, "kind": "leave-one-out", "alternative": None, "variant": "original",
    "lags": 2.0, "left_out": 0.2, "sorted_by": 2.0, "test": "Jarque-Bera", "predictor": 2.0, "form": "about the means",
    "fraction": 0.6, "middle": None, "significance": 0.01, "method": "ordinary",
}
ALTERNATIVES = {"FIT_DURBIN_WATSON_P": "negative", "FIT_GOLDFELD_QUANDT_P": "two-sided"}
MIDDLES = {"FIT_RAINBOW_P": "in order"}


def column(rows: Rows, place: int, cell: Cell) -> Rows:
    """The rows with the first cell of one row changed."""
    return tuple((cell, *row[1:]) if i == place else row for i, row in enumerate(rows))


def cases(name: str) -> Iterator[tuple[str, list[Argument]]]:
    """Every call of one function, with a title; arguments in their order, those behind the last one left out."""
    function = REGISTRY[name]

    def call(response=Range(RESPONSE), predictors=Range(PREDICTORS), order=MISSING, at=Range(AT), **options):
        ranges = {"response": response, "predictors": predictors, "order": order, "at": at}
        given = []
        for argument in function.arguments:
            if argument.kind == "range":
                given.append(ranges[argument.name])
            else:
                given.append(options.get(argument.name, Value(NUMBERS[argument.name]) if argument.name in NUMBERS
                                         else MISSING))
        return given

    has = {argument.name for argument in function.arguments}
    header, headers = (("Cost",), *RESPONSE), (("Weight", "Holes"), *PREDICTORS)
    yield "ranges of numbers", call()
    yield "with a header row", call(Range(header), Range(headers), Range((("Day",), *ORDER)))
    yield "arrays in place of ranges", call(Array(RESPONSE), Array(PREDICTORS), Array(ORDER), Array(AT))
    yield "blanks", call(Range(column(RESPONSE, 3, None)), Range(column(PREDICTORS, 5, None)))
    yield "blank texts in an array", call(Array(column(RESPONSE, 3, "")), Array(column(PREDICTORS, 5, "")))
    yield "a text among numbers", call(Range(column(RESPONSE, 4, "many")), Range(column(PREDICTORS, 4, " ")))
    spoilt = Range(column(PREDICTORS, 6, Error("#N/A")))
    yield "error values", call(Range(column(RESPONSE, 2, Error("#DIV/0!"))), spoilt)
    for text in ("#NULL!", "#REF!", "#NAME?", "#NUM!", "#VALUE!"):
        yield f"{text} in a cell", call(predictors=Range(column(PREDICTORS, 6, Error(text))))
    newer = column(column(PREDICTORS, 6, Error("#SPILL!")), 7, Error("#CALC!"))
    yield "error values of newer versions", call(predictors=Range(newer))
    yield "a whole column of errors", call(Range(tuple((Error("#N/A"),) for _ in RESPONSE)),
                                           Range(tuple((Error("#REF!"), 1.0) for _ in RESPONSE)))
    yield "truth values", call(predictors=Range(tuple((row[0] > 8.0, row[1]) for row in PREDICTORS)))
    sites = tuple((row[0], "north" if row[1] > 5 else "south") for row in PREDICTORS)
    yield "categories", call(predictors=Range(sites))
    yield "one cell each", call(Range(((5.0,),)), Range(((4.0,),)), at=Range(((3.0,),)))
    yield "one blank cell each", call(Range(((None,),)), Range(((None,),)), at=Range(((None,),)))
    yield "one row each", call(Range(tuple(zip(*RESPONSE, strict=True))), Range(tuple(zip(*PREDICTORS, strict=True))))
    yield "one row as an array", call(Array((tuple(row[0] for row in RESPONSE),)), Array((PREDICTORS[0],)))
    yield "one row of data", call(Range((RESPONSE[0],)), Range((PREDICTORS[0],)))
    yield "ranges of unequal height", call(Range(RESPONSE[:-1]))
    yield "whole columns", call(Range(header, whole=True), Range(headers, whole=True), at=Range(AT))
    yield "several areas at once", call(predictors=Range(PREDICTORS, parts=2))
    yield "a range that is gone", call(predictors=Value(Error("#REF!")))
    yield "no range", call(MISSING, MISSING, at=MISSING)
    yield "a number for a range", call(predictors=Value(5.0))
    days = tuple((Date(datetime(2026, 1, 1 + i), 46023.0 + i),) for i in range(16))
    prices = tuple((Currency(Decimal("17.1235") + i, 17.12345678 + i), row[1]) for i, row in enumerate(PREDICTORS))
    yield "dates and currency", call(predictors=Range(prices), order=Range(days))
    yield "dates and currency in arrays", call(predictors=Array(prices), order=Array(days))
    first_days = ((Date(datetime(1899, 12, 31), 1.0),), (Date(datetime(1900, 2, 28), 59.0),),
                  (Date(datetime(1900, 3, 1), 61.0),), (Date(datetime(1899, 12, 30, 12), 0.5),), *days[4:])
    yield "dates before March 1900, and a time", call(order=Array(first_days))
    yield "no intercept", call(intercept=Value(False))
    yield "no intercept, from a cell", call(intercept=Range(((0.0,),)), order=Range(ORDER))
    yield "a word for the intercept", call(intercept=Value("perhaps"))
    chosen = {**OPTIONS, "alternative": ALTERNATIVES.get(name), "middle": MIDDLES.get(name)}
    own = {option: chosen[option] for option in has & chosen.keys()}
    if own:
        yield "own options", call(**{option: Value(value) for option, value in own.items()})
        yield "own options, from cells", call(**{option: Range(((value,),)) for option, value in own.items()})
        yield "own options, from blank cells", call(**{option: Range(((None,),)) for option in own})
        yield "own options that are errors", call(**{option: Value(Error("#N/A")) for option in own})
        yield "own options, errors in cells", call(**{option: Range(((Error("#DIV/0!"),),)) for option in own})
        yield "own options, several cells", call(**{option: Range(((1.0, 2.0), (3.0, 4.0))) for option in own})
        yield "own options of no sense", call(**{option: Value("nonsense") for option in own})
    if "level" in has:
        yield "a level as currency", call(level=Value(Currency(Decimal("0.9"), 0.9)))
    if name == "FIT_VIF":
        yield "a predictor by its header", call(predictors=Range(headers), predictor=Value("holes"))
    if name == "FIT_DURBIN_WATSON_BOUNDS":
        yield "numbers from cells", call(row_count=Range(((25.0,),)), predictor_count=Range(((2.0,),)))
        yield "a number missing", call(row_count=MISSING)
