"""Single rows: how far each can move the fit."""

from __future__ import annotations

import numpy as np

from sheetfuncs.core.influence import outlier_test
from sheetfuncs.core.shifts import dfbetas
from sheetfuncs.errors import NoVariationError
from sheetfuncs.functions.answers import by_row, p_value, side_by_side
from sheetfuncs.functions.arguments import on_rows
from sheetfuncs.functions.declaration import AS_HIGH_AS_RESPONSE, ONE_NUMBER, Call, CellResult, WorksheetFunction

GROUP = "rows"
ROWS = (
    "fitted", "residual", "internally studentized residual", "externally studentized residual",
    "leave-one-out residual", "leverage", "Cook's distance", "DFFITS", "COVRATIO",
)


def _leverage(call: Call) -> CellResult:
    return by_row(call.regression.observations, call.regression.measures.leverage, "leverage")


def _cooks_distance(call: Call) -> CellResult:
    return by_row(call.regression.observations, call.regression.measures.cooks_distance, "Cook's distance")


def _dffits(call: Call) -> CellResult:
    return by_row(call.regression.observations, call.regression.measures.dffits, "DFFITS")


def _rows(call: Call) -> CellResult:
    fit, measures = call.fit, call.regression.measures
    fixed = (
        fit.fitted, fit.residuals, measures.internally_studentized, measures.externally_studentized,
        measures.leave_one_out, measures.leverage, measures.cooks_distance, measures.dffits, measures.covratio,
    )
    headings = [*ROWS, *(f"DFBETAS {term}" for term in fit.design.terms)]
    return side_by_side(call.regression.observations, np.column_stack([*fixed, dfbetas(fit, measures)]), headings)


def _press(call: Call) -> CellResult:
    call.fit.require_variation()
    total = call.regression.measures.press
    if not np.isfinite(total):
        raise NoVariationError(
            "A row of leverage 1 cannot be predicted from the others, so that their sum is undefined: FIT_LEVERAGE "
            "shows which one."
        )
    return total


FUNCTIONS = (
    WorksheetFunction(
        "FIT_LEVERAGE", GROUP,
        "Leverage of each row, the diagonal of the hat matrix, 0 to 1: how far its predictors lie from the others. 1 "
        "means that the row alone decides its fitted value.",
        on_rows(), "column", AS_HIGH_AS_RESPONSE, _leverage,
    ),
    WorksheetFunction(
        "FIT_COOKS_DISTANCE", GROUP,
        "Cook's distance of each row (Cook 1977): how far all fitted values move when the row is left out.",
        on_rows(), "column", AS_HIGH_AS_RESPONSE, _cooks_distance,
    ),
    WorksheetFunction(
        "FIT_DFFITS", GROUP,
        "DFFITS of each row (Belsley, Kuh and Welsch 1980): how far its own fitted value moves when the row is left "
        "out, in standard errors.",
        on_rows(), "column", AS_HIGH_AS_RESPONSE, _dffits,
    ),
    WorksheetFunction(
        "FIT_OUTLIER_P", GROUP,
        "p of the row with the largest externally studentized residual, two-sided t, multiplied by the number of rows "
        "(Bonferroni) and at most 1. A small p is evidence that this row does not belong.",
        on_rows(), "number", ONE_NUMBER, lambda call: p_value(outlier_test(call.fit)),
    ),
    WorksheetFunction(
        "FIT_PRESS", GROUP,
        "Sum of squared leave-one-out residuals (PRESS, Allen 1974): how well the fit predicts rows that it has not "
        "seen. Less is better; in squared units of the response.",
        on_rows(), "number", ONE_NUMBER, _press,
    ),
    WorksheetFunction(
        "FIT_ROWS", GROUP,
        "All measures of each row side by side: fitted value, four residuals, leverage, Cook's distance, DFFITS, "
        "COVRATIO, and the DFBETAS of every coefficient, the intercept first (Belsley, Kuh and Welsch 1980).",
        on_rows(), "table", "a table, as high as the response", _rows, ROWS, "DFBETAS",
    ),
)
