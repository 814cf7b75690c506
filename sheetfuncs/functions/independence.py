"""Independence of the errors in time order."""

from __future__ import annotations

from sheetfuncs.core.independence import breusch_godfrey, durbin_watson
from sheetfuncs.functions.answers import p_value, statistic
from sheetfuncs.functions.arguments import Argument, on_rows
from sheetfuncs.functions.declaration import ONE_NUMBER, Call, CellResult, WorksheetFunction

GROUP = "independence"


def _breusch_godfrey(call: Call) -> CellResult:
    lags = int(call.options["lags"] or 0)
    return p_value(breusch_godfrey(call.fit, lags=lags, distribution="chi-square", before_first="zeros"))


FUNCTIONS = (
    WorksheetFunction(
        "FIT_DURBIN_WATSON", GROUP,
        "Durbin-Watson statistic of the residuals in time order, 0 to 4: near 2 without first-order autocorrelation, "
        "below 2 with positive, above 2 with negative autocorrelation.",
        on_rows(), "number", ONE_NUMBER, lambda call: statistic(durbin_watson(call.fit)),
    ),
    WorksheetFunction(
        "FIT_BREUSCH_GODFREY_P", GROUP,
        "p of the Breusch-Godfrey test against autocorrelation up to the given lag: chi-square variant, zeros before "
        "the first row. A small p is evidence that neighbouring errors are related.",
        on_rows(Argument("lags", "How many rows back errors may be related; a whole number from 1. Default 1.",
                         "whole number", optional=True, default=1, lowest=1)),
        "number", ONE_NUMBER, _breusch_godfrey,
    ),
)
