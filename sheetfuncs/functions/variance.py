"""Constant variance of the errors."""

from __future__ import annotations

from sheetfuncs.core.goldfeld_quandt import goldfeld_quandt
from sheetfuncs.core.variance import breusch_pagan
from sheetfuncs.core.white import white
from sheetfuncs.errors import ArgumentError
from sheetfuncs.functions.answers import p_value
from sheetfuncs.functions.arguments import Argument, choice, on_rows
from sheetfuncs.functions.declaration import ONE_NUMBER, Call, CellResult, WorksheetFunction

GROUP = "constant variance"


def _breusch_pagan(call: Call) -> CellResult:
    return p_value(breusch_pagan(call.fit, studentize=call.options["variant"] == "studentized"))


def _goldfeld_quandt(call: Call) -> CellResult:
    return p_value(goldfeld_quandt(
        call.fit, fraction=float(call.options["left_out"] or 0.0), alternative=str(call.options["alternative"]),
        by=_column(call),
    ))


def _column(call: Call) -> int | None:
    """The predictor column that sorts the rows. Raises ArgumentError for one that is not there or is a category."""
    wanted, groups = call.options["sorted_by"], call.fit.design.groups
    if wanted is None:
        return None
    names = [group.name for group in groups]
    place = wanted - 1 if isinstance(wanted, int) else -1
    if isinstance(wanted, str):
        matching = [i for i, name in enumerate(names) if name.casefold() == wanted.strip().casefold()]
        place = matching[0] if len(matching) == 1 else -1
    if not 0 <= place < len(groups):
        raise ArgumentError(
            f"{wanted} is not one predictor to sort by: give its header, or its place from 1 to {len(groups)}; the "
            f"predictors are {', '.join(names)}."
        )
    if names[place] in dict(call.fit.design.base_levels):
        raise ArgumentError(f"{names[place]} is a category: sort by a predictor of numbers.")
    return groups[place].start


FUNCTIONS = (
    WorksheetFunction(
        "FIT_BREUSCH_PAGAN_P", GROUP,
        "p of the Breusch-Pagan test on all predictors, studentized unless asked otherwise. A small p is evidence that "
        "the errors' spread changes with the predictors.",
        on_rows(choice("variant", '"studentized" (default; Koenker 1981), or "original" (Breusch and Pagan 1979), '
                                  "which also reacts to errors that are not normal.", ("studentized", "original"))),
        "number", ONE_NUMBER, _breusch_pagan,
    ),
    WorksheetFunction(
        "FIT_WHITE_P", GROUP,
        "p of White's test with the predictors, their squares and their products. A small p is evidence that the "
        "errors' spread changes with them in some way. #NUM! where the rows are too few for so many terms.",
        on_rows(), "number", ONE_NUMBER, lambda call: p_value(white(call.fit)),
    ),
    WorksheetFunction(
        "FIT_GOLDFELD_QUANDT_P", GROUP,
        "p of the Goldfeld-Quandt test: the later half of the rows, or those with larger values of a predictor, "
        "against the other half. A small p is evidence that the errors' spread differs between them.",
        on_rows(
            choice("alternative", '"greater" (default): wider spread in the later half; "less": in the earlier half; '
                                  '"two-sided": in either.', ("greater", "less", "two-sided")),
            Argument("left_out", "Share of the rows left out around the middle, 0 to 0.8. Default 0.0, none.", "number",
                     optional=True, default=0.0, lowest=0.0, highest=0.8),
            Argument("sorted_by", "The predictor whose values sort the rows: its header, or its place counted from 1. "
                                  "Omitted: the time order.", "column", optional=True),
        ),
        "number", ONE_NUMBER, _goldfeld_quandt,
    ),
)
