"""Constant variance of the errors."""

from __future__ import annotations

from sheetfuncs.core.variance import breusch_pagan
from sheetfuncs.functions.answers import p_value
from sheetfuncs.functions.arguments import choice, on_rows
from sheetfuncs.functions.declaration import ONE_NUMBER, Call, CellResult, WorksheetFunction


def _breusch_pagan(call: Call) -> CellResult:
    return p_value(breusch_pagan(call.fit, studentize=call.options["variant"] == "studentized"))


FUNCTIONS = (
    WorksheetFunction(
        "FIT_BREUSCH_PAGAN_P", "constant variance",
        "p of the Breusch-Pagan test on all predictors, studentized unless asked otherwise. A small p is evidence that "
        "the errors' spread changes with the predictors.",
        on_rows(choice("variant", '"studentized" (default; Koenker 1981), or "original" (Breusch and Pagan 1979), '
                                  "which also reacts to errors that are not normal.", ("studentized", "original"))),
        "number", ONE_NUMBER, _breusch_pagan,
    ),
)
