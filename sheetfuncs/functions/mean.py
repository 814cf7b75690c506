"""The mean of the residuals."""

from __future__ import annotations

from sheetfuncs.core.mean import residual_mean
from sheetfuncs.functions.answers import statistic
from sheetfuncs.functions.arguments import on_rows
from sheetfuncs.functions.declaration import ONE_NUMBER, WorksheetFunction

FUNCTIONS = (
    WorksheetFunction(
        "FIT_RESIDUAL_MEAN", "mean",
        "Mean of the residuals, in the response's units. With an intercept it is zero but for rounding, whatever the "
        "data; without one it need not be zero.",
        on_rows(), "number", ONE_NUMBER, lambda call: statistic(residual_mean(call.fit)),
    ),
)
