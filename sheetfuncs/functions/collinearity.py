"""Collinearity: how much the predictors overlap."""

from __future__ import annotations

from collections.abc import Sequence

from sheetfuncs.core.basis import listed
from sheetfuncs.core.collinearity import Inflation, variance_inflation
from sheetfuncs.core.condition import condition_indices
from sheetfuncs.errors import ArgumentError
from sheetfuncs.functions.answers import number
from sheetfuncs.functions.arguments import INTERCEPT, Argument, Option, choice
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


def _condition(call: Call) -> CellResult:
    found = find_predictors(call.block("predictors"), intercept=bool(call.options["intercept"]))
    centred = call.options["form"] == "about the means"
    condition = condition_indices(found.basis, found.column_names, centred=centred)
    return [
        [number(index), "; ".join(listed(one.terms) for one in condition.near_dependencies if one.index == index)]
        for index in condition.indices[::-1]
    ]


PREDICTORS = Argument("predictors", "Columns that explain the response, side by side; text above numbers in the first "
                                    "row is a header. Rows with a blank or an error in any column are left out.")

FUNCTIONS = (
    WorksheetFunction(
        "FIT_VIF", "collinearity",
        "Variance inflation factor of each predictor, or of the one named: how many times larger the squared error of "
        "its coefficient is than without overlap with the others; generalized for categories.",
        (
            PREDICTORS,
            Argument("predictor", "The predictor wanted: its header, or its place counted from 1. Omitted: all, "
                                  "one below the other.", "column", optional=True),
            INTERCEPT,
        ),
        "column", "one column, a row a predictor; one number where a predictor is named", _inflation,
    ),
    WorksheetFunction(
        "FIT_CONDITION", "collinearity",
        "Belsley's condition indices of the predictors, scaled to unit length, the largest first, and beside each the "
        "columns that move together there, if any: from 30 on, at least two with over half of their variance.",
        (
            PREDICTORS,
            choice("form", '"with the intercept" (default): the intercept is one of the columns, so that a predictor '
                           'far from zero counts as near to it; "about the means": the predictors among themselves.',
                   ("with the intercept", "about the means")),
            INTERCEPT,
        ),
        "table", "a table, one row a column", _condition, ("condition index", "columns that move together"),
    ),
)
