"""Collinearity: how much the predictors overlap."""

from __future__ import annotations

from collections.abc import Sequence

from sheetfuncs.core.collinearity import Inflation, variance_inflation
from sheetfuncs.errors import ArgumentError
from sheetfuncs.functions.answers import number
from sheetfuncs.functions.arguments import INTERCEPT, Argument, Option
from sheetfuncs.functions.declaration import Call, CellResult, WorksheetFunction
from sheetfuncs.functions.regressions import find_predictors


def _inflation(call: Call) -> CellResult:
    found = find_predictors(call.block("predictors"), intercept=bool(call.options["intercept"]))
    inflation = variance_inflation(found.basis, found.groups)
    wanted = call.options["predictor"]
    if wanted is None:
        return [[number(one.vif)] for one in inflation]
    return number(_the_one(inflation, wanted).vif)


def _the_one(inflation: Sequence[Inflation], wanted: Option) -> Inflation:
    names = [one.predictor for one in inflation]
    if isinstance(wanted, str):
        matching = [i for i, name in enumerate(names) if name.casefold() == wanted.strip().casefold()]
        if len(matching) == 1:
            return inflation[matching[0]]
    elif isinstance(wanted, int) and 1 <= wanted <= len(names):
        return inflation[wanted - 1]
    shown = f'"{wanted}"' if isinstance(wanted, str) else wanted
    raise ArgumentError(
        f"There is no predictor {shown}: give a place from 1 to {len(names)}, or one of {', '.join(names)}."
        if len(set(names)) == len(names) or not isinstance(wanted, str) else
        f"Several predictors have the header {shown}: give the place of the one that is wanted, from 1 to {len(names)}."
    )


FUNCTIONS = (
    WorksheetFunction(
        "FIT_VIF", "collinearity",
        "Variance inflation factor of each predictor, or of the one named: how many times larger the squared error of "
        "its coefficient is than without overlap with the others; generalized for categories.",
        (
            Argument("predictors", "Columns that explain the response, side by side; text above numbers in the first "
                                   "row is a header. Rows with a blank or an error in any column are left out."),
            Argument("predictor", "The predictor wanted: its header, or its place counted from 1. Omitted: all, "
                                  "one below the other.", "column", optional=True),
            INTERCEPT,
        ),
        "column", "one column, a row a predictor; one number where a predictor is named", _inflation,
    ),
)
