"""Independence of the errors in time order."""

from __future__ import annotations

from sheetfuncs.core.independence import breusch_godfrey, durbin_watson, durbin_watson_test
from sheetfuncs.core.portmanteau import autocorrelation_table, default_lags, ljung_box
from sheetfuncs.core.quadratic_forms import durbin_watson_bounds
from sheetfuncs.errors import TooFewRowsError
from sheetfuncs.functions.answers import p_value, statistic, table
from sheetfuncs.functions.arguments import INTERCEPT, Argument, choice, on_rows
from sheetfuncs.functions.declaration import ONE_NUMBER, Call, CellResult, WorksheetFunction

GROUP = "independence"


def _breusch_godfrey(call: Call) -> CellResult:
    lags = int(call.options["lags"] or 0)
    return p_value(breusch_godfrey(call.fit, lags=lags, distribution="chi-square", before_first="zeros"))


def _durbin_watson_p(call: Call) -> CellResult:
    return p_value(durbin_watson_test(call.fit, str(call.options["alternative"])))


def _durbin_watson_bounds(call: Call) -> CellResult:
    rows, predictors = int(call.options["row_count"] or 0), int(call.options["predictor_count"] or 0)
    intercept = bool(call.options["intercept"])
    if rows <= predictors + int(intercept):
        raise TooFewRowsError(f"{rows} rows leave nothing to bound with {predictors} predictors: give more rows.")
    lower, upper = durbin_watson_bounds(rows, predictors, float(call.options["significance"] or 0), intercept=intercept)
    return [[lower, upper]]


def _ljung_box(call: Call) -> CellResult:
    return p_value(ljung_box(call.fit, _lags(call)))


def _autocorrelation(call: Call) -> CellResult:
    found = autocorrelation_table(call.fit, _lags(call))
    return table(found.lags, found.r, [found.band] * len(found.r), found.bartlett_band)


def _lags(call: Call) -> int:
    lags = call.options["lags"]
    return default_lags(call.fit.n) if lags is None else int(lags)


_LAGS = Argument("lags", "How many rows back errors may be related; a whole number from 1. Default: a fifth of the "
                         "rows, at most 10.", "whole number", optional=True, lowest=1)

FUNCTIONS = (
    WorksheetFunction(
        "FIT_DURBIN_WATSON", GROUP,
        "Durbin-Watson statistic of the residuals in time order, 0 to 4: near 2 without first-order autocorrelation, "
        "below 2 with positive, above 2 with negative autocorrelation.",
        on_rows(), "number", ONE_NUMBER, lambda call: statistic(durbin_watson(call.fit)),
    ),
    WorksheetFunction(
        "FIT_DURBIN_WATSON_P", GROUP,
        "p of the Durbin-Watson statistic, exact for normal errors at any number of rows. A small p is evidence that "
        "neighbouring errors are related. #N/A where a predictor is the response of the row before.",
        on_rows(choice("alternative", '"positive" (default): related the same way, a statistic below 2; "negative": '
                                      'above 2; "two-sided": either.', ("positive", "negative", "two-sided"))),
        "number", ONE_NUMBER, _durbin_watson_p,
    ),
    WorksheetFunction(
        "FIT_DURBIN_WATSON_BOUNDS", GROUP,
        "The two bounds dL and dU of the Durbin-Watson statistic, side by side, computed for these counts: below dL "
        "there is evidence of positive autocorrelation whatever the predictors are, above dU there is none.",
        (
            Argument("row_count", "How many rows the fit uses.", "whole number", lowest=3, highest=2000),
            Argument("predictor_count", "How many predictor columns, the intercept not counted.", "whole number",
                     lowest=0, highest=200),
            Argument("significance", "One-sided significance level, 0.0001 to 0.5. Default 0.05.", "number",
                     optional=True, default=0.05, lowest=0.0001, highest=0.5),
            INTERCEPT,
        ),
        "table", "one row of two cells", _durbin_watson_bounds, ("dL", "dU"),
    ),
    WorksheetFunction(
        "FIT_BREUSCH_GODFREY_P", GROUP,
        "p of the Breusch-Godfrey test against autocorrelation up to the given lag: chi-square variant, zeros before "
        "the first row. A small p is evidence that neighbouring errors are related.",
        on_rows(Argument("lags", "How many rows back errors may be related; a whole number from 1. Default 1.",
                         "whole number", optional=True, default=1, lowest=1)),
        "number", ONE_NUMBER, _breusch_godfrey,
    ),
    WorksheetFunction(
        "FIT_LJUNG_BOX_P", GROUP,
        "p of the Ljung-Box test on the first autocorrelations of the residuals together. A small p is evidence that "
        "errors are related with earlier ones.",
        on_rows(_LAGS), "number", ONE_NUMBER, _ljung_box,
    ),
    WorksheetFunction(
        "FIT_AUTOCORRELATION", GROUP,
        "Autocorrelations of the residuals, one row a lag: lag, autocorrelation, the band within which 95 % lie where "
        "errors are independent, and the wider band where they are related up to the lag before (Bartlett).",
        on_rows(_LAGS), "table", "a table, one row a lag", _autocorrelation,
        ("lag", "autocorrelation", "band", "wider band"),
    ),
)
