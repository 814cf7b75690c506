"""Form: whether straight lines in these predictors are enough."""

from __future__ import annotations

from sheetfuncs.core.box_cox import box_cox
from sheetfuncs.core.form import reset
from sheetfuncs.core.harvey_collier import harvey_collier
from sheetfuncs.core.rainbow import NEAREST, rainbow
from sheetfuncs.functions.answers import number, p_value, statistic
from sheetfuncs.functions.arguments import LEVEL, Argument, choice, on_rows
from sheetfuncs.functions.declaration import ONE_NUMBER, Call, CellResult, WorksheetFunction

MIDDLE = ("in order", "nearest")


def _rainbow(call: Call) -> CellResult:
    by = NEAREST if call.options["middle"] == "nearest" else None
    return p_value(rainbow(call.fit, fraction=float(call.options["fraction"] or 0), by=by))


def _box_cox(call: Call) -> CellResult:
    level = float(call.options["level"] or 0)
    result = box_cox(call.fit, level=level)
    power, details = statistic(result), result.details
    ends = [number(float("nan") if end is None else end) for end in details[f"ci{100 * level:g}"]]
    return [[power, *ends, number(details["LR_lambda_0"]["p"]), number(details["LR_lambda_1"]["p"])]]


FUNCTIONS = (
    WorksheetFunction(
        "FIT_RESET_P", "form",
        "p of the RESET test (Ramsey 1969), F variant, with the squares and cubes of the fitted values. A small p is "
        "evidence that straight lines in these predictors miss a bend.",
        on_rows(), "number", ONE_NUMBER, lambda call: p_value(reset(call.fit, powers=(2, 3))),
    ),
    WorksheetFunction(
        "FIT_RAINBOW_P", "form",
        "p of the rainbow test (Utts 1982): the middle half of the rows, in order, against all of them. A small p is "
        "evidence that a straight line fits the middle of the rows better than the whole.",
        on_rows(
            Argument("fraction", "Share of the rows that counts as the middle, 0.1 to 0.9. Default 0.5.", "number",
                     optional=True, default=0.5, lowest=0.1, highest=0.9),
            choice("middle", 'Which rows are the middle: "in order" (default), by the order column or else the rows\' '
                             'order; "nearest", those nearest to the predictors\' means.', MIDDLE),
        ),
        "number", ONE_NUMBER, _rainbow,
    ),
    WorksheetFunction(
        "FIT_HARVEY_COLLIER_P", "form",
        "p of the Harvey-Collier test (1977), two-sided t: each row against the line through the rows before it. A "
        "small p is evidence that rows bend away from a straight line, in the order column or else the rows' order.",
        on_rows(), "number", ONE_NUMBER, lambda call: p_value(harvey_collier(call.fit)),
    ),
    WorksheetFunction(
        "FIT_BOX_COX", "form",
        "Likeliest power of the response (Box and Cox 1964), its interval, p against 0 (the logarithm) and p against 1 "
        "(no power), in one row. #N/A where the response is not positive, or without an intercept.",
        on_rows(LEVEL), "table", "one row, five columns", _box_cox,
        ("power", "low", "high", "p against 0", "p against 1"),
    ),
)
