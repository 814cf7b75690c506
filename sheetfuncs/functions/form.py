"""Form: whether straight lines in these predictors are enough."""

from __future__ import annotations

from sheetfuncs.core.form import reset
from sheetfuncs.functions.answers import p_value
from sheetfuncs.functions.arguments import on_rows
from sheetfuncs.functions.declaration import ONE_NUMBER, WorksheetFunction

FUNCTIONS = (
    WorksheetFunction(
        "FIT_RESET_P", "form",
        "p of the RESET test (Ramsey 1969), F variant, with the squares and cubes of the fitted values. A small p is "
        "evidence that straight lines in these predictors miss a bend.",
        on_rows(), "number", ONE_NUMBER, lambda call: p_value(reset(call.fit, powers=(2, 3))),
    ),
)
