"""The fit itself: coefficients, fitted values, residuals, predictions, and why there is none."""

from __future__ import annotations

from sheetfuncs.core.covariance import KINDS, covariance
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.results import DoesNotApply
from sheetfuncs.errors import NotApplicableError
from sheetfuncs.functions.answers import by_row, table
from sheetfuncs.functions.arguments import LEVEL, Argument, choice, on_rows
from sheetfuncs.functions.declaration import AS_HIGH_AS_RESPONSE, Call, CellResult, WorksheetFunction
from sheetfuncs.functions.explaining import explain_regression
from sheetfuncs.functions.predicting import COLUMNS, predict_at

GROUP = "fit"

RESIDUALS = {
    "plain": "residual",
    "internally studentized": "internally studentized residual",
    "externally studentized": "externally studentized residual",
    "leave-one-out": "leave-one-out residual",
}

STANDARD_ERRORS = {kind.lower(): kind for kind in KINDS}


def _coefficients(call: Call) -> CellResult:
    fit, level = call.fit, float(call.options["level"] or 0)
    kind = STANDARD_ERRORS[str(call.options["standard_errors"])]
    if kind != "ordinary" and fit.has_error_bars:
        return _with_robust_errors(fit, kind, level)
    low, high = fit.interval(level)
    return table(fit.design.terms, fit.coefficients, fit.standard_errors, fit.t, fit.p_values, low, high)


def _with_robust_errors(fit: Fit, kind: str, level: float) -> CellResult:
    robust = covariance(fit, kind, level=level)
    if isinstance(robust, DoesNotApply):
        refusal = NotApplicableError(robust.reason)
        refusal.cell_error = robust.cell_error
        raise refusal
    return table(
        fit.design.terms, fit.coefficients, robust.standard_errors, robust.t, robust.p, robust.low, robust.high
    )


def _fitted(call: Call) -> CellResult:
    return by_row(call.regression.observations, call.fit.fitted, "fitted")


def _residuals(call: Call) -> CellResult:
    kind, measures = str(call.options["kind"]), call.regression.measures
    values = {
        "plain": call.fit.residuals,
        "internally studentized": measures.internally_studentized,
        "externally studentized": measures.externally_studentized,
        "leave-one-out": measures.leave_one_out,
    }[kind]
    return by_row(call.regression.observations, values, RESIDUALS[kind])


def _predict(call: Call) -> CellResult:
    return predict_at(call.regression, call.block("at"), float(call.options["level"] or 0))


FUNCTIONS = (
    WorksheetFunction(
        "FIT_COEFFICIENTS", GROUP,
        "Least-squares coefficients, one row a term, the intercept first: term, estimate, standard error, t, two-sided "
        "p (t with n - p degrees of freedom), and the limits of the interval.",
        on_rows(
            choice("standard_errors", '"ordinary" (default): equal spread, independent errors. Unequal spread: "hc3" '
                                      '(good with few rows), "hc4" (with high leverage), or "hc0", "hc1", "hc2". '
                                      'Unequal and related in time too: "newey-west".', tuple(STANDARD_ERRORS)),
            LEVEL,
        ),
        "table", "a table, one row a term", _coefficients,
        ("term", "estimate", "error", "t", "p", "low", "high"),
    ),
    WorksheetFunction(
        "FIT_FITTED", GROUP, "Fitted value of each row, by least squares. #N/A for a row that was left out.",
        on_rows(), "column", AS_HIGH_AS_RESPONSE, _fitted,
    ),
    WorksheetFunction(
        "FIT_RESIDUALS", GROUP,
        "Residual of each row: response minus fitted value, plain or in one of three scaled kinds. #N/A for a row that "
        "was left out, #NUM! where the kind is undefined (leverage 1, perfect fit).",
        on_rows(choice("kind", '"plain" (default); "internally studentized" or "externally studentized": in standard '
                               'deviations, the row itself used or not; "leave-one-out": from a fit without the row.',
                       tuple(RESIDUALS))),
        "column", AS_HIGH_AS_RESPONSE, _residuals,
    ),
    WorksheetFunction(
        "FIT_PREDICT", GROUP,
        "Predicted value for each row of new predictor values, with limits for the average response there and for one "
        "new response there: value, average low, average high, new low, new high.",
        (
            *on_rows()[:2],
            Argument("at", "Predictor values to predict at, columns as in the predictors. A first row that repeats the "
                           "predictors' headers counts as a header; its columns may then stand in any order."),
            choice("method", 'How the limits are found. "ordinary" (default): t limits; equal spread and normal errors '
                             "are assumed.", ("ordinary",)),
            LEVEL,
            *on_rows()[2:],
        ),
        "table", "a table, as high as the range to predict at", _predict, COLUMNS,
    ),
    WorksheetFunction(
        "FIT_WHY", GROUP,
        'Why a value is missing: "ok", or the sentence that says what stops this fit; and which rows were left out, '
        "and why.",
        on_rows(), "text", "one text", explain_regression,
    ),
)
